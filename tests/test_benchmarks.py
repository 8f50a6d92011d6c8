"""What the engine's speed is compared with must do the same work: same forces, same torques."""

import importlib
import json
import pathlib
import sys

import numpy as np
import pytest

from swirlight.compiled import numba

FOLDER = pathlib.Path(__file__).parents[1] / "benchmarks"


@pytest.fixture(scope="module")
def benchmarks():
    """Import a module of the benchmarks by its name."""
    sys.path.insert(0, str(FOLDER))
    yield importlib.import_module
    sys.path.remove(str(FOLDER))


@pytest.fixture
def small(benchmarks):
    """A system and a state whose box just holds one image of each body at 0.6 nm."""
    def make(name, precision="double", bodies=300, cutoff=0.6):
        systems, starts = benchmarks("systems"), benchmarks("starts")
        system = systems.with_plain_cutoff(name, bodies, precision, cutoff)
        return system, starts.liquid(name, bodies, cutoff)

    return make


@pytest.mark.parametrize("name", ["water", "atoms", "five"])
def test_rivals_agree_with_the_engine(benchmarks, small, name):
    force_calls = benchmarks("force_calls")
    system, state = small(name)
    call = force_calls.ForceCall(system, state)
    expected = call()
    for rival in force_calls.rivals(system, state, call.pairs.neighbours.skin):
        force_calls.check_agreement(rival(), expected, "double")
    twin = force_calls.rivals(system, state, 0.0)[0]
    twin.force[:] = np.nan
    force_calls.check_agreement(twin(), expected, "double")
    wrong = expected[0] * (1 + 1e-8), expected[1]
    with pytest.raises(AssertionError, match="forces differ by"):
        force_calls.check_agreement(wrong, expected, "double")


def test_useful_pairs_are_those_of_a_plain_count(benchmarks, small):
    systems = benchmarks("systems")
    system, state = small("water")
    place, owner = systems.site_places(system, state)
    count = 0
    for k in range(len(place) - 1):
        apart = place[k + 1:] - place[k]
        apart -= state.box * np.round(apart / state.box)
        count += np.count_nonzero(((apart**2).sum(axis=1) <= 0.6**2)
                                  & (owner[k + 1:] != owner[k]))
    assert systems.useful_pairs(system, state) == count


def test_repeated_boxes_keep_density_and_structure(benchmarks, small):
    starts, systems = benchmarks("starts"), benchmarks("systems")
    system, state = small("atoms", bodies=500)
    pairs = systems.useful_pairs(system, state)
    large, many = small("atoms", bodies=4000)
    assert systems.useful_pairs(large, many) == 8 * pairs
    assert many.box == pytest.approx(2 * state.box, rel=1e-12)
    odd = starts.liquid("atoms", 3997, 0.6)
    assert odd.position.shape == (3997, 3)
    assert 3997 / odd.box.prod() == pytest.approx(500 / state.box.prod(), rel=1e-12)


def test_one_row(benchmarks, small, monkeypatch, capsys):
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
    assert row["useful_pairs"] == benchmarks("systems").useful_pairs(*small("atoms", bodies=500))
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
