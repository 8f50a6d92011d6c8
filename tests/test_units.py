"""Units against scipy, pint's own registry and published figures."""

import math
import time

import pint
import pytest
from hypothesis import given
from hypothesis import strategies as st
from scipy import constants as si

from swirlight import units
from swirlight.errors import InputError

# Figures below without another source: CODATA 2022 through scipy.constants, computed once
# outside this package, a second time with pint (CODATA 2018) where it says so.


@pytest.mark.parametrize(
    ("text", "kind", "value"),
    [
        # conversions by powers of ten are exact: the decimal number as written
        ("120 fs", "time", 0.12), ("2.5 um", "length", 2500.0), ("2.5 µm", "length", 2500.0),
        ("2.5 μm", "length", 2500.0), ("3.1 Å", "length", 0.31), ("1 min", "time", 6e13),
        ("1 h", "time", 3.6e15), ("20 mJ/cm^2", "fluence", 0.02),
        ("5e11 W/cm^2", "intensity", 5e11), ("1 TW/cm^2", "intensity", 1e12),
        ("1e15 W/m^2", "intensity", 1e11),
        ("2 /ps", "rate", 2.0), ("2 1/ps", "rate", 2.0), ("2 ps^-1", "rate", 2.0),
        ("2/ps", "rate", 2.0), ("2e12 s^-1", "rate", 2.0), ("2 THz", "rate", 2.0),
        ("3.5 /nm", "inverse length", 3.5), ("0.35 1/Å", "inverse length", 3.5),
        ("12 u", "mass", 12.0), ("12 u nm/nm", "mass", 12.0), ("12 u*nm / nm", "mass", 12.0),
        # one mole is N_A: g/mol and u differ by 1.05e-9 (CODATA 2022)
        ("12 g/mol", "mass", pytest.approx(12.0 * (1.0 - 1.05e-9), rel=1e-11)),
        ("1 kJ/mol", "energy", pytest.approx(1.0, rel=2e-9)),
        ("4.184 kJ/mol", "energy", pytest.approx(units.parse("1 kcal/mol", "energy"), rel=1e-15)),
        ("100 K", "energy", pytest.approx(100.0 * units.BOLTZMANN, rel=1e-15)),
        ("1 eV", "energy", pytest.approx(si.e * units.JOULE, rel=1e-14)),
        ("90 deg", "angle", 0.5 * math.pi), ("-45 deg", "angle", -0.25 * math.pi),
        ("360 deg/ps", "angular velocity", 2.0 * math.pi),
        ("1 V/nm", "field", pytest.approx(1e9 * units.VOLT_PER_METRE, rel=1e-14)),
        ("1 atm", "pressure", pytest.approx(1.01325 * units.BAR, rel=1e-14)),
        ("1 bohr", "length", si.physical_constants["Bohr radius"][0] * 1e9),
        ("1 hbar", "angular momentum", pytest.approx(units.HBAR, rel=1e-14)),
        ("1 angstrom^3", "polarizability", pytest.approx(units.CUBIC_ANGSTROM, rel=1e-14)),
    ],
)  # fmt: skip
def test_values(text, kind, value):
    assert units.parse(text, kind) == value


@pytest.mark.published
@pytest.mark.parametrize(
    ("text", "kind", "other", "number"),
    [
        # 4 π ε0 10⁻³⁰, and 4 π ε0 a0³; the CRC Handbook, section 10-04, prints
        # 1.11265e-16 for 1 cm³ in C m²/V and 0.148184 for 1 a.u. in Å³
        ("1 angstrom^3", "polarizability", "1e-40 C m^2/V", 1.1126500562),
        ("1 bohr^3", "polarizability", "1 angstrom^3", 0.1481847112),
        ("1 bohr^3", "polarizability", "1e-41 C m^2/V", 1.64877727212),
        ("1 D", "dipole", "1e-30 C m", 3.33564095198),
        ("1 D", "dipole", "1 e Å", 0.208194332709),
        ("1 cm^-1", "carrier", "1 THz", 0.0299792458),
        ("1 u nm^2/ps^2", "energy", "1 kJ/mol", 1.000000001),
    ],
)
def test_published_ratios(text, kind, other, number):
    assert units.parse(text, kind) / units.parse(other, kind) == pytest.approx(number, rel=2e-10)


@pytest.mark.published
def test_published_energies():
    """Products of constants: CODATA 2022; the first three also with pint (CODATA 2018)."""
    debye, kelvin = units.parse("1 D", "dipole"), units.BOLTZMANN
    mega = units.parse("1 MV/cm", "field")
    assert debye * mega / kelvin == pytest.approx(24.15994907, rel=1e-9)
    nano = units.parse("1 V/nm", "field") / units.parse("1 kJ/mol", "energy")
    assert debye * nano == pytest.approx(2.008769934, rel=1e-9)
    ke = units.COULOMB / units.KJ_PER_MOL * 10.0  # kJ Å/mol/e²
    assert ke == pytest.approx(1389.354576, rel=1e-9)
    assert 298.15 * kelvin / units.KJ_PER_MOL == pytest.approx(2.47895703, rel=2e-9)


@pytest.mark.published
def test_peak_field_of_linear_light():
    """E0 = √(2I/ε0c) at 1 W/cm²: 27.4492372722 V/cm (CODATA 2022)."""
    intensity = units.WATT_PER_CM2
    field = math.sqrt(2.0 * intensity / (units.VACUUM_PERMITTIVITY * units.LIGHT_SPEED))
    assert field / (100.0 * units.VOLT_PER_METRE) == pytest.approx(27.4492372722, rel=1e-10)


@pytest.mark.parametrize(
    ("text", "frequency"),
    [
        ("1.0 THz", 1e12),
        ("800 nm", si.c / 800e-9),
        ("10.6 um", si.c / 10.6e-6),
        ("33.35640951981521 cm^-1", 1e12),
        ("1.55 eV", 1.55 * si.e / si.h),
        ("100 kJ/mol", 1e5 / si.N_A / si.h),
        ("6.283185307179586 rad/ps", 1e12),
    ],
)
def test_carriers(text, frequency):
    assert units.parse(text, "carrier") == pytest.approx(2e-12 * math.pi * frequency, rel=1e-14)


def test_every_symbol_means_what_pint_takes_it_for():
    """Our few definitions against the registry that pint ships."""
    registry, ours = pint.UnitRegistry(), units._registry()
    for symbol in sorted(units.SYMBOLS):
        factor, _ = units._scale(symbol)
        known = ours.Quantity(1, ours.parse_units(symbol.replace("µ", "u"))).to_base_units()
        target = " * ".join(f"{unit}**{power}" for unit, power in known.unit_items())
        theirs = registry.Quantity(1.0, symbol)
        if symbol.endswith("mol"):
            theirs *= registry.Quantity("1 / mol") * si.N_A
        assert float(factor) == pytest.approx(theirs.to(target).magnitude, rel=2e-9), symbol


@pytest.mark.parametrize(
    ("text", "words"),
    [
        ("1,5 ps", "has a comma"), ("12:30 s", "no number with a unit"), ("2e", "space"),
        ("2fs", "needs a space"), ("nan s", "does not begin with a number"), ("fs", "number"),
        ("inf ps", "number"), ("1 ps; 2", "no number with a unit"), ("120", "has no unit"),
        ("9**9**9 ps", "no number"), ("10**10**7 ps", "no number"), ("1 ps ps", "not the unit"),
        ("__import__('os') s", "does not begin"), ("1 fS", 'unknown unit "fS"; did you mean "fs"'),
        ("1 parsec", "unknown unit"), ("25 degC", "temperatures are in K"), ("1 2 ps", "2 numbers"),
        ("1 ps^12", "no number"), ("1 s s s s s s s", "six at most"), ("1e9999 ps", "no number"),
        ("1 " + "s" * 20_000, "longer than 80"), ("1 nm", '"nm" is not the unit of a time'),
        ("1 1 ps", "2 numbers"), ("", "does not begin"), (3.0, "needs a number and a unit"),
        (None, "needs a number and a unit"), ("1 %", "no number with a unit"),
    ],
)  # fmt: skip
def test_refusals(text, words):
    units.parse("1 s", "time")  # pint itself is not timed
    begin = time.perf_counter()
    with pytest.raises(ValueError, match=".") as caught:
        units.parse(text, "time")
    assert words in str(caught.value)
    assert time.perf_counter() - begin < 0.1
    with pytest.raises(InputError, match='for example "120 fs"'):
        units.parse_quantity(text, "time")


def test_ranges():
    assert units.parse("1 ps", "time", "1 fs", "1 ns") == 1.0
    assert units.parse("1000 fs", "time", high="1 ps") == 1.0
    with pytest.raises(ValueError, match=r"out of range \(at least 1 fs, at most 1 ns\)"):
        units.parse("1 Ps", "time", "1 fs", "1 ns")
    with pytest.raises(ValueError, match="out of range"):
        units.parse("1 nm", "carrier", "1 GHz", "30 PHz")
    with pytest.raises(ValueError, match="must not be zero"):
        units.parse("0 nm", "carrier")


def test_vectors():
    assert units.parse_vector("0 -1e-2 0.1177 nm", "length") == (0.0, -0.01, 0.1177)
    assert units.parse_vector("1 2 3 /nm", "inverse length") == (1.0, 2.0, 3.0)
    assert units.vector_text((0.0, -0.01, 3e-9), "length") == "0 -0.01 3e-9 nm"
    for text, words in {"1 2 nm": "2 numbers instead of three", "1 2 3": "has no unit",
                        "1, 2, 3 nm": "comma", "1 2 3 4 nm": "4 numbers"}.items():
        with pytest.raises(ValueError, match=words):
            units.parse_vector(text, "length")


@pytest.mark.parametrize(
    ("text", "kind", "shown"),
    [
        ("120 fs", "time", "0.12 ps"), ("800 nm", "carrier", "374.7405725 THz"),
        ("0.777 g/cm^3", "density", "0.777 g/cm^3"), ("30 deg", "angle", "30 deg"),
        ("5e11 W/cm^2", "intensity", "5e11 W/cm^2"), ("0.8 kJ/mol", "energy", "0.8 kJ/mol"),
        ("2.7e8 V/m", "field", "2.7e8 V/m"), ("4.5 angstrom^3", "polarizability",
        "4.5 angstrom^3"), ("0 deg", "angle", "0 deg"), ("-0.0 ps", "time", "0 ps"),
        ("1e-50 C m^3/V^2", "rectification", "1e-50 C m^3/V^2"), ("1.85 D", "dipole", "1.85 D"),
    ],
)  # fmt: skip
def test_text(text, kind, shown):
    assert units.text(units.parse(text, kind), kind) == shown


def test_brief():
    assert units.brief(units.parse("0.0123456 ps", "time"), "time") == "0.01235 ps"


@given(st.sampled_from(sorted(units.KINDS)),
       st.floats(1e-30, 1e30).flatmap(lambda x: st.sampled_from([x, -x])))
def test_text_reads_back_as_the_same_float(kind, value):
    assert units.parse(units.text(value, kind), kind) == value


def test_grams_per_cubic_centimetre_to_the_last_digit():
    """In binary 0.78 g/cm³ becomes 779.9999999999999 kg/m³; here it is 780."""
    assert units.parse("0.78 g/cm^3", "density") == units.parse("780 kg/m^3", "density")


@pytest.mark.parametrize("text, kind, meant", [
    ("33 cm-1", "carrier", "33 cm^-1"),
    ("0.777 kg/m3", "density", "0.777 kg/m^3"),
])
def test_powers_without_their_sign_are_understood_but_not_taken(text, kind, meant):
    with pytest.raises(ValueError, match="did you mean") as caught:
        units.parse(text, kind)
    assert f'"{meant}"' in str(caught.value) and units.parse(meant, kind) > 0
