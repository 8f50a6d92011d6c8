"""The step: kicks against their plain twin, order, reversal, ledgers, resumption, threads."""

import numba
import numpy as np
import pytest

from swirlight.errors import RunError
from swirlight.motion.energy import angular_velocity, kinetic_energies, kinetic_temperature
from swirlight.motion.kernels import Workspace, kick
from swirlight.motion.ledger import Ledger
from swirlight.motion.step import Mover
from swirlight.motion.thermostats import make_thermostat
from swirlight.rotation import rotation_matrix, to_body
from swirlight.units import BOLTZMANN

from .bodies import body, still, system, thermal
from .sources import Broken, Springs

MIXTURE = (
    (body((0.1, 0.2, 0.28), dipole=(0.02, 0.05, -0.03), name="asymmetric"), 5),
    (body((0.3, 0.3, 0.0), dipole=(0, 0, 0.06), name="linear"), 4),
    (body((0, 0, 0), name="atom"), 3),
    (body((0.2, 0.2, 0.35), dipole=(0, 0, 0.04), name="oblate"), 2),
)


def run(bodies, state, steps, dt=0.002, thermostat=None, **options):
    mover = Mover(bodies, Springs(bodies), None, dt, thermostat, **options)
    mover.begin(state)
    for _ in range(steps):
        mover.advance(state)
    return mover


# --- kicks --------------------------------------------------------------------------------


def random_sources(bodies, seed=5):
    random = np.random.default_rng(seed)
    turning = (bodies.freedom > 0)[:, None]
    return [(random.standard_normal((bodies.bodies, 3)),
             turning * random.standard_normal((bodies.bodies, 3))) for _ in range(3)]


def test_kick_equals_its_plain_twin():
    bodies = system(*MIXTURE)
    state = thermal(bodies)
    before, ledger, h = state.copy(), Ledger(), 0.013
    pair, light, bias = random_sources(bodies)
    assert kick(state, bodies, pair, light, bias, h, Workspace(bodies.bodies), ledger) == -1

    force, torque = pair[0] + light[0] + bias[0], pair[1] + light[1] + bias[1]
    assert np.allclose(state.velocity, before.velocity + h * force / bodies.mass[:, None],
                       rtol=1e-14)
    assert np.allclose(state.angular_momentum, before.angular_momentum + h * torque, rtol=1e-14)
    omega = 0.5 * (angular_velocity(bodies, before) + angular_velocity(bodies, state))
    velocity = 0.5 * (before.velocity + state.velocity)
    works = [h * ((s[0] * velocity).sum() + (s[1] * omega).sum()) for s in (pair, light, bias)]
    assert ledger.light_work == pytest.approx(works[1], rel=1e-12)
    assert ledger.bias_work == pytest.approx(works[2], rel=1e-12)
    for s, impulse in zip((pair, light, bias), (ledger.pair_impulse, ledger.light_impulse,
                                                ledger.bias_impulse), strict=True):
        assert np.allclose(impulse, h * s[1].sum(axis=0), rtol=1e-12)
    # the works of all sources together are the change of kinetic energy, exactly
    change = sum(kinetic_energies(bodies, state)) - sum(kinetic_energies(bodies, before))
    assert change == pytest.approx(sum(works), rel=1e-11)


def test_kicks_have_the_same_bits_on_threads():
    bodies = system(*[(species, 50 * count) for species, count in MIXTURE])
    pair, light, bias = random_sources(bodies)
    results = []
    for parallel in (False, True):
        state, ledger, work = thermal(bodies), Ledger(), Workspace(bodies.bodies)
        work.parallel = parallel
        kick(state, bodies, pair, light, bias, 0.01, work, ledger)
        results.append((state.velocity, state.angular_momentum, ledger.values[:-1]))
    assert all(np.array_equal(a, b) for a, b in zip(*results, strict=True))


def test_kinetic_energies_and_angular_velocity_in_plain_numpy():
    bodies = system(*MIXTURE)
    state = thermal(bodies)
    translation, rotation = kinetic_energies(bodies, state)
    assert translation == pytest.approx(
        0.5 * (bodies.mass[:, None] * state.velocity**2).sum(), rel=1e-13)
    spin = to_body(state.orientation, state.angular_momentum)
    assert rotation == pytest.approx(0.5 * (spin**2 * bodies.inverse_inertia).sum(), rel=1e-13)
    omega = np.einsum("nij,nj->ni", rotation_matrix(state.orientation),
                      spin * bodies.inverse_inertia)
    assert np.allclose(angular_velocity(bodies, state), omega, atol=1e-12)
    assert kinetic_temperature(translation, 6) == 2 * translation / (6 * BOLTZMANN)
    assert np.isnan(kinetic_temperature(0.0, 0))


# --- the step ------------------------------------------------------------------------------


def test_runs_backwards_to_rounding():
    bodies = system(*MIXTURE)
    state = thermal(bodies)
    before = state.copy()
    run(bodies, state, 400, remove_momentum=False)
    assert np.abs(state.position - before.position).max() > 0.1
    state.velocity *= -1
    state.angular_momentum *= -1
    run(bodies, state, 400, remove_momentum=False)
    assert np.abs(state.position - before.position).max() < 1e-10
    assert np.abs(state.orientation - before.orientation).max() < 1e-9
    assert np.abs(state.angular_momentum + before.angular_momentum).max() < 1e-9


def test_energy_error_is_bounded_and_second_order():
    bodies = system(*MIXTURE)
    worst = []
    for dt in (0.004, 0.002, 0.001):
        state = thermal(bodies)
        mover = Mover(bodies, Springs(bodies), None, dt)
        mover.begin(state)
        residual = []
        for _ in range(round(4.0 / dt)):
            mover.advance(state)
            residual.append(mover.energy_residual(state))
        residual = np.abs(residual)
        half = len(residual) // 2
        assert residual[half:].max() < 1.5 * residual[:half].max()  # bounded: no drift
        worst.append(residual.max())
    assert worst[0] / worst[1] == pytest.approx(4, rel=0.15)
    assert worst[1] / worst[2] == pytest.approx(4, rel=0.15)


def test_angular_momentum_ledger_is_exact():
    bodies = system(*MIXTURE)
    state = thermal(bodies)
    before = state.angular_momentum.sum(axis=0)
    mover = run(bodies, state, 500, thermostat=make_thermostat(bodies, "langevin", friction=3.0))
    change = state.angular_momentum.sum(axis=0) - before
    assert np.abs(change).max() > 1
    assert np.allclose(mover.ledger.impulse, change, atol=1e-11)


def test_resumption_gives_the_same_bits():
    bodies = system(*MIXTURE)

    def fresh():
        bath = make_thermostat(bodies, "langevin", friction=3.0)
        return Mover(bodies, Springs(bodies), None, 0.002, bath)

    straight, mover = thermal(bodies), fresh()
    mover.begin(straight)
    for step in range(600):
        if step == 271:
            saved, numbers = straight.copy(), mover.ledger.to_array()
        mover.advance(straight)

    again = fresh()
    again.begin(saved, time=271 * 0.002)
    again.ledger = Ledger.from_array(numbers)
    for _ in range(600 - 271):
        again.advance(saved)
    for name in saved.ARRAYS:
        assert np.array_equal(getattr(saved, name), getattr(straight, name))
    assert np.array_equal(again.ledger.values, mover.ledger.values)
    assert saved.step == straight.step == 600
    assert saved.generator_text() == straight.generator_text()


def test_one_and_two_threads_give_the_same_bits():
    bodies = system(*[(species, 120 * count) for species, count in MIXTURE])
    results = []
    for threads in (1, min(2, numba.config.NUMBA_NUM_THREADS)):
        numba.set_num_threads(threads)
        state = thermal(bodies)
        mover = run(bodies, state, 20, thermostat=make_thermostat(bodies, "langevin", friction=3.0))
        assert mover._work.parallel
        results.append([getattr(state, n) for n in state.ARRAYS] + [mover.ledger.values])
    numba.set_num_threads(numba.config.NUMBA_NUM_THREADS)
    assert all(np.array_equal(a, b) for a, b in zip(*results, strict=True))


def test_total_momentum_is_removed_once_and_kept():
    bodies = system(*MIXTURE)
    state = thermal(bodies)
    mover = Mover(bodies, None, None, 0.002)
    assert np.abs(bodies.mass @ state.velocity).max() > 1
    mover.begin(state)
    assert np.abs(bodies.mass @ state.velocity).max() < 1e-12
    kept = state.copy()
    Mover(bodies, None, None, 0.002).begin(state)
    assert np.array_equal(state.velocity, kept.velocity)
    assert (mover.freedom.translation, mover.freedom.rotation) == (3 * 14 - 3, 3 * 7 + 2 * 4)
    bath = make_thermostat(bodies, "langevin", friction=1.0, acts_on="translation")
    assert Mover(bodies, None, None, 0.002, bath).freedom.translation == 3 * 14
    bath = make_thermostat(bodies, "langevin", friction=1.0, acts_on="rotation")
    assert Mover(bodies, None, None, 0.002, bath).freedom.translation == 3 * 14 - 3


@pytest.mark.parametrize("what", ["force", "torque"])
def test_a_broken_force_stops_the_run_and_names_step_and_body(what):
    bodies = system(*MIXTURE)
    state = still(bodies)
    mover = Mover(bodies, Broken(bodies, call=4, body=7, what=what), None, 0.002)
    mover.begin(state)
    mover.advance(state)
    mover.advance(state)
    with pytest.raises(RunError, match=rf"step 3: the {what} of the interactions of body 7 "
                                       r"\(linear\)"):
        mover.advance(state)


def test_begin_refuses_states_that_cannot_be():
    bodies = system(*MIXTURE)
    mover = Mover(bodies, None, None, 0.002)
    state = thermal(bodies)
    state.angular_momentum[9] = 0.1
    with pytest.raises(ValueError, match=r"body 9 \(atom\) has angular momentum"):
        mover.begin(state)
    state = thermal(bodies)
    state.orientation[2] *= 1.1
    with pytest.raises(ValueError, match="orientation of body 2 has length 1.1"):
        mover.begin(state)
    state = thermal(bodies)
    state.position = state.position[:-1]
    with pytest.raises(ValueError, match=r"state.position has shape \(13, 3\)"):
        mover.begin(state)
