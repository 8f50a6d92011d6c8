"""What the engine's speed is compared with must do the same work: same forces, same torques."""

import importlib
import json
import pathlib
import sys

import h5py
import numpy as np
import pytest

from swirlight.compiled import numba
from swirlight.motion.draw import draw_orientations
from swirlight.run.arrange import lattice_positions
from swirlight.state import State

FOLDER = pathlib.Path(__file__).parents[1] / "benchmarks"


@pytest.fixture(scope="module")
def benchmarks():
    """Import a module of the benchmarks by its name."""
    sys.path.insert(0, str(FOLDER))
    yield importlib.import_module
    sys.path.remove(str(FOLDER))


@pytest.fixture
def loose(benchmarks):
    """A system and a state on a wide lattice, without overlaps; one image of each body."""
    def make(name, bodies=256, cutoff=0.6):
        systems, random = benchmarks("systems"), np.random.default_rng(5)
        system = systems.with_plain_cutoff(name, bodies, "double", cutoff)
        box = 1.2 * systems.box_of(name, bodies)
        position = lattice_positions(bodies, box, random)
        position += random.normal(scale=0.01, size=position.shape)
        return system, State(position, draw_orientations(bodies, random),
                             *np.zeros((2, bodies, 3)), box)

    return make


@pytest.mark.parametrize("name", ["water", "atoms", "five"])
def test_rivals_agree_with_the_engine(benchmarks, loose, name):
    force_calls = benchmarks("force_calls")
    system, state = loose(name)
    call = force_calls.ForceCall(system, state)
    expected = call()
    twin, script = force_calls.rivals(system, state, call.pairs.neighbours.skin)
    twin.force[:] = np.nan
    force_calls.check_agreement(twin(), expected, "double")
    force_calls.check_agreement(script(), expected, "double")
    force_calls.check_agreement(script(script.near(script.places()[1])), expected, "double")
    with pytest.raises(AssertionError, match="forces differ by"):
        force_calls.check_agreement((expected[0] + 1e-8 * np.abs(expected[0]).max(),
                                     expected[1]), expected, "double")


def test_useful_pairs_are_those_of_a_plain_count(benchmarks, loose):
    systems = benchmarks("systems")
    system, state = loose("water")
    place, owner = systems.site_places(system, state)
    count = 0
    for k in range(len(place) - 1):
        apart = place[k + 1:] - place[k]
        apart -= state.box * np.round(apart / state.box)
        count += np.count_nonzero(((apart**2).sum(axis=1) <= 0.6**2)
                                  & (owner[k + 1:] != owner[k]))
    assert systems.useful_pairs(system, state) == count


def pairs_of_atoms(benchmarks, bodies):
    systems, state = benchmarks("systems"), benchmarks("starts").liquid("atoms", bodies, 0.6)
    return systems.useful_pairs(systems.with_plain_cutoff("atoms", bodies, cutoff=0.6), state)


def test_repeated_boxes_keep_density_and_structure(benchmarks):
    liquid = benchmarks("starts").liquid
    assert pairs_of_atoms(benchmarks, 4000) == 8 * pairs_of_atoms(benchmarks, 500)
    small, odd = liquid("atoms", 500, 0.6), liquid("atoms", 3997, 0.6)
    assert odd.position.shape == (3997, 3)
    assert 3997 / odd.box.prod() == pytest.approx(500 / small.box.prod(), rel=1e-12)


def test_one_row(benchmarks, monkeypatch, capsys):
    speed = benchmarks("speed")
    monkeypatch.setattr(sys, "argv", [
        "speed.py", "--json", "--system", "atoms", "--bodies", "500", "--threads", "1",
        "--precision", "double", "--cutoff", "0.6 nm"])
    threads = numba.get_num_threads()
    try:
        speed.main()
    finally:
        numba.set_num_threads(threads)
    row = json.loads(capsys.readouterr().out)
    assert row["useful_pairs"] == pairs_of_atoms(benchmarks, 500)
    assert row["ns_per_useful_pair"] == pytest.approx(
        1e6 * row["ms_per_force_call"] / row["useful_pairs"])
    assert row["steps_per_second"] > 0


def test_compiling_while_timing_is_noticed(benchmarks):
    timing = benchmarks("timing")
    fresh = numba.njit(lambda x: x + 1)
    with pytest.raises(RuntimeError, match="compiled while it was timed"):
        with timing.nothing_compiled():
            fresh(1)
    with timing.nothing_compiled():
        fresh(2)


def test_the_correlated_noise_is_what_was_written(benchmarks, tmp_path):
    analysis, path = benchmarks("analysis"), tmp_path / "dark-000.h5"
    analysis.write_noise(path, 300, 20)
    found = analysis.correlate(path, 10)
    with h5py.File(path) as file:
        x = file["particles/bodies/torque/value"][()].astype(float)
    for lag in (0, 7):
        plain = np.einsum("tnp,tnq->pq", x[: 300 - lag], x[lag:]) / (20 * (300 - lag))
        np.testing.assert_allclose(found[0, 10 + lag], plain, rtol=0, atol=1e-10)
