"""Kernels give the same bits whether they were just compiled or found in the cache."""

import os
import subprocess
import sys

import pytest

CODE = """
import hashlib, numpy as np
from swirlight.forces.field import ForceField
from swirlight.motion.draw import draw_motion, draw_orientations
from swirlight.motion.step import Mover
from swirlight.motion.thermostats import make_thermostat
from swirlight.run.arrange import lattice_positions
from swirlight.species.library import load_species
from swirlight.state import State
from swirlight.system import Interactions, System

box, random = np.full(3, 1.7), np.random.default_rng(5)
system = System((load_species("water"),), (48,), Interactions(0.8, precision={precision!r}), 300.0)
state = State(lattice_positions(48, box, random), draw_orientations(48, random),
              np.zeros((48, 3)), np.zeros((48, 3)), box, random=random)
draw_motion(system, state)
mover = Mover(system, ForceField(system, box), None, 0.0002,
              make_thermostat(system, "langevin", 2.0))
mover.begin(state)
for step in range(61):
    mover.advance(state, energies=step % 3 == 0)
digest = hashlib.sha256()
for name in state.ARRAYS:
    digest.update(getattr(state, name).tobytes())
print(digest.hexdigest(), mover.total_energy(state).hex())
"""


def run(precision, cache, **more):
    done = subprocess.run(
        [sys.executable, "-c", CODE.format(precision=precision)], capture_output=True, text=True,
        env={**os.environ, "NUMBA_CACHE_DIR": str(cache), **more}, timeout=600,
    )
    assert done.returncode == 0, done.stderr
    return done.stdout


@pytest.mark.parametrize("precision", ["mixed", pytest.param("double", marks=pytest.mark.slow)])
def test_same_bits_from_an_empty_cache_a_full_one_and_any_number_of_threads(tmp_path, precision):
    first = run(precision, tmp_path)
    assert run(precision, tmp_path) == first
    assert run(precision, tmp_path, NUMBA_NUM_THREADS="1") == first


def test_a_kernel_that_cannot_be_cached_only_costs_time():
    code = """
from swirlight.compiled import kernel
exec(compile("def f(x): return x + 1", "nowhere", "exec"))
print(kernel(f)(1))
"""
    done = subprocess.run([sys.executable, "-W", "default", "-c", code], capture_output=True,
                          text=True)
    assert done.stdout == "2\n", done.stderr
    assert "compiled at each start" in done.stderr


def test_a_cache_folder_of_the_users_own_is_keyed_by_the_sources_too(tmp_path, monkeypatch):
    """Or it would give the old code of an edited callee; what a worker inherits stays as it is."""
    from swirlight.compiled import cache_folder

    monkeypatch.setenv("NUMBA_CACHE_DIR", str(tmp_path))
    mine = cache_folder()
    assert mine.parent == tmp_path and mine.name.startswith("kernels-")
    monkeypatch.setenv("NUMBA_CACHE_DIR", str(mine))
    assert cache_folder() == mine
    monkeypatch.delenv("NUMBA_CACHE_DIR")
    assert cache_folder().name == mine.name and cache_folder() != mine
