"""The free rotor: against its plain twin, exact solutions, and time reversed."""

import numpy as np
import pytest
from scipy.integrate import solve_ivp

from swirlight import rotation
from swirlight.motion.kernels import drift
from swirlight.motion.rotor import ASYMMETRIC, ATOM, SYMMETRIC, rotor_kinds

from .bodies import body, system, thermal

INERTIAS = {
    "atom": (0, 0, 0), "linear": (0.4, 0.4, 0), "spherical": (0.3, 0.3, 0.3),
    "oblate": (0.2, 0.2, 0.35), "prolate": (0.5, 0.5, 0.1), "asymmetric": (0.1, 0.2, 0.28),
}


def turn_plainly(q, spin, inertia, t):
    """The five rotations, or the two, in numpy and one body at a time."""
    x, y, z = inertia
    if max(inertia) == 0:
        return q
    if x == y:
        about_l = rotation.from_vector(spin * t / x)
        along = rotation.to_body(q, spin)[2] * ((1 / z - 1 / x) if z else 0.0)
        return rotation.multiply(rotation.multiply(about_l, q),
                                 rotation.from_vector(np.array([0, 0, t * along])))
    for axis, share in ((0, 0.5), (1, 0.5), (2, 1.0), (1, 0.5), (0, 0.5)):
        turn = np.zeros(3)
        turn[axis] = share * t * rotation.to_body(q, spin)[axis] / inertia[axis]
        q = rotation.multiply(q, rotation.from_vector(turn))
    return q


def many(name, count=20, seed=3):
    bodies = system((body(INERTIAS[name]), count))
    return bodies, thermal(bodies, seed)


def test_kinds():
    kinds = rotor_kinds(np.array(list(INERTIAS.values()), float))
    assert list(kinds) == [ATOM, SYMMETRIC, SYMMETRIC, SYMMETRIC, SYMMETRIC, ASYMMETRIC]


@pytest.mark.parametrize("name", INERTIAS)
@pytest.mark.parametrize("t", [0.002, 0.3])
def test_kernel_equals_plain_twin(name, t):
    bodies, state = many(name)
    before = state.copy()
    drift(state, bodies, rotor_kinds(bodies.inertia), t)
    expected = np.array([
        turn_plainly(q, spin, INERTIAS[name], t)
        for q, spin in zip(before.orientation, before.angular_momentum, strict=True)
    ])
    assert np.allclose(state.orientation, expected, atol=2e-14)
    assert np.allclose(state.position, before.position + t * before.velocity, atol=1e-14)
    assert np.array_equal(state.angular_momentum, before.angular_momentum)
    assert np.allclose(np.linalg.norm(state.orientation, axis=1), 1, atol=5e-16)


def exact(q, spin, inertia, t):
    """dq/dt = ½ q ω_body with L constant, at high accuracy (scipy, DOP853)."""
    inverse = np.divide(1.0, inertia, out=np.zeros(3), where=np.array(inertia) > 0)

    def rate(_, q):
        omega = rotation.to_body(rotation.normalised(q), spin) * inverse
        return 0.5 * rotation.multiply(q, np.concatenate([[0.0], omega]))

    return solve_ivp(rate, (0, t), q, method="DOP853", rtol=1e-12, atol=1e-13).y[:, -1]


@pytest.mark.parametrize("name", ["linear", "spherical", "oblate", "prolate"])
def test_symmetric_bodies_are_exact_in_one_long_step(name):
    bodies, state = many(name, count=5)
    before = state.copy()
    drift(state, bodies, rotor_kinds(bodies.inertia), 1.5)
    for i in range(5):
        q = exact(before.orientation[i], before.angular_momentum[i], INERTIAS[name], 1.5)
        assert np.allclose(state.orientation[i], q, atol=1e-10)


def test_free_rotation_runs_backwards_to_rounding():
    for name in INERTIAS:
        bodies, state = many(name)
        before, kinds = state.copy(), rotor_kinds(bodies.inertia)
        for _ in range(500):
            drift(state, bodies, kinds, 0.01)
        state.angular_momentum *= -1
        state.velocity *= -1
        for _ in range(500):
            drift(state, bodies, kinds, 0.01)
        assert np.abs(state.orientation - before.orientation).max() < 1e-12


def test_drift_has_the_same_bits_on_threads():
    bodies = system(*[(body(inertia), 37) for inertia in INERTIAS.values()])
    a = thermal(bodies)
    b, kinds = a.copy(), rotor_kinds(bodies.inertia)
    drift(a, bodies, kinds, 0.01, parallel=False)
    drift(b, bodies, kinds, 0.01, parallel=True)
    assert np.array_equal(a.orientation, b.orientation)
    assert np.array_equal(a.position, b.position)
