"""Thermal averages of independent bodies against closed forms.

Seeds are fixed; tolerances are 4 standard errors, from the known or sampled variance.
"""

import numpy as np
import pytest

from swirlight import rotation
from swirlight.light.envelope import Rectangle
from swirlight.light.light import Light
from swirlight.light.pulse import Bias, Pulse
from swirlight.motion.draw import draw_motion, draw_orientations, draw_velocities
from swirlight.motion.energy import kinetic_energies, kinetic_temperature
from swirlight.motion.freedom import degrees_of_freedom
from swirlight.motion.step import Mover
from swirlight.motion.thermostats import make_thermostat
from swirlight.units import BOLTZMANN
from tests.motion.bodies import body, response, still, system, thermal

pytestmark = pytest.mark.published
TEMPERATURE = 300.0
KT = BOLTZMANN * TEMPERATURE


def mean_and_error(values):
    return values.mean(), values.std(ddof=1) / np.sqrt(len(values))


def axis(state):
    return rotation.rotation_matrix(state.orientation)[:, :, 2]


# --- free rotors --------------------------------------------------------------------------

# C1(τ) = ⟨u(0)·u(t)⟩ of free classical linear rotors, τ = t√(kT/I): 1 − √2 τ F(τ/√2), F Dawson's
# integral; also ∫x e^{−x²/2} cos xτ dx by quadrature.
FREE_C1 = {0.25: 0.93878595161, 0.5: 0.7698278586903, 0.75: 0.5320003011386,
           1.0: 0.2752215409929, 1.5: -0.12820431503, 2.0: -0.2799761491308,
           2.5: -0.2546955299104, 3.0: -0.1795006375006, 4.0: -0.08158518325361,
           5.0: -0.04622878597738, 8.0: -0.01642197289808}


def test_free_rotor_correlation_function():
    inertia = 0.3
    bodies = system((body((inertia, inertia, 0)), 40000))
    state = thermal(bodies)
    start, unit, now = axis(state), np.sqrt(inertia / KT), 0.0
    for tau, expected in FREE_C1.items():
        mover = Mover(bodies, None, None, (tau - now) * unit, remove_momentum=False)
        mover.begin(state)
        mover.advance(state)  # exact for a linear rotor, however long the step
        now = tau
        found, error = mean_and_error((start * axis(state)).sum(axis=1))
        assert abs(found - expected) < 4 * error


# --- momenta ------------------------------------------------------------------------------


def test_maxwell_speeds_of_nitrogen():
    """28.0134 u at 300 K: √(8kT/πm) and √(3kT/m) in m/s, closed forms."""
    bodies = system((body((0, 0, 0), mass=28.0134), 100000), temperature=300.0)
    speed = 1e3 * np.linalg.norm(draw_velocities(bodies, np.random.default_rng(4)), axis=1)
    found, error = mean_and_error(speed)
    assert abs(found - 476.1731087) < 4 * error
    found, error = mean_and_error(speed**2)
    assert abs(found - 516.8391883**2) < 4 * error
    # fraction faster than k times the most probable speed: erfc k + 2k e^{−k²}/√π
    for k, share in {1: 0.572406704471, 1.5: 0.21229028736, 2: 0.0460117056892}.items():
        found = (speed > k * 421.9974301).mean()
        assert abs(found - share) < 4 * np.sqrt(share * (1 - share) / len(speed))


def test_angular_momenta_follow_the_same_laws():
    """|L| of a spherical top is distributed as a Maxwell speed, of a linear rotor as Rayleigh."""
    count = 50000
    for inertia, law in (((0.3, 0.3, 0.3), "maxwell"), ((0.3, 0.3, 0.0), "rayleigh")):
        bodies = system((body(inertia), count))
        length = np.linalg.norm(thermal(bodies).angular_momentum, axis=1) / np.sqrt(2 * 0.3 * KT)
        for k in (1.0, 1.5):
            share = {1.0: 0.572406704471, 1.5: 0.21229028736}[k] if law == "maxwell" else np.exp(
                -k * k)
            assert abs((length > k).mean() - share) < 4 * np.sqrt(share * (1 - share) / count)


def test_temperature_of_few_bodies():
    """⟨T⟩ and var T/T² = 2/N_f (chi-square law), with the total momentum removed."""
    bodies = system((body((0.1, 0.2, 0.28), mass=18.0), 6), (body((0.3, 0.3, 0), mass=44.0), 3))
    freedom = degrees_of_freedom(bodies, momentum_conserved=True)
    assert freedom.total == 27 - 3 + 18 + 6
    state, draws = still(bodies), 6000
    temperature, heavy = np.empty(draws), np.empty(draws)
    for n in range(draws):
        state.orientation[:] = draw_orientations(bodies.bodies, state.random)
        draw_motion(bodies, state)
        temperature[n] = kinetic_temperature(sum(kinetic_energies(bodies, state)), freedom.total)
        heavy[n] = 44.0 * (state.velocity[6:] ** 2).mean()
    found, error = mean_and_error(temperature)
    assert abs(found - TEMPERATURE) < 4 * error
    variance = temperature.var() / TEMPERATURE**2 * freedom.total / 2
    # kurtosis of chi-square: relative error of a variance √((2 + 12/N_f)/draws)
    assert abs(variance - 1) < 4 * np.sqrt((2 + 12 / freedom.total) / draws)
    # without total momentum ⟨m v²⟩/3 = kT (1 − m/M)
    found, error = mean_and_error(heavy)
    assert abs(found / KT - (1 - 44.0 / bodies.mass.sum())) < 4 * error / KT


# --- in steady light --------------------------------------------------------------------------

# ⟨cos²θ⟩ and mean-square torque/(kT)² for U = b kT cos²θ, from Dawson's and error functions,
# checked by quadrature; b = Δα|𝓔|²/8kT of rods in circular light, θ from the beam.
CIRCULAR = {1.0: (0.2537041018037, 0.47777538918), 2.0: (0.1934353258875, 1.6787760894),
            5.0: (0.09829726120835, 7.0510821637)}
# ⟨cos²θ⟩ for U = −a kT cos²θ, a = Δα|𝓔|²/4kT of rods in linear light, θ from the polarisation
LINEAR = {1.0: 0.4292307058278, 2.0: 0.5312645576865}
# ⟨cosθ⟩ = coth x − 1/x, x = g|G|/4kT or μF/kT
LANGEVIN = {0.5: 0.1639534137387, 1.0: 0.3130352854993, 2.0: 0.5373147207275,
            5.0: 0.800090803982}


def settle(species, count, light, friction=6.0, dt=0.01, steps=500):
    """Langevin dynamics from random orientations; returns bodies, state and mover."""
    bodies = system((species, count), temperature=TEMPERATURE)
    state = thermal(bodies, seed=11)
    mover = Mover(bodies, None, light(bodies), dt,
                  make_thermostat(bodies, "langevin", friction=friction))
    mover.begin(state)
    for _ in range(steps):
        mover.advance(state, energies=False)
    return bodies, state, mover


def steady(square, **options):
    """A pulse of constant |𝓔|², longer than any of these runs."""
    return lambda bodies: Light(bodies, (
        Pulse(2000.0, np.sqrt(square), Rectangle(1e6), centre=0.0, **options),))


def rod(anisotropy):
    return body((0.1, 0.1, 0), response=response(np.diag([0.2, 0.2, 0.2 + anisotropy])))


def sigmas(values, expected):
    """By how many standard errors the mean of independent values is off."""
    found, error = mean_and_error(values)
    return abs(found - expected) / error


def precision(values, expected):
    """Standard error of the mean over what is expected."""
    return mean_and_error(values)[1] / abs(expected)


def circular(b, count, **options):
    """P(cosθ) ∝ exp(−b cos²θ) of rods, and their mean-square torque."""
    _, state, mover = settle(rod(1.0), count, steady(8 * b * KT), **options)
    mean, torque = CIRCULAR[b]
    square = (mover.load.light_torque**2).sum(axis=1) / KT**2
    along = axis(state)[:, 2] ** 2
    return (max(sigmas(along, mean), sigmas(square, torque)),
            max(precision(along, mean), precision(square, torque)))


def linear(a, count, **options):
    """⟨cos²θ⟩ of rods from the polarisation."""
    _, state, _ = settle(rod(1.0), count, steady(4 * a * KT, ellipticity=0.0, azimuth=0.4),
                         **options)
    along = (axis(state) @ [np.cos(0.4), np.sin(0.4), 0]) ** 2
    return sigmas(along, LINEAR[a]), precision(along, LINEAR[a])


def gyrating(x, count, sign, **options):
    """⟨cosθ⟩ of asymmetric bodies with one-signed g along body z; no spin along the beam."""
    species = body((0.06, 0.1, 0.14), response=response(gyration=(0, 0, 1.0)))
    _, state, _ = settle(species, count, steady(4 * x * KT, ellipticity=sign * np.pi / 4),
                         **options)
    return (max(sigmas(axis(state)[:, 2], sign * LANGEVIN[x]),
                sigmas(state.angular_momentum[:, 2], 0.0)),
            precision(axis(state)[:, 2], LANGEVIN[x]))


def dipoles(x, count, **options):
    """⟨cosθ⟩ of rigid dipoles in a static field."""
    species = body((0.06, 0.1, 0.14), dipole=(0, 0, 0.05))
    field = Bias((0.0, 0.0, x * KT / 0.05))
    _, state, _ = settle(species, count, lambda bodies: Light(bodies, (), field), **options)
    return sigmas(axis(state)[:, 2], LANGEVIN[x]), precision(axis(state)[:, 2], LANGEVIN[x])


@pytest.mark.parametrize("b", [1.0, 5.0])
def test_rods_in_circular_light(b):
    assert circular(b, 4000)[0] < 4


def test_rods_in_linear_light():
    assert linear(2.0, 4000)[0] < 4


@pytest.mark.parametrize("sign", [1, -1])
def test_gyration_orients(sign):
    assert gyrating(2.0, 4000, sign)[0] < 4


def test_dipoles_in_a_static_field():
    assert dipoles(2.0, 4000)[0] < 4


def enough(expected):
    """Bodies after which a mean of cosines is known to 0.8 %; their scatter is at most 1/√3."""
    return max(30000, int((0.58 / (0.008 * expected)) ** 2))


@pytest.mark.slow
def test_steady_light_long(table):
    """The same with errors below 1 % and half the step, at every strength of the tables."""
    options = {"dt": 0.005, "steps": 600}
    found = {f"rods in circular light, b = {b:g}": circular(b, 60000, **options)
             for b in CIRCULAR}
    found |= {f"rods in linear light, a = {a:g}": linear(a, 30000, **options) for a in LINEAR}
    for x, expected in LANGEVIN.items():
        for sign in (1, -1):
            found[f"gyration, x = {sign * x:g}"] = gyrating(x, enough(expected), sign, **options)
        found[f"dipoles in a static field, x = {x:g}"] = dipoles(x, enough(expected), **options)
    for what, (off, error) in found.items():
        table(f"{what}: off by", f"{off:.2f} standard errors of {100 * error:.2f} %", "< 4, < 1 %")
    assert max(off for off, _ in found.values()) < 4
    assert max(error for _, error in found.values()) < 0.01
