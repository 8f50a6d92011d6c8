"""A run from config to files: what it leaves, what it says, what it refuses."""

import json

import jsonschema
import numpy as np
import pytest

from swirlight.config import load_config
from swirlight.errors import InputError
from swirlight.run.answer import answer
from swirlight.run.launch import launch
from swirlight.run.status import read_status
from swirlight.run.summary import summary_schema
from swirlight.store.start import load_state
from swirlight.store.verify import verify
from tests.run.small import CONFIG, command, fingerprints, finish, write_config


@pytest.fixture(scope="module")
def config(tmp_path_factory):
    return load_config(write_config(tmp_path_factory.mktemp("config")))


@pytest.fixture(scope="module")
def run(config, tmp_path_factory):
    return launch(config, into=tmp_path_factory.mktemp("runs") / "a", progress=False, threads=1)


def test_every_file_is_there_and_obeys_the_format(run):
    names = {path.name for path in run.path.iterdir()}
    wanted = {f"{kind}-{start:03d}.h5" for kind in ("plus", "minus", "dark") for start in (0, 1)}
    assert wanted | {"config.yaml", "equilibrium.h5", "starts", "summary.json",
                     "response.png"} <= names
    assert ".work" not in names
    assert verify(run.path) == []


def test_summary_follows_its_schema(run):
    summary = json.loads((run.path / "summary.json").read_text())
    jsonschema.validate(summary, summary_schema())
    assert [e["complete"] for e in summary["exposures"]] == [True] * 6
    assert summary["seed"] == 3


def test_linear_polarizability_has_no_odd_part_to_the_last_bit(run):
    for name in ("angular_momentum", "orientation", "light_torque"):
        assert np.array_equal(run["plus", 0][name][:], run["minus", 0][name][:])
    assert "the twins are identical" in answer(run.path)


def test_light_moves_the_bodies_and_the_starts_differ(run):
    assert not np.array_equal(run["plus", 0].orientation[-1], run["dark", 0].orientation[-1])
    assert not np.array_equal(run["dark", 0].orientation[0], run["dark", 1].orientation[0])
    assert np.array_equal(run["plus", 0].orientation[0], run["dark", 0].orientation[0])


def test_noise_depends_on_seed_and_start_alone(run):
    first, second = (load_state(path) for path in run.starts)
    assert first.random.random() != second.random.random()
    seeds = np.random.SeedSequence(3, spawn_key=(1,))
    expected = np.random.Generator(np.random.PCG64(seeds)).random()
    assert load_state(run.starts[1]).random.random() == expected
    # and not that of the lattice again
    lattice = np.random.Generator(np.random.PCG64(np.random.SeedSequence(3)))
    assert load_state(run.starts[0]).random.random() != lattice.random()


def test_a_complete_run_says_so(run):
    assert read_status(run.path)["state"] == "complete"


def test_an_existing_folder_is_refused_naming_resume(run, config):
    with pytest.raises(InputError, match="swirlight resume"):
        launch(config, into=run.path, progress=False)


def test_two_workers_leave_the_bytes_of_one(run, config, tmp_path):
    both = launch(config, into=tmp_path / "b", progress=False, threads=2)
    assert fingerprints(both.path) == fingerprints(run.path)


def test_spacing_left_out_is_found_while_equilibrating(tmp_path):
    text = CONFIG.replace(", spacing: 0.2 ps", "").replace("0.6 ps", "3 ps")
    run = launch(load_config(write_config(tmp_path, text)), into=tmp_path / "a", progress=False,
                 threads=1)
    spacing = run.summary["spacing"]
    slowest = max(t["value"] for t in spacing["seen"]["nitrogen"].values())
    assert abs(spacing["value"] - 3 * slowest) <= 0.002 + 1e-9  # half a step


def test_short_equilibration_and_missing_dark_twins_are_said(tmp_path):
    """No spacing can be read from 0.3 ps, and no heating from a run without its dark twin."""
    text = CONFIG.replace(", spacing: 0.2 ps", "").replace("0.6 ps", "0.2 ps")
    text = text.replace("kinds: [plus, minus, dark]", "kinds: [plus, minus]")
    run = launch(load_config(write_config(tmp_path, text)), into=tmp_path / "a", progress=False,
                 threads=1)
    assert "spacing-too-short" in [code for code, _ in run.summary["warnings"]]
    assert "own_temperature" not in run.summary["heating"]
    said = answer(run.path)
    assert "heating: " in said and "lit less dark" not in said
    assert "warning: exposures.spacing: left out" in said
    jsonschema.validate(run.summary, summary_schema())


def test_one_trajectory_in_this_process_shows_its_progress(tmp_path, monkeypatch):
    """Facts arrive while it runs; its pace is that of its own steps, not of the start's count."""
    from swirlight.run import launch as module
    from swirlight.run import trajectory

    seen, paces = [], []

    class Watching(module.displays.Silent):
        def update(self, done, **facts):
            seen.append(done)

    monkeypatch.setattr(trajectory, "REPORT_EVERY", 0.0)
    monkeypatch.setattr(module.displays, "choose", lambda wanted: Watching())
    monkeypatch.setattr(module, "record_rate", lambda workload, pace: paces.append(pace))
    text = CONFIG.replace("kinds: [plus, minus, dark], starts: 2, spacing: 0.2 ps",
                          "kinds: [dark], starts: 1").replace("0.6 ps", "4 ps")
    launch(load_config(write_config(tmp_path, text)), into=tmp_path / "a")
    assert {50, 100, 150} <= set(seen)  # of the 200 steps of the only exposure
    assert len(paces) == 2 and max(paces) < 4 * min(paces)  # the start is at step 1000


def test_an_equilibrium_run_leaves_one_dark_trajectory(tmp_path):
    text = CONFIG[: CONFIG.index("light:")] + CONFIG[CONFIG.index("stages:"):]
    text = text.replace(", lit: true", "").replace(CONFIG[CONFIG.index("exposures:"):
                                                          CONFIG.index("record:")], "")
    run = launch(load_config(write_config(tmp_path, text)), into=tmp_path / "a", progress=False)
    assert [e.name for e in run.exposures] == ["dark-000"]
    assert run["dark", 0].temperature.times[-1] == pytest.approx(0.8)
    assert "temperature" in answer(run.path)


def test_a_run_begins_from_a_start_of_another(run, tmp_path):
    text = CONFIG.replace("density: 0.806 g/cm^3", f"begin_from: {run.starts[1]}")
    text = text.replace("starts: 2, spacing: 0.2 ps", "starts: 1")
    text = text[: text.index("  - {name: settle")] + text[text.index("  - {name: exposure"):]
    text = text.replace("length: 0.8 ps,", "length: 0.8 ps, timestep: 4 fs,")
    again = launch(load_config(write_config(tmp_path, text)), into=tmp_path / "a", progress=False)
    assert np.array_equal(again["dark", 0].orientation[:], run["dark", 1].orientation[:])


def test_bad_input_leaves_nothing_behind(tmp_path):
    path = write_config(tmp_path, CONFIG.replace("800 nm", "800 fs"))
    code, out, error = finish(command("launch", path, "--into", tmp_path / "a"))
    assert code == 2 and out == "" and "Traceback" not in error
    assert f"{path}:" in error and "light[0].carrier" in error
    assert not (tmp_path / "a").exists()


def test_a_folder_that_cannot_be_made_is_bad_input(tmp_path):
    (tmp_path / "file").write_text("")
    code, out, error = finish(command("launch", write_config(tmp_path),
                                      "--into", tmp_path / "file" / "a"))
    assert code == 2 and out == "" and error.splitlines()[-1].startswith(
        f"{tmp_path / 'file' / 'a'}: cannot be made")


def test_a_box_too_small_is_refused_before_anything_is_written(tmp_path):
    path = write_config(tmp_path, CONFIG.replace("cutoff: 0.6 nm", "cutoff: 0.9 nm"))
    code, _, error = finish(command("launch", path, "--into", tmp_path / "a"))
    assert code == 2 and "largest cutoff" in error.lower()
    assert not (tmp_path / "a").exists()
