"""Spectra of liquid acetonitrile against exact rules and against what is known of the liquid."""

import numpy as np
import pytest

import swirlight
from swirlight import units
from swirlight.analysis import spectra
from swirlight.config import load_config
from swirlight.run.launch import launch
from swirlight.sample import build_system

LIQUID = """
title: acetonitrile in the dark
seed: 91
sample:
  species: [{use: acetonitrile, count: 128}]
  density: 0.777 g/cm^3
  temperature: 298.15 K
forces: {cutoff: 1.0 nm}
stages:
  - {name: settle, length: 30 ps, timestep: 4 fs, thermostat: {method: langevin, friction: 2 /ps}}
  - {name: observe, length: 50 ps}
exposures: {kinds: [dark], starts: 4, spacing: 10 ps}
record: {every: 20 fs, vectors: [orientation, angular_velocity], totals_every: 20 fs}
"""
PROBE = """
light:
  - {carrier: 1.5 THz, peak_field: 1e8 V/m, duration: 0.5 ps, centre: 1.2 ps, ellipticity: 0 deg,
     in_kinds: same}
stages:
  - {name: settle, length: 20 ps, timestep: 4 fs, thermostat: {method: langevin, friction: 2 /ps}}
  - {name: exposure, length: 3.2 ps, lit: true}
exposures: {kinds: [dark], starts: 12, spacing: 3 ps, carrier_phases: 2}
record: {every: 20 fs, vectors: [orientation], totals_every: 20 fs}
"""


def made(folder, text):
    path = folder / "config.yaml"
    path.write_text(text)
    return launch(load_config(path), into=folder / "run", progress=False)


@pytest.fixture(scope="module")
def liquid(tmp_path_factory):
    return made(tmp_path_factory.mktemp("liquid"), LIQUID)


@pytest.mark.slow
@pytest.mark.published
def test_permittivity_of_the_liquid(liquid, table):
    s = swirlight.spectrum(liquid, "dipole", longest_lag="10 ps")
    value, error, _ = s.figures["static permittivity"]
    # 1 + ⟨M²⟩/3ε0VkT of the same run, from the file and CODATA values in SI.
    squares = np.array([(t.total_dipole[:] ** 2).sum(axis=1).mean() for t in liquid])
    kelvin = np.mean([t.temperature[:].mean() for t in liquid])
    volume = np.prod(liquid["dark", 0].box) * 1e-27
    fluctuation = 1 + squares / (3 * 8.8541878188e-12 * volume * 1.380649e-23 * kelvin)
    np.testing.assert_allclose(value, fluctuation.mean(), rtol=1e-9)
    table("acetonitrile: static permittivity from the spectrum",
          f"{value:.1f} ± {error:.1f}", f"{fluctuation.mean():.1f} by fluctuations")
    # The laboratory's 35.7 (CRC Handbook polynomial, by chemicals 1.5.2) binds no model;
    # 200 ps know ⟨M²⟩ to some 15 %. This holds the order of magnitude.
    assert 15 < value < 60

    # f-sum rule, exact for rigid linear bodies by equipartition: (2/π)∫ω ε'' dω = 2Nμ²/3Vε0I.
    # The window adds χ π²/2T² to it. Ṁ forgets itself in some 0.1 ps, so that 200 ps and three
    # components know ⟨Ṁ²⟩ to √(2 · 0.2/600) = 2.6 %: three times that.
    omega, body = 2 * np.pi * s.frequencies, build_system(liquid.config).species[0]
    total = 2 / np.pi * np.trapezoid(omega * s.values.imag, omega) \
        - (value - 1) * np.pi**2 / 2 / s.longest_lag**2
    exact = 2 * 128 * (body.dipole**2).sum() / (
        3 * volume * 1e27 * units.VACUUM_PERMITTIVITY * body.inertia[0])
    table("acetonitrile: f-sum of the permittivity", f"{total:.1f}", f"{exact:.1f} /ps²")
    np.testing.assert_allclose(total, exact, rtol=0.08)

    # The far-infrared band of the liquid has its maximum at 80 to 90 cm^-1 (from memory, no
    # page seen): a rigid model should show one broad band there and none elsewhere.
    # Its scatter is smoothed over 20 cm^-1 first.
    s = swirlight.spectrum(liquid, "dipole", longest_lag="5 ps")
    width = round(20 / s.wavenumbers[1])
    smooth = np.convolve(s.absorption, np.ones(width) / width, mode="same")
    peak = s.wavenumbers[smooth.argmax()]
    table("acetonitrile: far-infrared maximum", f"{peak:.0f} cm^-1", "some 85 (from memory)")
    assert 60 < peak < 115


@pytest.mark.slow
def test_librations_and_kerr_of_the_liquid(liquid, table):
    s = swirlight.spectrum(liquid, "libration", longest_lag="5 ps")
    np.testing.assert_allclose(np.trapezoid(s.across, s.frequencies), 1.0, rtol=1e-9)
    table("acetonitrile: librations are most at", f"{s.wavenumbers[s.across.argmax()]:.0f} cm^-1",
          "reported")
    k = swirlight.spectrum(liquid, "kerr", longest_lag="10 ps")
    delta = 1.9 * units.CUBIC_ANGSTROM
    alone = delta**2 / (30 * units.BOLTZMANN * 298.15) / spectra.HYPERPOLARIZABILITY
    value, error, _ = k.figures["static susceptibility"]
    table("acetonitrile: static Kerr over that of lone bodies", f"{value / alone:.2f}"
          f" ± {error / alone:.2f}", "g2, near 1")
    assert 0.8 < value / alone < 1.6


@pytest.mark.slow
def test_weak_probe_meets_the_permittivity_of_fluctuations(liquid, tmp_path, table):
    """Linear response: two roads to ε(ω), 12 probed twins against 200 ps of fluctuations.

    1e8 V/m turn no body by more than some degrees. Rows a resolution apart, 4 sigma of both.
    """
    head = LIQUID[: LIQUID.index("stages")]
    probed = made(tmp_path, head + PROBE.lstrip())
    seen = swirlight.spectrum(probed, "transient", kind="dark", longest_lag="1.5 ps")
    dark = swirlight.spectrum(liquid, "dipole", window="gaussian", longest_lag="5 ps")
    for at in (1.2, 1.5, 1.9, 2.3):
        a, b = (s.frequencies.searchsorted(at) for s in (seen, dark))
        for name, part in (("'", np.real), ("''", np.imag)):
            one, two = part(seen.values[a]), part(dark.values[b])
            error = np.hypot(part(seen.errors[a]), part(dark.errors[b]))
            table(f"acetonitrile, {at} THz: permittivity{name} by a probe",
                  f"{one:.2f} ± {part(seen.errors[a]):.2f}",
                  f"{two:.2f} ± {part(dark.errors[b]):.2f} by fluctuations")
            # 0.1 for what the two windows do to a Debye tail: χ/(ωτ)/(ω lag).
            assert abs(one - two) < 4 * error + 0.1
