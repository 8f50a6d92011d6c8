"""The step with the real forces of a small liquid: what must hold to the last bit, and energy."""

import copy
from dataclasses import replace

import numba
import numpy as np
import pytest

from swirlight.forces.field import ForceField
from swirlight.light.light import Light
from swirlight.motion.draw import draw_motion, draw_orientations
from swirlight.motion.ledger import Ledger
from swirlight.motion.step import Mover
from swirlight.motion.thermostats import make_thermostat
from swirlight.run.arrange import lattice_positions, remove_overlaps
from swirlight.species.library import load_species
from swirlight.state import State
from swirlight.system import Interactions, System

from .test_light import terahertz

COUNT = 125


@pytest.fixture(scope="module")
def liquid():
    """Water, settled for half a picosecond from a lattice."""
    system = System((load_species("water"),), (COUNT,), Interactions(cutoff=0.75))
    box, random = np.full(3, (COUNT / 33.3) ** (1 / 3)), np.random.default_rng(1)
    still = np.zeros((COUNT, 3))
    state = State(lattice_positions(COUNT, box, random), draw_orientations(COUNT, random),
                  still, still.copy(), box, random=random)
    field = ForceField(system, box)
    remove_overlaps(system, state, field)
    draw_motion(system, state)
    bath = make_thermostat(system, "langevin", friction=10.0)
    mover = Mover(system, field, None, 0.001, bath)
    mover.begin(state)
    for _ in range(500):
        mover.advance(state, energies=False)
    return system, state, Light(system, (terahertz(1e10, duration=0.1, centre=0.15),))


def with_mesh_every(system, steps):
    return replace(system, interactions=replace(system.interactions, mesh_every=steps))


def mover_of(system, state, light, dt=0.002, friction=None):
    bath = friction and make_thermostat(system, "langevin", friction=friction)
    return Mover(system, ForceField(system, state.box), light, dt, bath)


@pytest.mark.parametrize("mesh_every", [1, 2])
def test_energy_and_both_momenta(liquid, mesh_every):
    system, start, light = liquid
    system = with_mesh_every(system, mesh_every)
    residuals = []
    for dt in (0.001, 0.0005):
        state = start.copy()
        mover = mover_of(system, state, light, dt)
        mover.begin(state)
        before, course = state.angular_momentum.sum(axis=0), []
        for step in range(1, round(0.3 / dt) + 1):
            sampled = step % mesh_every == 0
            mover.advance(state, energies=sampled)
            if sampled:
                course.append(mover.energy_residual(state))
        residuals.append(np.std(course) / COUNT)
        change = state.angular_momentum.sum(axis=0) - before
        assert np.abs(change).max() > 1
        assert np.allclose(change, mover.ledger.impulse, atol=1e-11)
        assert np.abs(system.mass @ state.velocity).max() < 1e-10
    assert residuals[0] < 2e-3  # kJ/mol a body at 1 fs, against 7.4 of kinetic energy
    assert residuals[0] / residuals[1] == pytest.approx(4, rel=0.3)


@pytest.mark.parametrize("mesh_every", [1, 2])
def test_resumption_and_threads_give_the_same_bits(liquid, mesh_every):
    system, start, light = liquid
    system, ends = with_mesh_every(system, mesh_every), []
    for threads in (1, min(2, numba.config.NUMBA_NUM_THREADS)):
        numba.set_num_threads(threads)
        state = start.copy()
        mover = mover_of(system, state, light, friction=2.0)
        mover.begin(state)
        for step in range(150):
            if step == 77:
                kept = copy.deepcopy((state, mover.force_field.memory(), mover.ledger.to_array()))
            mover.advance(state, energies=(step + 1) % mesh_every == 0)
        ends.append((state, mover.ledger))
    again, memory, numbers = kept
    mover = mover_of(system, again, light, friction=2.0)
    mover.force_field.restore(memory)
    mover.begin(again, 77 * 0.002, energies=77 % mesh_every == 0)
    mover.ledger = Ledger.from_array(numbers)
    for step in range(77, 150):
        mover.advance(again, energies=(step + 1) % mesh_every == 0)
    ends.append((again, mover.ledger))
    for state, ledger in ends[1:]:
        for name in State.ARRAYS:
            assert np.array_equal(getattr(state, name), getattr(ends[0][0], name))
        assert np.array_equal(ledger.values, ends[0][1].values)
