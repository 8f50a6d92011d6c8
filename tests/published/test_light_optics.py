"""Light against numbers of optics: fields, pulse areas, torque per power, well depths.

Values were computed from CODATA 2022 constants by the formula beside each and checked by the
second route named there; ones with constants in them are held to 1e-8.
"""

from math import pi

import numpy as np
import pytest
from scipy import constants as si

from swirlight.light.envelope import Gaussian, Rectangle, Sech2
from swirlight.light.light import Light
from swirlight.light.pulse import Pulse, amplitude_of_intensity, intensity_of_amplitude
from swirlight.species.body import LINEAR, OpticalResponse
from swirlight.units import (
    BOLTZMANN,
    CUBIC_ANGSTROM,
    JOULE,
    LIGHT_SPEED,
    PICOSECOND,
    VOLT_PER_METRE,
)
from tests.light.bodies import isotropic, sample, species

pytestmark = pytest.mark.published

VOLT_PER_CM = 100.0 * VOLT_PER_METRE
STRAIGHT, SIDEWAYS = np.array([[1.0, 0, 0, 0]]), np.array([[0.5**0.5, 0, 0.5**0.5, 0]])


def steady(intensity, carrier=2000.0, **parts):
    return Pulse(carrier=carrier, amplitude=amplitude_of_intensity(intensity),
                 envelope=Rectangle(2.0), centre=1.0, **parts)


def at_peak(system, pulse, q):
    light = Light(system, (pulse,))
    block = light.schedule(np.array([1.0]))
    return light.apply(block, 0, q), light.energies(block, 0, q, np.zeros((1, 3)))


def test_field_of_linear_light():
    """√(2I/(ε0 c)); second route through Z0 = 376.730313412 Ω."""
    assert amplitude_of_intensity(1.0) / VOLT_PER_CM == pytest.approx(27.4492372722, rel=1e-8)
    for intensity, field in ((1e10, 274492372.7), (1e12, 2744923727.0), (1e13, 8680210981.0)):
        assert amplitude_of_intensity(intensity) / VOLT_PER_METRE == pytest.approx(field, rel=1e-8)


def test_field_of_circular_light():
    """√(I/(ε0 c)), the constant modulus of a circular wave; second route pint (CODATA 2018)."""
    p = steady(1.0, ellipticity=pi / 4)
    assert p.peak_field / VOLT_PER_CM == pytest.approx(19.4095418135, rel=1e-8)


def test_intensity_of_one_megavolt_per_cm():
    """½ ε0 c E²; second route pint (CODATA 2018)."""
    assert intensity_of_amplitude(1e6 * VOLT_PER_CM) == pytest.approx(1327209365.0, rel=1e-8)


def test_intensity_of_the_atomic_unit_of_field():
    """ε0 c E_h²/(2 e² a0²); second route from Hartree/(e a0)."""
    field = si.value("atomic unit of electric field") * VOLT_PER_METRE
    assert intensity_of_amplitude(field) == pytest.approx(3.50944553e16, rel=1e-7)


@pytest.mark.parametrize(("carrier", "expected"), [
    (2 * pi * LIGHT_SPEED / 800.0, 4.2470699671e-16),
    (2 * pi * LIGHT_SPEED / 1064.0, 5.64860305624e-16),
    (2 * pi * LIGHT_SPEED / 10600.0, 5.62736770641e-15),
    (2 * pi, 1.59154943092e-13),
])
def test_torque_per_absorbed_watt(carrier, expected):
    """P/ω, one ħ per photon: R. A. Beth, Phys. Rev. 50, 115 (1936); second route: photons × ħ."""
    system = sample(species(isotropic(1e-3)), count=1)
    load, _ = at_peak(system, steady(1e10, carrier, coupling="averaged"), STRAIGHT)
    torque = load.torque[0, 2] / JOULE  # N m
    power = load.absorbed_power / JOULE / PICOSECOND  # W
    assert torque / power == pytest.approx(expected, rel=1e-8)


def test_gaussian_and_sech2_areas():
    """√(π/(4 ln 2)) and 2/(2 ln(1+√2)), by closed form and scipy quad."""
    assert Gaussian(1.7).fluence_factor == pytest.approx(1.06446701943, rel=1e-11)
    assert Sech2(1.7).fluence_factor == pytest.approx(1.13459265711, rel=1e-11)
    assert 1.0 / Sech2(1.0).scale == pytest.approx(1.762747174039, rel=1e-12)
    t = np.linspace(-40.0, 40.0, 200_001)
    for envelope, area in ((Gaussian(1.7), 1.50538369558), (Sech2(1.7), 1.78221397819)):
        assert np.trapezoid(envelope.amplitude(t), t) / 1.7 == pytest.approx(area, rel=1e-10)


def test_well_depths_of_one_cubic_angstrom_at_1e12_watts_per_cm2():
    """¼Δα E0² (linear, −cos²θ from the field), half of it with the other sign for circular light
    (+cos²θ from the beam); second route 2π Δα I/c."""
    rod = OpticalResponse(None, np.diag([0.0, 0.0, CUBIC_ANGSTROM]), np.zeros((3, 3)),
                          np.zeros(3), np.zeros((3, 3)))
    system = sample(species(rod, freedom=LINEAR), count=1)
    for parts, depth in (({"ellipticity": 0.0}, 15.1801437), ({}, -7.59007185)):
        p = steady(1e12, **parts)
        if parts:  # linear along x: along the field against across it
            along, across = SIDEWAYS, STRAIGHT
        else:  # circular: along the beam against across it
            along, across = STRAIGHT, SIDEWAYS
        energies = [at_peak(system, p, q)[1].light_energy / BOLTZMANN for q in (along, across)]
        assert energies[1] - energies[0] == pytest.approx(depth, rel=1e-8)


def test_dipole_energy_of_one_debye_in_one_megavolt_per_cm():
    """24.15994907 K; second route pint 24.159949067 K. A dipole along the resolved field's peak."""
    debye = 1e-21 / si.c / (si.e * 1e-9)  # e nm
    kind = species(charge=(0.0, 0.0, 0.0))
    kind.charge[:2] = 1.0, -1.0
    kind.sites[:] = 0.0
    kind.sites[0, 0], kind.sites[1, 0] = 0.5 * debye, -0.5 * debye
    p = Pulse(carrier=2 * pi, amplitude=1e6 * VOLT_PER_CM, envelope=Gaussian(3.0), centre=1.0,
              ellipticity=0.0, coupling="resolved")
    _, sums = at_peak(sample(kind, count=1), p, STRAIGHT)
    # at the peak 𝓔̇ = 0, so E = |𝓔| exactly
    assert -sums.light_energy / BOLTZMANN == pytest.approx(24.15994907, rel=1e-8)
