"""A rotor in rotating, pulsed and static fields, through the real step and the real light."""

import numpy as np
import pytest
from scipy.special import ellipk

from swirlight import rotation
from swirlight.light.envelope import Gaussian, Rectangle
from swirlight.light.light import Light
from swirlight.light.pulse import Bias, Pulse
from swirlight.motion.step import Mover
from tests.motion.bodies import body, response, still, system

pytestmark = pytest.mark.published


def rod(inertia=1.0, dipole=0.0, anisotropy=0.0):
    optics = response(np.diag([0, 0, anisotropy]))
    return system((body((inertia, inertia, 0), dipole=(0, 0, dipole), response=optics), 1))


def turned(bodies, turns, normal, rates=0.0):
    """Rods turned from body z along the laboratory z by angles about a laboratory axis."""
    state = still(bodies)
    state.orientation[:] = rotation.from_vector(np.multiply.outer(np.atleast_1d(turns), normal))
    state.angular_momentum[:] = bodies.inertia[:, :1] * np.multiply.outer(
        np.broadcast_to(rates, bodies.bodies), normal)
    return state


def axis(state):
    return rotation.rotation_matrix(state.orientation)[:, :, 2]


def travel(bodies, state, light, length, steps, start=0.0):
    """Move on from `start`; the light's own time is shifted so that the stage begins there."""
    mover = Mover(bodies, None, light, length / steps, remove_momentum=False)
    mover.begin(state, start)
    for _ in range(steps):
        mover.advance(state)
    return mover


def test_dipole_in_a_rotating_field():
    """Planar dipole, I = 1, μE = 1, field turning at 0.5: φ'' = −sin(φ − Ωt).

    φ(0) = 0.3, φ'(0) = 0.2. In the frame of the field a plain pendulum; φ and φ' at t = 10 from
    its Jacobi elliptic solution, mpmath to 16 digits.
    """
    phi_end, rate_end = 4.86683131473839, 0.902019048210801
    omega = 0.5
    # helicity +1 along z: E = |𝓔|/√2 (cos ωt, sin ωt), constant on the plateau
    pulse = Pulse(omega, np.sqrt(2.0), Rectangle(200.0).resolved(omega), centre=0.0,
                  coupling="resolved")
    bodies = rod(dipole=1.0)
    found = []
    for steps in (4000, 8000):
        state = still(bodies)
        # body z into the plane, at φ = 0.3 from x
        flat = rotation.from_vector(np.array([0, np.pi / 2, 0]))
        state.orientation[0] = rotation.multiply(rotation.from_vector(np.array([0, 0, 0.3])), flat)
        state.angular_momentum[0, 2] = 0.2
        travel(bodies, state, Light(bodies, (pulse,)), 10.0, steps)
        u = axis(state)[0]
        assert abs(u[2]) < 1e-12
        phi = np.arctan2(u[1], u[0])
        found.append([phi + 2 * np.pi * round((phi_end - phi) / (2 * np.pi)),
                      state.angular_momentum[0, 2]])
    coarse, fine = np.array(found) - [phi_end, rate_end]
    assert np.abs(fine).max() < 1e-5
    assert coarse / fine == pytest.approx(4, rel=0.01)  # second order
    assert np.abs(fine + (fine - coarse) / 3).max() < 1e-9


# U = −A exp(−4 ln2 t²/T²) cos²θ, I = 1, ∫A dt = 1, θ = 1 at rest at t = −5T: θ and θ' at +5T
# (mpmath.odefun, 18 digits; scipy DOP853 agrees to 8).
KICKS = {
    0.01: (0.954451967555288, -0.911095306373752),
    0.1: (0.537666400455786, -0.925842136676041),
    1.0: (-3.59749489552053, -0.912319635744404),
}


@pytest.mark.parametrize("duration", KICKS)
@pytest.mark.parametrize("light", ["linear", "circular"])
def test_gaussian_kick(duration, light):
    """Linear light: θ from the polarisation. Circular: from its plane, at half the depth."""
    theta_end, rate_end = KICKS[duration]
    area = duration * np.sqrt(np.pi / (4 * np.log(2)))
    # depth ¼Δα|𝓔|² in linear, half of it in circular light
    square = 4 / area * (1 if light == "linear" else 2)
    pulse = Pulse(1e4, np.sqrt(square), Gaussian(duration), centre=5 * duration,
                  ellipticity=0.0 if light == "linear" else np.pi / 4)
    bodies = rod(anisotropy=1.0)
    found = []
    for steps in (2000, 4000):
        # body z at the angle θ = 1 from x, in the plane of x and z
        state = turned(bodies, np.pi / 2 - 1.0, np.array([0, 1.0, 0]))
        travel(bodies, state, Light(bodies, (pulse,)), 10 * duration, steps)
        u = axis(state)[0]
        theta = np.arctan2(u[2], u[0])
        found.append([theta + 2 * np.pi * round((theta_end - theta) / (2 * np.pi)),
                      -state.angular_momentum[0, 1]])
    coarse, fine = np.array(found) - [theta_end, rate_end]
    assert np.abs(fine).max() < 2e-5
    assert np.abs(fine + (fine - coarse) / 3).max() < 1e-9


# Period of a pendulum over that of small swings, 1/AGM(1, cos(θ0/2)), by amplitude in rad
PENDULUM = {0.1: 1.0006253583077, 1.0: 1.06633424558, 2.0: 1.3289044519151, 3.0: 2.5712339494321}


@pytest.mark.parametrize("amplitude", PENDULUM)
def test_libration_in_a_static_field(amplitude):
    """A quarter of a period after it was let go the dipole points along the field."""
    factor = PENDULUM[amplitude]
    assert factor == pytest.approx(2 / np.pi * ellipk(np.sin(amplitude / 2) ** 2), rel=1e-12)
    bodies = rod(dipole=1.0)
    quarter = 2 * np.pi * factor / 4
    found = []
    for steps in (1000, 2000):
        state = turned(bodies, amplitude, np.array([0, 1.0, 0]))
        travel(bodies, state, Light(bodies, (), Bias((0.0, 0.0, 1.0))), quarter, steps)
        found.append(axis(state)[0, 0])
    coarse, fine = found
    assert abs(fine) < 2e-6
    assert abs(fine + (fine - coarse) / 3) < 2e-10


# ⟨cos²θ⟩ of cold, isotropic rods a time t after a kick, s = Pt/I, P = ¼Δα∫|𝓔|²dt:
# ½∫cos²(θ − s sin 2θ) sin θ dθ, by quadrature to 12 digits.
COLD = {0.1: 0.38715689588257, 0.25: 0.46719208166558, 0.5: 0.58582263181165,
        0.75: 0.66847909338387, 1.0: 0.70245240452615, 1.5: 0.625527970141,
        2.0: 0.44771639465826, 5.0: 0.51944503407177}


def test_cold_rods_after_a_short_kick():
    cosines, weights = np.polynomial.legendre.leggauss(60)
    bodies = system((body((1.0, 1.0, 0), response=response(np.diag([0, 0, 1.0]))), 60))
    duration = 1e-5
    area = duration * np.sqrt(np.pi / (4 * np.log(2)))
    pulse = Pulse(1e4, np.sqrt(4 / area), Gaussian(duration), centre=4 * duration,
                  ellipticity=0.0, direction=(1.0, 0.0, 0.0), azimuth=np.pi / 2)  # along z
    state = turned(bodies, np.arccos(cosines), np.array([0, 1.0, 0]))
    light = Light(bodies, (pulse,))
    travel(bodies, state, light, 8 * duration, 800)
    after = 4 * duration  # since the centre of the kick
    for s, expected in COLD.items():
        travel(bodies, state, None, s - after, 1)  # free rods: exact in one step
        after = s
        found = 0.5 * weights @ axis(state)[:, 2] ** 2
        # the kick lasts 1e-5 of the time unit, and rods move a little while it lasts
        assert found == pytest.approx(expected, abs=1e-6)
