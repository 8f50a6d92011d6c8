"""Langevin dynamics: the exact Ornstein–Uhlenbeck law, equipartition, shared noise."""

import numpy as np
import pytest
from scipy import stats

from swirlight.errors import InputError
from swirlight.motion.energy import kinetic_energies
from swirlight.motion.kernels import Workspace, mix_with_bath
from swirlight.motion.ledger import Ledger
from swirlight.motion.step import Mover
from swirlight.motion.thermostats import make_thermostat
from swirlight.rotation import rotation_matrix, to_body
from swirlight.units import BOLTZMANN

from .bodies import body, system, thermal
from .sources import Springs
from .test_step import MIXTURE


def test_bath_equals_its_plain_twin():
    bodies = system(*MIXTURE)
    state = thermal(bodies)
    before, ledger = state.copy(), Ledger()
    keep, heat = 0.8, 0.36 * 2.5
    noise = np.random.default_rng(2).standard_normal((bodies.bodies, 6))
    mix_with_bath(state, bodies, keep, heat, True, True, noise, Workspace(bodies.bodies), ledger)

    width = np.sqrt(heat / bodies.mass)[:, None]
    assert np.allclose(state.velocity, keep * before.velocity + width * noise[:, :3], rtol=1e-13)
    turn = rotation_matrix(before.orientation)
    root = np.einsum("nik,nk,njk->nij", turn, np.sqrt(heat * bodies.inertia), turn)
    spin = keep * before.angular_momentum + np.einsum("nij,nj->ni", root, noise[:, 3:])
    assert np.allclose(state.angular_momentum, spin, atol=1e-12)
    gain = sum(kinetic_energies(bodies, state)) - sum(kinetic_energies(bodies, before))
    assert ledger.bath_work == pytest.approx(gain, rel=1e-11)
    change = (state.angular_momentum - before.angular_momentum).sum(axis=0)
    assert np.allclose(ledger.bath_impulse, change, atol=1e-12)
    assert np.array_equal(state.angular_momentum[9:12], np.zeros((3, 3)))  # atoms


@pytest.mark.parametrize("acts_on", ["translation", "rotation"])
def test_a_part_that_is_not_acted_on_stays(acts_on):
    bodies = system(*MIXTURE)
    state = thermal(bodies)
    before = state.copy()
    bath = make_thermostat(bodies, "langevin", friction=5.0, acts_on=acts_on)
    bath.act(state, bodies, 0.1, Workspace(bodies.bodies), Ledger())
    kept = {"translation": "angular_momentum", "rotation": "velocity"}
    assert bath.conserves_momentum == (acts_on == "rotation")
    for part, name in kept.items():
        unchanged = np.array_equal(getattr(state, name), getattr(before, name))
        assert unchanged == (part == acts_on)


def test_ornstein_uhlenbeck_variance_is_exact_for_any_step():
    """From rest, after t: ⟨m v²⟩ = kT (1 − e^{−2γt}), whatever the steps (exact OU law)."""
    count = 20000
    bodies = system((body((0.1, 0.2, 0.28)), count))
    friction = 2.0
    for steps, dt in ((1, 0.3), (6, 0.05)):
        state = thermal(bodies)
        state.velocity[:], state.angular_momentum[:] = 0, 0
        bath = make_thermostat(bodies, "langevin", friction=friction)
        for _ in range(steps):
            bath.act(state, bodies, dt, Workspace(count), Ledger())
        expected = BOLTZMANN * 300 * -np.expm1(-2 * friction * steps * dt)
        error = 4 * expected * np.sqrt(2 / count)  # 4 sigma of a mean of squared normals
        spin = to_body(state.orientation, state.angular_momentum)
        for k in range(3):
            assert abs((20.0 * state.velocity[:, k] ** 2).mean() - expected) < error
            assert abs((spin[:, k] ** 2 / bodies.inertia[0, k]).mean() - expected) < error


def test_equipartition_and_maxwell_distribution():
    """Bodies on springs in an uneven field, Langevin at 300 K; independent bodies."""
    count = 6000
    bodies = system((body((0.1, 0.2, 0.28), dipole=(0.02, 0.05, -0.03)), count // 2),
                    (body((0.3, 0.3, 0.0), dipole=(0, 0, 0.06)), count // 2))
    state = thermal(bodies)
    state.velocity *= 0.1
    state.angular_momentum *= 0.1
    state.position[:] = 0
    bath = make_thermostat(bodies, "langevin", friction=8.0)
    mover = Mover(bodies, Springs(bodies), None, 0.004, bath)
    mover.begin(state)
    for _ in range(400):
        mover.advance(state, energies=False)
    kt, half = BOLTZMANN * 300, count // 2
    sigma = 4 * np.sqrt(2 / half)
    spin = to_body(state.orientation, state.angular_momentum)
    for part in (slice(0, half), slice(half, count)):
        for k in range(3):
            # 0.3 % allows for the O(dt²) error of the splitting at this long step
            v2 = (bodies.mass * state.velocity[:, k] ** 2)[part].mean() / kt
            assert abs(v2 - 1) < sigma + 0.003
            if bodies.inertia[part][0, k] > 0:
                l2 = (spin[part, k] ** 2 * bodies.inverse_inertia[part, k]).mean() / kt
                assert abs(l2 - 1) < sigma + 0.003
    assert np.abs(spin[half:, 2]).max() < 1e-12  # linear bodies: none about the axis
    speeds = state.velocity * np.sqrt(bodies.mass / kt)[:, None]
    # p > 6e-5 is the 4 sigma level; the seed is fixed
    assert stats.kstest(speeds.ravel(), "norm").pvalue > 6e-5


def test_twins_share_the_noise():
    """Same generator, different momenta: the difference decays as e^{−γt}, free of noise."""
    bodies = system((body((0.3, 0.3, 0.3)), 50))
    plus = thermal(bodies)
    minus = plus.copy()
    minus.angular_momentum += 0.1
    minus.velocity -= 0.2
    for state in (plus, minus):
        bath = make_thermostat(bodies, "langevin", friction=2.0)
        mover = Mover(bodies, None, None, 0.01, bath)
        mover.begin(state)
        for _ in range(100):
            mover.advance(state)
    # spherical tops: R √I Rᵀ is a number, the laboratory noise acts alike whatever R
    assert np.allclose(minus.angular_momentum - plus.angular_momentum, 0.1 * np.exp(-2.0),
                       atol=1e-12)
    assert np.allclose(minus.velocity - plus.velocity, -0.2 * np.exp(-2.0), atol=1e-12)
    assert plus.generator_text() == minus.generator_text()


def test_bath_has_the_same_bits_on_threads():
    bodies = system(*[(species, 50 * count) for species, count in MIXTURE])
    results = []
    for parallel in (False, True):
        state, ledger, work = thermal(bodies), Ledger(), Workspace(bodies.bodies)
        work.parallel = parallel
        bath = make_thermostat(bodies, "langevin", friction=2.0)
        bath.act(state, bodies, 0.01, work, ledger)
        results.append((state.velocity, state.angular_momentum, ledger.values[:-1]))
    assert all(np.array_equal(a, b) for a, b in zip(*results, strict=True))


def test_thermostats_are_chosen_by_name():
    bodies = system(*MIXTURE)
    assert make_thermostat(bodies, "none") is None
    assert make_thermostat(bodies, "langevin", time=0.5).friction == 2.0
    with pytest.raises(InputError, match="expected one of none, langevin"):
        make_thermostat(bodies, "icebox")
    with pytest.raises(InputError, match="expected one of all, translation, rotation"):
        make_thermostat(bodies, "langevin", friction=1.0, acts_on="vibration")
    with pytest.raises(InputError, match="a friction .* or a time is needed"):
        make_thermostat(bodies, "langevin")
