"""Bodies in light: the step against accurate integration, and what the ledgers must add up to."""

import numpy as np
import pytest
from scipy.integrate import solve_ivp

from swirlight import rotation, units
from swirlight.light.envelope import Gaussian
from swirlight.light.light import Light
from swirlight.light.pulse import Bias, Pulse, amplitude_of_intensity
from swirlight.motion.energy import kinetic_energies
from swirlight.motion.ledger import Ledger
from swirlight.motion.step import Mover
from swirlight.motion.thermostats import make_thermostat

from .bodies import body, response, still, system, thermal
from .sources import Springs

ANGSTROM3 = units.CUBIC_ANGSTROM
OPTICAL = 2354.6  # rad/ps, 800 nm
TERAHERTZ = 2 * np.pi  # rad/ps, 1 THz

# a body without any symmetry; every number is invented
ALPHA_S = ANGSTROM3 * np.array([[20.0, 2.0, -1.0], [2.0, 28.0, 3.0], [-1.0, 3.0, 36.0]])
ALPHA_D = ANGSTROM3 * np.array([[1.5, 0.2, 0.1], [0.2, 1.1, -0.3], [0.1, -0.3, 0.7]])
GYRATION = ANGSTROM3 * np.array([0.6, -0.9, 1.2])
DIPOLE = np.array([0.03, 0.06, -0.02])  # e nm
INERTIA = np.array([0.1, 0.2, 0.28])


def leaning(**options):
    optics = response(ALPHA_S, ALPHA_D, GYRATION)
    return body(INERTIA, dipole=DIPOLE, response=optics, name="leaning", **options)


def optical(intensity=3e12, duration=0.3, centre=0.75, **options):
    options = {"ellipticity": 0.5, "azimuth": 0.3, **options}
    return Pulse(OPTICAL, amplitude_of_intensity(intensity), Gaussian(duration), centre, **options)


def terahertz(intensity=3e10, duration=1.0, centre=2.5, **options):
    options = {"ellipticity": np.pi / 4, "phase": 0.7, **options}
    return Pulse(TERAHERTZ, amplitude_of_intensity(intensity), Gaussian(duration), centre,
                 coupling="resolved", **options)


def tumbling(bodies):
    """A state turned and spinning, the same for every step length."""
    state = still(bodies)
    state.orientation[:] = rotation.from_vector(np.array([0.4, -0.8, 0.3]))
    spin = np.array([0.5, -0.3, 0.6]) * (bodies.inertia[0] > 0)
    state.angular_momentum[:] = rotation.to_laboratory(state.orientation, spin)
    return state


def travel(bodies, pulses, length, dt, state=None, bias=None, field=None, bath=None):
    state = tumbling(bodies) if state is None else state
    mover = Mover(bodies, field, Light(bodies, pulses, bias), dt, bath, remove_momentum=False)
    mover.begin(state)
    for _ in range(round(length / dt)):
        mover.advance(state)
    return mover, state


# --- against accurate integration ------------------------------------------------------------


def complex_amplitude(pulse, t):
    """𝓔 of a Gaussian pulse along z, from the conventions and not from the light room."""
    t = t - pulse.centre
    c, s = np.cos(pulse.azimuth), np.sin(pulse.azimuth)
    vector = (np.cos(pulse.ellipticity) * np.array([c, s, 0])
              + 1j * np.sin(pulse.ellipticity) * np.array([-s, c, 0]))
    return pulse.amplitude * np.exp(-2 * np.log(2) * (t / pulse.envelope.duration) ** 2) * vector


def averaged_torque(pulse, t, turn):
    """½ Re[(α 𝓔)×𝓔*] with α = αS + iαD − iε·g in the laboratory."""
    cross = np.cross(GYRATION, np.eye(3)).T  # (g×) as a matrix
    alpha = turn @ (ALPHA_S + 1j * (ALPHA_D + cross)) @ turn.T
    e = complex_amplitude(pulse, t)
    return 0.5 * np.cross(alpha @ e, e.conj()).real


def accurate(torque, inertia, state, length):
    """Orientation and angular momentum by scipy's DOP853 at rtol 1e-12, from dL/dt = τ."""
    inverse = np.divide(1.0, inertia, out=np.zeros(3), where=inertia > 0)

    def rate(t, y):
        q, spin = y[:4] / np.linalg.norm(y[:4]), y[4:]
        turn = rotation.rotation_matrix(q)
        omega = turn.T @ spin * inverse
        return np.concatenate([
            0.5 * rotation.multiply(q, np.concatenate([[0.0], omega])), torque(t, turn)])

    start = np.concatenate([state.orientation[0], state.angular_momentum[0]])
    end = solve_ivp(rate, (0, length), start, method="DOP853", rtol=1e-12, atol=1e-13).y[:, -1]
    return rotation.normalised(end[:4]), end[4:]


def compare(bodies, pulse, torque, length, steps=(0.001, 0.0005, 0.00025)):
    """Relative errors in L and absolute ones in q at each step length."""
    q, spin = accurate(torque, bodies.inertia[0], tumbling(bodies), length)
    errors = []
    for dt in steps:
        _, state = travel(bodies, (pulse,), length, dt)
        change = np.linalg.norm(spin - tumbling(bodies).angular_momentum[0])
        assert change > 0.3 * np.linalg.norm(spin)  # the light matters
        errors.append(max(np.linalg.norm(state.angular_momentum[0] - spin) / np.linalg.norm(spin),
                          np.abs(state.orientation[0] - q).max()))
    return np.array(errors)


def test_general_body_in_an_elliptic_pulse():
    bodies = system((leaning(), 1))
    pulse = optical()
    errors = compare(bodies, pulse, lambda t, turn: averaged_torque(pulse, t, turn), 1.5)
    assert errors[-1] < 1e-4  # at 0.25 fs
    assert errors[:-1] / errors[1:] == pytest.approx(4, rel=0.1)


@pytest.mark.parametrize("kind", ["general", "linear"])
def test_dipole_in_a_carrier_resolved_pulse(kind):
    if kind == "general":
        bodies, alpha, dipole = system((leaning(), 1)), ALPHA_S, DIPOLE
    else:
        alpha, dipole = ANGSTROM3 * np.diag([3.0, 3.0, 8.0]), np.array([0, 0, 0.06])
        rod = body((0.3, 0.3, 0), dipole=dipole, response=response(alpha))
        bodies = system((rod, 1))
    pulse = terahertz(5e11)

    def torque(t, turn):
        e = complex_amplitude(pulse, t)
        rate = -4 * np.log(2) * (t - pulse.centre) / pulse.envelope.duration**2
        carrier = np.exp(-1j * (pulse.carrier * (t - pulse.centre) + pulse.phase))
        slow, quick = e * carrier, (1 + 1j * rate / pulse.carrier) * e * carrier
        field = quick.real
        moment = turn @ dipole + turn @ alpha @ turn.T @ field
        if kind == "general":
            # narrow-band absorption and gyration: −(αD Ė + g×Ė)/ω, with Ė by hand
            change = rate**2 - 4 * np.log(2) / pulse.envelope.duration**2  # 𝓔̈/𝓔
            w = pulse.carrier
            turned = ((2 * rate + 1j * change / w - 1j * w) * slow).real / w
            seen = turn.T @ turned
            moment = moment - turn @ (ALPHA_D @ seen + np.cross(GYRATION, seen))
        tau = np.cross(moment, field)
        axis = turn[:, 2]
        return tau if kind == "general" else tau - (tau @ axis) * axis

    errors = compare(bodies, pulse, torque, 5.0)
    assert errors[-1] < 1e-4
    assert errors[:-1] / errors[1:] == pytest.approx(4, rel=0.1)


# --- ledgers ---------------------------------------------------------------------------------

MIXTURE = (
    (leaning(), 3),
    (body((0.3, 0.3, 0), dipole=(0, 0, 0.06), name="rod", charge=1.0,
          response=response(ANGSTROM3 * np.diag([3.0, 3.0, 8.0]),
                            ANGSTROM3 * np.diag([0.3, 0.3, 0.8]))), 3),
    (body((0, 0, 0), name="ion", charge=-1.0, response=response(ANGSTROM3 * 4)), 3),
)
BIAS = Bias((3.0, -8.0, 20.0))
PULSES = (optical(1e12), terahertz(2e10, centre=1.5))


def test_ledger_of_angular_momentum_is_exact_in_light():
    bodies = system(*MIXTURE)
    state = thermal(bodies)
    before = state.angular_momentum.sum(axis=0)
    bath = make_thermostat(bodies, "langevin", friction=1.0)
    mover, state = travel(bodies, PULSES, 2.0, 0.002, state, BIAS, Springs(bodies), bath)
    ledger = mover.ledger
    parts = (ledger.light_impulse, ledger.pair_impulse, ledger.bias_impulse, ledger.bath_impulse)
    assert min(np.linalg.norm(part) for part in parts) > 0.1
    assert np.allclose(state.angular_momentum.sum(axis=0) - before, ledger.impulse, atol=1e-11)


@pytest.mark.parametrize("friction", [None, 1.0])
def test_ledger_of_energy_closes_to_second_order(friction):
    bodies = system(*MIXTURE)
    residuals = []
    for dt in (0.002, 0.001, 0.0005):
        state = thermal(bodies)
        state.position -= 2.5
        bath = friction and make_thermostat(bodies, "langevin", friction=friction)
        mover, state = travel(bodies, PULSES, 2.0, dt, state, BIAS, Springs(bodies), bath)
        assert abs(mover.ledger.light_work) > 1
        assert abs(mover.ledger.bias_work) > 1
        residuals.append(abs(mover.energy_residual(state)) / abs(mover.ledger.light_work))
    if friction is None:
        assert residuals[0] / residuals[1] == pytest.approx(4, rel=0.2)
        assert residuals[1] / residuals[2] == pytest.approx(4, rel=0.2)
    assert residuals[-1] < 2e-4


def test_kinetic_energy_of_free_bodies_is_the_work_done():
    """ΔK is the work of light, bias field and bath to rounding where free rotation is exact."""
    bodies = system(*MIXTURE[1:])
    state = thermal(bodies)
    before = sum(kinetic_energies(bodies, state))
    bath = make_thermostat(bodies, "langevin", friction=1.0)
    mover, state = travel(bodies, PULSES, 1.0, 0.002, state, BIAS, None, bath)
    change = sum(kinetic_energies(bodies, state)) - before
    assert change == pytest.approx(mover.ledger.work, rel=1e-10)


@pytest.mark.parametrize("chi", [np.pi / 4, -np.pi / 4, 0.3])
def test_isotropic_absorbers_get_s3_per_photon_energy(chi):
    """∫⟨τ·k̂⟩dt = s3 E_abs/ω body by body, ħ per photon at s3 = 1 (derived)."""
    ball = body(INERTIA, response=response(ANGSTROM3 * np.diag([9.0, 11.0, 14.0]), ANGSTROM3))
    bodies = system((ball, 7))
    mover, _ = travel(bodies, (optical(ellipticity=chi),), 1.5, 0.001, thermal(bodies))
    expected = np.sin(2 * chi) * mover.ledger.absorbed_energy / OPTICAL
    # circular light: αS has no torque along the beam, so the light's impulse is all absorption
    if abs(chi) == np.pi / 4:
        assert mover.ledger.light_impulse[2] == pytest.approx(expected, rel=1e-10)
        assert abs(mover.ledger.light_impulse[0]) > 0.05 * abs(expected)  # Kerr torques, across
    plain = system((body(INERTIA, response=response(0.0, ANGSTROM3)), 7))
    mover, _ = travel(plain, (optical(ellipticity=chi),), 1.5, 0.001, thermal(plain))
    expected = np.sin(2 * chi) * mover.ledger.absorbed_energy / OPTICAL
    assert mover.ledger.light_impulse == pytest.approx([0, 0, expected], rel=1e-10,
                                                       abs=1e-10 * abs(expected))


def test_linear_absorbers_get_two_thirds_of_it():
    """At random orientations ⅔, the part along the axis being projected out (derived)."""
    count = 4000
    bodies = system((body((0.3, 0.3, 0), response=response(0.0, ANGSTROM3)), count))
    state = thermal(bodies)
    mover, _ = travel(bodies, (optical(ellipticity=np.pi / 4),), 1.5, 0.01, state)
    share = mover.ledger.light_impulse[2] / (mover.ledger.absorbed_energy / OPTICAL)
    # sin²θ of a random axis has mean 2/3 and variance 4/45; 4 sigma
    assert share == pytest.approx(2 / 3, abs=4 * np.sqrt(4 / 45 / count))


# --- repetition --------------------------------------------------------------------------------


def test_resumption_amid_the_pulse_gives_the_same_bits():
    bodies = system(*MIXTURE)

    def fresh():
        bath = make_thermostat(bodies, "langevin", friction=1.0)
        return Mover(bodies, Springs(bodies), Light(bodies, PULSES, BIAS), 0.002, bath)

    straight, mover = thermal(bodies), fresh()
    mover.begin(straight)
    for step in range(700):
        if step == 391:
            saved, numbers = straight.copy(), mover.ledger.to_array()
        mover.advance(straight)
    again = fresh()
    again.begin(saved, time=391 * 0.002)
    again.ledger = Ledger.from_array(numbers)
    for _ in range(700 - 391):
        again.advance(saved)
    for name in saved.ARRAYS:
        assert np.array_equal(getattr(saved, name), getattr(straight, name))
    assert np.array_equal(again.ledger.values, mover.ledger.values)


def test_runs_backwards_with_the_fields_reversed():
    """A pulse symmetric about the turning point: mirrored in time it is its own conjugate.

    Time reversal takes 𝓔(t) to 𝓔*(−t), and needs a body without αD and g.
    """
    bodies = system((body(INERTIA, response=response(ALPHA_S)), 5))
    state = thermal(bodies)
    before = state.copy()
    _, state = travel(bodies, (optical(centre=0.75),), 1.0, 0.002, state)
    assert np.abs(state.angular_momentum - before.angular_momentum).max() > 0.1
    state.angular_momentum *= -1
    state.velocity *= -1
    # what came 0.25 ps before the end now comes 0.25 ps after the start
    reversed_pulse = optical(centre=0.25, ellipticity=-0.5)
    _, state = travel(bodies, (reversed_pulse,), 1.0, 0.002, state)
    assert np.abs(state.orientation - before.orientation).max() < 1e-9
    assert np.abs(state.angular_momentum + before.angular_momentum).max() < 1e-9


def test_noise_of_twins_is_identical():
    bodies = system(*MIXTURE)
    ends = {}
    for sign in (1, -1, 0):
        pulses = (optical(1e12, ellipticity=sign * np.pi / 4),) if sign else ()
        bath = make_thermostat(bodies, "langevin", friction=1.0)
        _, ends[sign] = travel(bodies, pulses, 1.0, 0.002, thermal(bodies), bath=bath)
    texts = {end.generator_text() for end in ends.values()}
    assert len(texts) == 1
    # the ions see no averaged light: they have gone the same way to the last bit
    assert np.array_equal(ends[1].position[6:], ends[-1].position[6:])
    assert np.array_equal(ends[1].position[6:], ends[0].position[6:])
    assert not np.array_equal(ends[1].angular_momentum, ends[-1].angular_momentum)
