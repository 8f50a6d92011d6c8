"""A mesh part that acts at every n-th step: the impulse form against its plain twin."""

from types import SimpleNamespace

import numpy as np
import pytest

from swirlight.motion.step import Mover
from swirlight.system import Interactions, System

from .bodies import thermal
from .sources import Springs
from .test_rotor import turn_plainly
from .test_step import MIXTURE

TIMESTEP = 0.002


def mixture(mesh_every):
    species, counts = zip(*MIXTURE, strict=True)
    return System(species, counts, Interactions(1.0, electrostatics="none",
                                                mesh_every=mesh_every), 300.0)


class TwoParts:
    """Stiff springs at every step, and slow ones in place of a mesh; keeps who was called."""

    def __init__(self, bodies):
        self.quick = Springs(bodies)
        self.slow = Springs(bodies, stiffness=7.0, field=(-1.0, 4.0, 0.5), depth=1.0)
        self.calls = []

    def evaluate(self, position, orientation, box, energies=True, mesh=True):
        quick = self.quick.evaluate(position, orientation, box)
        self.calls.append(mesh)
        if not (mesh or energies):
            return SimpleNamespace(force=quick.force, torque=quick.torque, energy=None)
        slow = self.slow.evaluate(position, orientation, box)
        return SimpleNamespace(
            force=quick.force + slow.force, torque=quick.torque + slow.torque,
            mesh_force=slow.force, mesh_torque=slow.torque,
            energy=quick.energy + slow.energy)


def step_plainly(bodies, state, parts, n, steps):
    """The scheme as it stands in the papers, block by block, one body at a time."""
    for step in range(steps):
        for moment, now in (("before", step), ("after", step + 1)):
            if moment == "after":
                state.position += TIMESTEP * state.velocity
                for i in range(bodies.bodies):
                    state.orientation[i] = turn_plainly(
                        state.orientation[i], state.angular_momentum[i], bodies.inertia[i],
                        TIMESTEP)
            forces = [(1, parts.quick)] + [(n, parts.slow)] * (now % n == 0)
            for weight, source in forces:
                found = source.evaluate(state.position, state.orientation, state.box)
                h = 0.5 * TIMESTEP * weight
                state.velocity += h * found.force / bodies.mass[:, None]
                state.angular_momentum += h * found.torque


@pytest.mark.parametrize("n", [2, 3])
def test_steps_equal_their_plain_twin(n):
    bodies = mixture(n)
    state, steps = thermal(bodies), 4 * n
    plain, parts = state.copy(), TwoParts(bodies)
    mover = Mover(bodies, parts, None, TIMESTEP, remove_momentum=False)
    mover.begin(state)
    for step in range(1, steps + 1):
        mover.advance(state, energies=step % n == 0)
    step_plainly(bodies, plain, parts, n, steps)
    for name in ("position", "orientation", "velocity", "angular_momentum"):
        np.testing.assert_allclose(getattr(state, name), getattr(plain, name), rtol=0, atol=1e-12)
    assert parts.calls == [step % n == 0 for step in range(steps + 1)]
    total = parts.evaluate(state.position, state.orientation, state.box)
    np.testing.assert_array_equal(mover.load.force, total.force)  # what is recorded is the whole
    np.testing.assert_array_equal(mover.load.torque, total.torque)


def test_impulses_stand_in_the_ledger():
    bodies, n = mixture(2), 2
    state = thermal(bodies)
    mover = Mover(bodies, TwoParts(bodies), None, TIMESTEP)
    mover.begin(state)
    before = state.angular_momentum.sum(axis=0)
    for step in range(1, 10 * n + 1):
        mover.advance(state, energies=step % n == 0)
        change = state.angular_momentum.sum(axis=0) - before
        assert np.allclose(change, mover.ledger.pair_impulse, rtol=0, atol=1e-12)


def test_energy_error_falls_with_the_square_of_the_step():
    """rms of the residual at whole multiples of n steps, ratio 4 within 15 %."""
    bodies, n, rms = mixture(2), 2, []
    for dt in (0.004, 0.002):
        state, course = thermal(bodies), []
        mover = Mover(bodies, TwoParts(bodies), None, dt)
        mover.begin(state)
        for step in range(1, round(2.0 / dt) + 1):
            mover.advance(state, energies=step % n == 0)
            if step % n == 0:
                course.append(mover.energy_residual(state))
        rms.append(np.std(course))
    assert rms[0] / rms[1] == pytest.approx(4, rel=0.15)
