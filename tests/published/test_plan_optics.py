"""Figures of `check` against tabulated values of optics.

Sources: CODATA 2022 through scipy.constants with the formula named; each value was computed
by two routes (vacuum impedance or the pint registry against the formula). They move by 1e-9
between CODATA 2018 and 2022, hence the tolerance.
"""

import numpy as np
import pytest

from tests.run.plans import BASE, plan, rod_plan, value

pytestmark = pytest.mark.published
WITHIN = 1e-8
LINEAR = "light[0].ellipticity=0 deg"
VACUUM = "light[0].refractive_index=1.0"
NO_INTENSITY = BASE.replace("    peak_intensity: 1e9 W/cm^2\n", "")


@pytest.mark.parametrize(("intensity", "field"), [
    (1e10, 274492372.7), (1e12, 2744923727.0), (1e13, 8680210981.0)])
def test_peak_field_of_linear_light(intensity, field):
    # E0 = √(2I/(ε0 c))
    found = plan(f"light[0].peak_intensity={intensity:g} W/cm^2", LINEAR, VACUUM)
    assert value(found, "amplitude") == pytest.approx(field, rel=WITHIN)
    assert value(found, "largest field") == pytest.approx(field, rel=WITHIN)


def test_field_of_circular_light():
    # constant modulus √(I/(ε0 c)): 19.4095418135 V/cm at 1 W/cm²
    found = plan("light[0].peak_intensity=1e8 W/cm^2", VACUUM)
    assert value(found, "largest field") == pytest.approx(19.4095418135e6, rel=WITHIN)


def test_intensity_of_one_megavolt_per_centimetre():
    found = plan("light[0].peak_field=1e8 V/m", LINEAR, VACUUM, text=NO_INTENSITY)
    assert value(found, "intensity") == pytest.approx(1327209365.0, rel=WITHIN)


@pytest.mark.parametrize(("envelope", "factor"), [
    ("gaussian", 1.06446701943), ("sech2", 1.13459265711)])
def test_fluence_of_envelopes(envelope, factor):
    # √(π/(4 ln 2)) and 1/ln(1 + √2), per peak intensity and FWHM
    found = plan(f"light[0].envelope={envelope}")
    assert value(found, "fluence") == pytest.approx(factor * 1e9 * 0.4e-12, rel=WITHIN)
    given = plan(f"light[0].envelope={envelope}", "light[0].fluence=1 mJ/cm^2", text=NO_INTENSITY)
    assert value(given, "intensity") == pytest.approx(1e-3 / (factor * 0.4e-12), rel=WITHIN)


@pytest.mark.parametrize(("chi", "kelvin"), [("0 deg", 15.1801437), ("45 deg", 7.59007185)])
def test_alignment_well(chi, kelvin, tmp_path):
    # ¼ Δα E0² for Δα = 1 Å³ and 1e12 W/cm², = 2π Δα I/c; half of it in circular light
    response = "  polarizability: {principal: 3 3 4 angstrom^3}\n"
    found = rod_plan(tmp_path, "light[0].peak_intensity=1e12 W/cm^2", VACUUM,
                     f"light[0].ellipticity={chi}", response=response)
    assert value(found, "alignment well") * 298.15 == pytest.approx(kelvin, rel=WITHIN)


def test_dipole_in_a_field(tmp_path):
    # 1 D × 1 MV/cm over k: 24.15994907 K
    found = rod_plan(tmp_path, "light[0].carrier=2 THz", "light[0].peak_field=1e8 V/m", LINEAR,
                     "light[0].duration=1 ps", charge=0.1, text=NO_INTENSITY)
    debye = value(found, "dipole")
    assert value(found, "dipole energy") * 298.15 == pytest.approx(24.15994907 * debye, rel=WITHIN)


def test_spin_of_absorbed_power(tmp_path):
    # τ = P/ω: 4.2470699671e-16 N m per W at 800 nm, one ħ a photon (Beth, Phys. Rev. 50, 115
    # (1936)); a linear body takes two thirds of it
    response = "  absorptive_polarizability: {principal: 0.02 0.02 0.02 angstrom^3}\n"
    found = rod_plan(tmp_path, response=response)
    spin = value(found, "spin from absorption") * 1.054571817e-34  # J s
    energy = value(found, "energy absorbed", "light[0] on") * 1e3 / 6.02214076e23  # J
    assert spin / energy == pytest.approx(2 / 3 * 4.2470699671e-16, rel=WITHIN)


def test_thermal_energy_in_other_units():
    # kT at 300 K: 6.250985737 THz, 208.5104401 1/cm; at 298.15 K 2.47895703 kJ/mol
    found = plan("sample.temperature=300 K")
    assert value(found, "kT/h") == pytest.approx(6.250985737, rel=WITHIN)
    assert value(found, "kT/hc") == pytest.approx(208.5104401, rel=WITHIN)
    assert value(plan(), "kT") == pytest.approx(2.47895703, rel=WITHIN)


def test_carbon_disulfide_well():
    # 145.7 K per 1e12 W/cm² of linear light for Δα = 9.6 Å³; the library's Δα is from the same
    # source (Bridge & Buckingham 1966, from memory), so this holds the unit, not the molecule
    text = BASE.replace("acetonitrile", "carbon-disulfide").replace("0.777", "1.256")
    found = plan("light[0].peak_intensity=1e12 W/cm^2", LINEAR, VACUUM, text=text)
    assert value(found, "alignment well") * 298.15 == pytest.approx(145.7, rel=5e-4)


def test_water_quantum_rotation():
    # rotational constants 27.877, 14.512, 9.285 1/cm (CCCBDB, experimental); the rigid model
    # has other bond lengths, worth up to 15 %
    text = BASE.replace("acetonitrile, count: 108", "water, count: 300").replace("0.777", "0.997")
    found = plan(text=text)
    kt = value(found, "kT/hc")
    got = sorted(value(found, f"ħ²/2IkT {axis}") * kt for axis in "xyz")
    np.testing.assert_allclose(got, [9.285, 14.512, 27.877], rtol=0.15)
