"""Bodies in steady light against exact canonical averages and identities.

The energies and torques are the engine's own, the averages are taken by Gauss–Legendre
quadrature over cos θ, so these hold the light alone, without motion or noise.
"""

from math import pi

import numpy as np
import pytest

from swirlight.light.envelope import Rectangle
from swirlight.light.light import Light
from swirlight.light.pulse import Bias, Pulse
from swirlight.species.body import GENERAL, LINEAR, OpticalResponse
from swirlight.units import BOLTZMANN
from tests.light.bodies import sample, species

pytestmark = pytest.mark.published

KT = BOLTZMANN * 300.0
NODES, WEIGHTS = np.polynomial.legendre.leggauss(120)

# ⟨cos²θ⟩ and ⟨τ²⟩/(kT)² for U/kT = −a cos²θ: Dawson and error functions, second route
# quadrature (16 digits); the torque by the hypervirial theorem, a(6⟨cos²⟩ − 2).
COS2 = {0.5: 0.379731954741, 2.0: 0.5312645576865, 5.0: 0.7642662212704, -0.5: 0.2911250947728,
        -2.0: 0.1934353258875, -5.0: 0.09829726120835, -20.0: 0.02499999973997}
TORQUE2 = {0.5: 0.13919586422, 2.0: 2.3751746922, 5.0: 12.927986638, -2.0: 1.6787760894,
           -5.0: 7.0510821637}
# Langevin function coth x − 1/x, closed form (mpmath), and ⟨τ²⟩/(kT)² = 2xL(x).
LANGEVIN = {0.1: 0.03331113225399, 1.0: 0.3130352854993, 5.0: 0.800090803982}
TORQUE_DIPOLE = {0.5: 0.163953413739, 1.0: 0.626070570999, 5.0: 8.00090803982}


def tilted():
    """Orientations whose body axis z makes cos θ = NODES with the laboratory z axis."""
    half = 0.5 * np.arccos(NODES)
    return np.column_stack([np.cos(half), np.sin(half), 0 * half, 0 * half])


def average(block, amplitude, freedom, chi, values, bias=None):
    """Boltzmann averages of `values` and of τ² over orientations in steady light along z."""
    system = sample(species(*block, freedom=freedom), count=1)
    pulses = () if amplitude is None else (Pulse(
        carrier=2000.0, amplitude=amplitude, envelope=Rectangle(2.0), centre=1.0,
        ellipticity=chi, azimuth=0.3, direction=(0.0, 0.0, 1.0)),)
    light = Light(system, pulses, bias)
    fields = light.schedule(np.array([1.0]))
    energy, torque2 = np.zeros((2, len(NODES)))
    for n, q in enumerate(tilted()):
        load = light.apply(fields, 0, q[None])
        sums = light.energies(fields, 0, q[None], np.zeros((1, 3)))
        energy[n] = sums.light_energy + sums.bias_energy
        torque = load.torque[0] + (0.0 if load.bias_torque is None else load.bias_torque[0])
        torque2[n] = torque @ torque
    weight = WEIGHTS * np.exp(-(energy - energy.min()) / KT)
    weight /= weight.sum()
    return weight @ values, weight @ torque2 / KT**2


def axial(delta):
    """A rod of polarizability anisotropy δ."""
    zero = np.zeros((3, 3))
    return OpticalResponse(None, np.diag([1.0, 1.0, 1.0 + delta]), zero, np.zeros(3), zero)


@pytest.mark.parametrize("a", [x for x in COS2 if x < 0])
def test_rods_in_circular_light_go_into_the_plane(a):
    """P(cos θ) ∝ exp(−b cos²θ) about the beam, b = Δα|𝓔|²/8kT = −a."""
    delta, amplitude = 0.4, np.sqrt(8.0 * KT * -a / 0.4)
    cos2, torque2 = average((axial(delta),), amplitude, LINEAR, pi / 4, NODES**2)
    assert cos2 == pytest.approx(COS2[a], rel=1e-9)
    if a in TORQUE2:
        assert torque2 == pytest.approx(TORQUE2[a], rel=1e-9)


@pytest.mark.parametrize("a", [x for x in COS2 if x > 0])
def test_discs_in_circular_light_stand_along_the_beam(a):
    amplitude = np.sqrt(8.0 * KT * a / 0.4)
    cos2, torque2 = average((axial(-0.4),), amplitude, LINEAR, pi / 4, NODES**2)
    assert cos2 == pytest.approx(COS2[a], rel=1e-9)
    assert torque2 == pytest.approx(TORQUE2[a], rel=1e-9)


@pytest.mark.parametrize("x", LANGEVIN)
@pytest.mark.parametrize("helicity", [1, -1])
def test_one_signed_gyration_is_oriented_by_g(x, helicity):
    """⟨cos θ⟩ = coth x − 1/x, x = g|G|/4kT, along the beam for positive helicity."""
    zero = np.zeros((3, 3))
    g = 0.02
    block = OpticalResponse(None, zero, zero, np.array([0.0, 0.0, g]), zero)
    amplitude = np.sqrt(4.0 * KT * x / g)
    cosine, torque2 = average((block,), amplitude, GENERAL, helicity * pi / 4, NODES)
    assert cosine == pytest.approx(helicity * LANGEVIN[x], rel=1e-9)
    if x in TORQUE_DIPOLE:
        assert torque2 == pytest.approx(TORQUE_DIPOLE[x], rel=1e-9)


@pytest.mark.parametrize("x", TORQUE_DIPOLE)
def test_dipoles_in_the_static_field(x):
    """⟨τ²⟩/(kT)² = 2xL(x), x = μF/kT."""
    kind = species(freedom=LINEAR)
    _, torque2 = average((), None, LINEAR, 0.0, NODES,
                         Bias((0.0, 0.0, x * KT / abs(kind.dipole[2]))))
    assert torque2 == pytest.approx(TORQUE_DIPOLE[x], rel=1e-9)


def test_energy_of_dipoles_in_a_rotating_field_changes_by_omega_times_torque():
    """dH/dt = Ω (torque)_z at every instant, H with −M·E, for constant amplitude: exact for any
    set of rigid dipoles. Here ∂(−M·E)/∂t at fixed orientation by central differences."""
    system = sample(species(), count=5)
    omega, step = 2 * pi, 1e-4
    for chi in (pi / 4, -pi / 4):
        p = Pulse(carrier=omega, amplitude=40.0, envelope=Rectangle(9.0).resolved(omega),
                  centre=5.0, coupling="resolved", ellipticity=chi)
        light = Light(system, (p,))
        rng = np.random.default_rng(5)
        q = rng.normal(size=(5, 4))
        q /= np.linalg.norm(q, axis=1, keepdims=True)
        fields = light.schedule(5.3 + step * np.array([-1.0, 0.0, 1.0]))
        energy = [light.energies(fields, n, q, np.zeros((5, 3))).light_energy for n in (0, 2)]
        torque = light.apply(fields, 1, q).torque[:, 2].sum()
        turning = omega * np.sign(chi)
        assert (energy[1] - energy[0]) / (2 * step) == pytest.approx(turning * torque, rel=1e-6)
