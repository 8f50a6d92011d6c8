"""Killed, stopped, resumed: the bytes of a run that nobody disturbed."""

import contextlib
import random
import signal
import time

import pytest

from swirlight.config import load_config
from swirlight.errors import InputError, StopRequested
from swirlight.run.launch import launch, resume
from swirlight.run.status import read_status
from tests.run.small import CONFIG, command, fingerprints, finish, write_config

LONGER = CONFIG.replace("0.8 ps", "8 ps").replace("0.6 ps,", "4 ps,").replace(
    "length: 0.6 ps", "length: 4 ps")


@pytest.fixture(scope="module")
def path(tmp_path_factory):
    return write_config(tmp_path_factory.mktemp("config"), LONGER)


@pytest.fixture(scope="module")
def undisturbed(path, tmp_path_factory):
    began = time.monotonic()
    run = launch(load_config(path), into=tmp_path_factory.mktemp("runs") / "a", progress=False)
    return fingerprints(run.path), time.monotonic() - began


def kill_until_done(path, folder, kills, seconds, seed):
    """Launch, then kill and resume at random moments; return how many kills struck."""
    moments, struck = random.Random(seed), 0
    process = command("launch", path, "--into", folder)
    for _ in range(kills):
        try:
            process.wait(timeout=1.5 + moments.random() * seconds)
        except Exception:
            process.send_signal(signal.SIGKILL)
            struck += 1
        process.communicate()
        if not (folder / "config.yaml").is_file():  # killed before there was anything
            process = command("launch", path, "--into", folder)
        else:
            process = command("resume", folder)
    code, _, error = finish(process)
    assert code == 0, error
    return struck


def test_killed_and_resumed(path, undisturbed, tmp_path):
    expected, seconds = undisturbed
    assert kill_until_done(path, tmp_path / "a", 3, 0.5 * seconds, seed=1) >= 1
    assert fingerprints(tmp_path / "a") == expected


MESH = """
title: a mesh that acts every third step
seed: 4
sample: {species: [{use: acetonitrile, count: 32}], density: 0.777 g/cm^3, temperature: 298 K}
forces: {cutoff: 0.7 nm, mesh_every: 3, tolerance: 1e-3}
stages:
  - {name: settle, length: 0.12 ps, timestep: 2 fs, thermostat: {method: langevin, friction: 2 /ps}}
  - {name: exposure, length: 0.18 ps}
record: {every: 12 fs, totals_every: 6 fs}
"""


def test_stopped_between_two_steps_of_the_mesh(tmp_path, monkeypatch):
    config = load_config(write_config(tmp_path, MESH))
    expected = fingerprints(launch(config, into=tmp_path / "a", progress=False, threads=1).path)
    steps = 0

    def requested(self):
        nonlocal steps
        steps += 1
        return signal.SIGTERM if steps % 7 == 0 else 0

    monkeypatch.setattr("swirlight.run.stop.StopFile.requested", requested)
    with pytest.raises(StopRequested):
        launch(config, into=tmp_path / "b", progress=False, threads=1)
    while not (tmp_path / "b" / "summary.json").is_file():
        with contextlib.suppress(StopRequested):
            resume(tmp_path / "b", progress=False, threads=1)
    assert steps == 150 and fingerprints(tmp_path / "b") == expected  # stopped 21 times


@pytest.mark.slow
def test_killed_twenty_times(path, undisturbed, tmp_path, table):
    expected, seconds = undisturbed
    struck, trial = 0, 0
    while struck < 20:
        struck += kill_until_done(path, tmp_path / f"{trial}", 5, 0.7 * seconds, seed=100 + trial)
        assert fingerprints(tmp_path / f"{trial}") == expected
        trial += 1
    table("kill -9 at random moments, resumed", f"{struck} kills in {trial} runs", "same bytes")


@pytest.mark.parametrize("number, code", [(signal.SIGTERM, 143), (signal.SIGINT, 130)])
def test_stopped_by_a_signal_and_resumed(path, undisturbed, tmp_path, number, code):
    folder = tmp_path / "a"
    process = command("launch", path, "--into", folder)
    while not list(folder.glob(".work/*/progress.json")):
        assert process.poll() is None, "over before it could be stopped"
        time.sleep(0.02)
    process.send_signal(number)
    found, _, error = finish(process)
    assert found == code and "saved" in error and "Traceback" not in error
    assert read_status(folder)["state"] == "interrupted"
    resume(folder, progress=False)
    assert fingerprints(folder) == undisturbed[0]


def test_resume_says_nothing_to_do_when_done(undisturbed, path, tmp_path):
    launch(load_config(path, ["stages[1].length=0.4 ps"]), into=tmp_path / "a", progress=False)
    code, _, error = finish(command("resume", tmp_path / "a"))
    assert code == 0 and "nothing to do" in error


def test_changed_physics_is_refused_key_by_key(path, tmp_path):
    folder = tmp_path / "a"
    process = command("launch", path, "--into", folder)
    while not list(folder.glob(".work/*/progress.json")):
        time.sleep(0.02)
    process.send_signal(signal.SIGTERM)
    finish(process)
    text = (folder / "config.yaml").read_text()
    (folder / "config.yaml").write_text(text.replace("77.4 K", "80 K"))
    with pytest.raises(InputError, match=r"sample\.temperature: 77\.4 K -> 80 K"):
        resume(folder, progress=False)
