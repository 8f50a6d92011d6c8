"""Spectra of little runs: what is computed, what is said, what is refused."""

import json
import shutil
from dataclasses import replace
from types import SimpleNamespace

import numpy as np
import pytest

import swirlight
from swirlight import units
from swirlight.analysis import spectra
from swirlight.cli.main import run as command
from swirlight.config import load_config
from swirlight.errors import InputError
from swirlight.report.spectra import _with_error, spectrum_text, spectrum_values
from swirlight.results.spectrum import _angular_velocities
from swirlight.rotation import rotation_matrix
from swirlight.run.launch import launch
from swirlight.sample import build_system

DARK = """
title: a little acetonitrile
seed: 5
sample:
  species: [{use: acetonitrile, count: 32}]
  density: 0.777 g/cm^3
  temperature: 298.15 K
forces: {cutoff: 0.65 nm, electrostatics: reaction-field}
stages:
  - {name: settle, length: 0.4 ps, timestep: 4 fs, thermostat: {method: langevin, friction: 2 /ps}}
  - {name: observe, length: 1.2 ps}
exposures: {kinds: [dark], starts: 3, spacing: 0.2 ps}
record: {every: 20 fs, vectors: [orientation, angular_momentum, angular_velocity],
         totals_every: 20 fs}
"""
SALT = """
title: a little molten salt
seed: 7
sample:
  species: [{use: cation.yaml, count: 16}, {use: anion.yaml, count: 16}]
  density: 1.3 g/cm^3
  temperature: 1300 K
forces: {cutoff: 0.5 nm, electrostatics: damped-shifted}
stages:
  - {name: settle, length: 0.4 ps, timestep: 2 fs, thermostat: {method: langevin, friction: 2 /ps}}
  - {name: observe, length: 1 ps}
exposures: {kinds: [dark], starts: 1}
record: {every: 20 fs, vectors: [position], totals_every: 10 fs}
"""
ION = """
name: NAME
source: invented for a test
sites: [{label: I, mass: 30 u, at: 0 0 0 nm, charge: CHARGE e, sigma: 0.3 nm, epsilon: 0.5 kJ/mol}]
"""
PROBED = """
title: pump and probe
seed: 6
sample:
  species: [{use: acetonitrile, count: 32}]
  density: 0.777 g/cm^3
  temperature: 298.15 K
forces: {cutoff: 0.65 nm, electrostatics: reaction-field}
light:
  - {carrier: 800 nm, peak_intensity: 1e12 W/cm^2, duration: 0.1 ps, centre: 0.2 ps}
  - {carrier: 3 THz, peak_field: 1e7 V/m, duration: 0.3 ps, centre: 0.7 ps, in_kinds: same,
     ellipticity: 0 deg}
stages:
  - {name: settle, length: 0.4 ps, timestep: 4 fs, thermostat: {method: langevin, friction: 2 /ps}}
  - {name: exposure, length: 1.6 ps, lit: true}
exposures: {kinds: [plus, dark], starts: 2, spacing: 0.2 ps}
record: {every: 20 fs, vectors: [orientation], totals_every: 20 fs}
"""


def made(folder, text):
    path = folder / "config.yaml"
    path.write_text(text)
    return launch(load_config(path), into=folder / "run", progress=False, threads=1)


@pytest.fixture(scope="module")
def dark(tmp_path_factory):
    return made(tmp_path_factory.mktemp("dark"), DARK)


@pytest.fixture(scope="module")
def probed(tmp_path_factory):
    return made(tmp_path_factory.mktemp("probed"), PROBED)


@pytest.fixture(scope="module")
def water(tmp_path_factory):
    text = DARK.replace("acetonitrile", "water").replace("0.777", "0.997") \
        .replace("4 fs", "2 fs").replace("0.65", "0.45").replace("starts: 3", "starts: 1")
    return made(tmp_path_factory.mktemp("water"), text)


def test_permittivity_by_hand(dark):
    """The whole chain again with plain sums and SI units, at one frequency."""
    s = swirlight.spectrum(dark, "dipole", window="triangle", longest_lag="0.2 ps")
    assert s.label == "complex permittivity" and s.starts == 3 and s.kind == "dark"
    lags, row = 10, 7
    omega = 2 * np.pi * s.frequencies[row] * 1e12
    each, squares = [], []
    for start in range(3):
        m = dark["dark", start].total_dipole[:]
        c = np.array([np.mean((m**2).sum(1)) - 0.5 * np.mean(((m[k:] - m[: len(m) - k])**2).sum(1))
                      for k in range(lags)])
        c *= 1 - np.arange(lags) / lags
        each.append(omega * 20e-15 * (0.5 * c[0] + c[1:] @ np.cos(
            omega * 20e-15 * np.arange(1, lags))))
        squares.append(c[0])
    kelvin = np.mean([dark["dark", k].temperature[:].mean() for k in range(3)])
    factor = 1 / (3 * np.prod(dark["dark", 0].box) * 1e-27 * 8.8541878188e-12 * 1.380649e-23
                  * kelvin)
    np.testing.assert_allclose(s.values[row].imag, factor * np.mean(each), rtol=1e-8)
    np.testing.assert_allclose(s.errors[row].imag, factor * np.std(each, ddof=1) / np.sqrt(3),
                               rtol=1e-8)
    for name in ("static permittivity", "from fluctuations"):
        value, error, unit = s.figures[name]
        np.testing.assert_allclose(value, 1 + factor * np.mean(squares), rtol=1e-9)
        np.testing.assert_allclose(error, factor * np.std(squares, ddof=1) / np.sqrt(3), rtol=1e-6)
        assert unit == ""
    np.testing.assert_allclose(s.wavenumbers, s.frequencies * 33.35640952, rtol=1e-9)
    np.testing.assert_allclose((s.refractive_index + 1j * s.absorption * 100 * 299792458
                                / (4e12 * np.pi * np.maximum(s.frequencies, 1e-9))) ** 2,
                               s.permittivity, rtol=1e-8, atol=1e-8)


def test_what_is_said_of_a_permittivity(dark):
    notes = " | ".join(swirlight.spectrum(dark, longest_lag="0.4 ps").notes)
    for words in ("window hann, longest lag 0.4 ps: a sharp line is 2.5 THz",
                  "high-frequency permittivity 1: the bodies of this model do not polarise",
                  "kT at the mean temperature"):
        assert words in notes
    assert "conducting" not in notes  # the reaction field's surrounding is a conductor
    given = swirlight.spectrum(dark, high_frequency=1.8)
    assert "high-frequency permittivity 1.8, as given" in given.notes
    np.testing.assert_allclose(given.values - swirlight.spectrum(dark).values, 0.8, rtol=1e-12)


def test_kerr_from_orientations(dark):
    """The static limit is ⟨Π:Π⟩/20NkT of the rotation matrices themselves."""
    s = swirlight.spectrum(dark, "kerr", longest_lag="0.3 ps")
    alpha = build_system(dark.config).species[0].responses[0].polarizability
    squares, kelvin = [], []
    for trajectory in dark:
        r = rotation_matrix(trajectory.orientation[:])
        pi = (r @ alpha @ r.swapaxes(-1, -2)).sum(axis=1)
        pi -= np.trace(pi, axis1=1, axis2=2)[:, None, None] / 3 * np.eye(3)
        squares.append((pi**2).sum(axis=(1, 2)).mean())
        kelvin.append(trajectory.temperature[:].mean())
    chi = np.mean(squares) / (20 * 32 * units.BOLTZMANN * np.mean(kelvin))
    np.testing.assert_allclose(s.values[0].real * spectra.HYPERPOLARIZABILITY, chi, rtol=1e-5)
    assert s.unit == "C m^4/V^3" and len(s.lags) == len(s.response.values) == 15
    assert s.response.unit == "C m^4/V^3/ps" and s.response.values[3] > 0
    assert any("without a wavelength" in note for note in s.notes)


def test_librations_of_a_linear_body(dark):
    s = swirlight.spectrum(dark, "libration", longest_lag="0.6 ps")
    assert not any("folded" in note for note in s.notes)
    assert list(s.curves) == ["across"] and s.unit == "ps"
    np.testing.assert_allclose(np.trapezoid(s.across, s.frequencies), 1.0, rtol=1e-9)
    assert any("laboratory frame" in note for note in s.notes)
    assert 1.0 < s.frequencies[s.across.argmax()] < 4.0  # what 1.7 THz resolution shows


def test_librations_of_water_by_axis(water):
    """The axis of the smallest moment librates fastest."""
    s = swirlight.spectrum(water, "libration", longest_lag="0.14 ps")
    assert list(s.curves) == ["x", "y", "z"]
    assert any("body frame" in note for note in s.notes)
    assert any("one start: errors from 4 pieces" in note for note in s.notes)
    assert any("what is faster is folded back" in note for note in s.notes)  # 20 fs are too few
    means = {name: np.average(s.frequencies, weights=np.maximum(c.values, 0))
             for name, c in s.curves.items()}
    inertia = build_system(water.config).species[0].inertia
    assert inertia.argmin() == 0 and max(means, key=means.get) == "x"
    for curve in s.curves.values():
        np.testing.assert_allclose(np.trapezoid(curve.values, s.frequencies), 1.0, rtol=1e-9)
        assert np.isfinite(curve.errors).all()


def test_kerr_asks_which_polarizability_is_meant(dark, monkeypatch):
    body = build_system(dark.config).species[0]
    block = body.responses[0]

    def given(*responses):
        system = SimpleNamespace(species=(replace(body, responses=responses),))
        monkeypatch.setattr("swirlight.results.spectrum.build_system", lambda config: system)

    given()
    with pytest.raises(InputError, match="no species has an anisotropic polarizability"):
        swirlight.spectrum(dark, "kerr")
    wave = 2 * np.pi * units.LIGHT_SPEED
    given(replace(block, at=wave / 800), replace(block, at=wave / 400,
                                                 polarizability=2 * block.polarizability))
    with pytest.raises(InputError, match="at several wavelengths: name one"):
        swirlight.spectrum(dark, "kerr")
    red, blue = (swirlight.spectrum(dark, "kerr", wavelength=w) for w in ("800 nm", "410 nm"))
    np.testing.assert_allclose(blue.values, 4 * red.values, rtol=1e-12)
    assert "polarizability at 800 nm" in red.notes


def test_ions_conduct(tmp_path):
    """σ(ω) at one frequency and ε with the static part split off, by plain sums in SI units."""
    for name, charge in (("cation", "0.8"), ("anion", "-0.8")):
        (tmp_path / f"{name}.yaml").write_text(ION.replace("NAME", name).replace("CHARGE", charge))
    run = made(tmp_path, SALT)
    s = swirlight.spectrum(run, "dipole", window="triangle", longest_lag="0.1 ps")
    current = [np.diff(t.total_dipole[:], axis=0) / 10e-15 for t in run]
    lags, step = 10, 10e-15
    c = np.mean([[np.mean((j**2).sum(1)) - 0.5 * np.mean(((j[k:] - j[: len(j) - k])**2).sum(1))
                  for k in range(lags)] for j in current], axis=0) * (1 - np.arange(lags) / lags)
    kelvin = np.mean([t.temperature[:].mean() for t in run])
    factor = 1 / (3 * np.prod(run["dark", 0].box) * 1e-27 * 1.380649e-23 * kelvin)

    def sigma(omega):
        wave = np.exp(1j * omega * step * np.arange(lags))
        return factor * step * (c @ wave - 0.5 * c[0]) / np.sinc(omega * step / 2 / np.pi) ** 2

    value, error, unit = s.figures["static conductivity"]
    np.testing.assert_allclose(value, sigma(0.0).real, rtol=1e-9)
    assert unit == "S/m" and error > 0
    omega = 2 * np.pi * s.frequencies[9] * 1e12
    np.testing.assert_allclose(
        s.values[9], 1 + 1j * (sigma(omega) - sigma(0.0)) / (8.8541878188e-12 * omega), rtol=1e-8)
    assert any("static conductivity split off" in note for note in s.notes)
    assert any("do not trust it here" in note for note in s.notes)  # no Ewald sum
    with pytest.raises(InputError, match="which. none can rotate"):
        swirlight.spectrum(run, "libration")


class Recorded(dict):
    """Some of what a trajectory has recorded."""


def test_momenta_and_velocities_tell_the_same_librations(water):
    """Body-frame angular velocity by either road, for a body with three different moments."""
    trajectory, body = water["dark", 0], build_system(water.config).species[0]
    momenta = Recorded({n: trajectory[n] for n in ("orientation", "angular_momentum")})
    momenta.species = trajectory.species
    one, two = (np.concatenate(list(_angular_velocities(t, 0, body)), axis=1)
                for t in (trajectory, momenta))
    turn = rotation_matrix(trajectory.orientation[:])
    plain = np.einsum("fnji,fnj->fni", turn, trajectory.angular_velocity[:])
    np.testing.assert_allclose(one, plain, atol=2e-6 * np.abs(plain).max())
    np.testing.assert_allclose(two, plain, atol=2e-6 * np.abs(plain).max())


def test_driven_liquids_have_power_spectra_only(probed):
    for of, label in (("dipole", "power spectrum, not permittivity"),
                      ("kerr", "power spectrum, not optical-Kerr response")):
        for kind in ("plus", "dark"):  # the probe acts in dark too
            s = swirlight.spectrum(probed, of, kind=kind)
            assert s.label == label and list(s.curves) == ["power"] and not s.figures
            assert any(f"light acts in it in {kind}" in note for note in s.notes)
    m = np.array([[probed["plus", k, p].total_dipole[:] for p in (0, 1)] for k in (0, 1)])
    s = swirlight.spectrum(probed, "dipole", kind="plus")
    step = s.frequencies[1]
    total = s.values.sum() * 2 * step - s.values[0] * step  # both sides; Nyquist's row is tiny
    np.testing.assert_allclose(total, (m**2).sum(-1).mean() / 3.33564095e-30**2, rtol=1e-3)


def test_transient_permittivity_of_probe_twins(probed):
    s = swirlight.spectrum(probed, "transient", kind="plus")
    assert s.label == "transient permittivity" and s.starts == 2
    m, e = (np.array([0.5 * (np.asarray(probed["plus", k, 0][name])
                             - np.asarray(probed["plus", k, 1][name])) for k in (0, 1)]).mean(0)
            for name in ("total_dipole", "light/field"))
    times = probed["plus", 0].total_dipole.times
    row = s.probe.argmax()
    wave = np.exp(2j * np.pi * s.frequencies[row] * times)
    chi = (wave @ m[:, 0]) / (wave @ e[:, 0]) / (
        8.8541878188e-12 * np.prod(probed["plus", 0].box) * 1e-27)
    np.testing.assert_allclose(s.values[row], 1 + chi, rtol=1e-6)
    assert np.isfinite(s.errors).all()
    assert 2.0 < s.frequencies[row] < 4.0 and s.probe.min() > 0.01
    assert any("delay 0.5 ps" in note for note in s.notes)
    short = swirlight.spectrum(probed, "transient", kind="plus", window="triangle",
                               longest_lag="0.5 ps")
    since = np.clip((times - 0.7) / 0.5, 0.0, 1.0)
    row = short.probe.argmax()
    wave = np.exp(2j * np.pi * short.frequencies[row] * times)
    chi = (wave * (1 - since) @ m[:, 0]) / (wave @ e[:, 0]) / (
        8.8541878188e-12 * np.prod(probed["plus", 0].box) * 1e-27)
    np.testing.assert_allclose(short.values[row], 1 + chi, rtol=1e-6)
    assert any("what answers later is left out" in note for note in short.notes)
    at_rest = swirlight.spectrum(probed, "transient", kind="dark")
    assert any("no pump in this kind" in note for note in at_rest.notes)
    assert not np.array_equal(at_rest.values, s.values)


@pytest.mark.parametrize("options, words", [
    ({"of": "sound"}, "no spectrum of 'sound'; there are dipole, kerr, libration, transient"),
    ({"of": "dipole", "species": "water"}, "species says nothing about a spectrum of dipole"),
    ({"window": "square"}, "no window 'square'"),
    ({"longest_lag": "1 nm"}, "is not the unit of a time"),
    ({"longest_lag": "1 ps"}, "longest_lag: 1 ps does not fit the record, which has 61 frames"),
    ({"longest_lag": "20 fs"}, "at least 4 frames"),
    ({"kind": "plus"}, "kind plus: the run has dark"),
    ({"kind": "bright"}, "kind bright: the run has dark"),
    ({"high_frequency": 0.9}, "a permittivity is at least 1"),
    ({"of": "libration", "species": "argon"}, "argon? acetonitrile can rotate"),
    ({"of": "transient"}, "dark has no probe"),
])
def test_what_cannot_be_had_is_refused(dark, options, words):
    with pytest.raises(InputError) as error:
        swirlight.spectrum(dark, **options)
    assert words in str(error.value)


def test_what_was_not_recorded_is_named(probed):
    with pytest.raises(InputError, match="angular_momentum was not recorded; it has .*orientation"):
        swirlight.spectrum(probed, "libration")


def test_one_start_in_a_short_record_has_no_errors(water):
    s = swirlight.spectrum(water, "dipole", longest_lag="0.5 ps")
    assert np.isnan(s.errors).all() and any("no errors" in note for note in s.notes)
    assert "±" not in spectrum_text(s)
    assert spectrum_values(s)["curves"]["permittivity"]["real_errors"][0] is None


def test_only_complete_starts_count(dark, tmp_path):
    copy = tmp_path / "run"
    shutil.copytree(dark.path, copy)
    (copy / "dark-001.h5").unlink()
    s = swirlight.spectrum(swirlight.open_run(copy))
    assert s.starts == 2 and "2 of 3 starts are complete and count" in s.notes
    for start in (0, 2):
        (copy / f"dark-{start:03d}.h5").unlink()
    with pytest.raises(InputError, match="no start is complete yet, of 3"):
        swirlight.spectrum(swirlight.open_run(copy))


def test_to_xarray_has_named_axes_and_units(dark):
    pytest.importorskip("xarray")
    data = swirlight.spectrum(dark).to_xarray()
    assert data.permittivity.dims == ("frequency",) and data.absorption.units == "cm^-1"
    assert data.frequency.units == "THz" and data.wavenumber.units == "cm^-1"
    assert data.attrs["label"] == "complex permittivity" and "permittivity_error" in data


@pytest.mark.parametrize("value, error, text", [
    (33.378, 2.09, "33.4 ± 2.1"), (0.0, 0.0, "0"), (4.36e-61, 3.1e-62, "(4.36 ± 0.31)e-61"),
    (139.2, 10.4, "139 ± 10"), (5.0, np.nan, "5"), (1.00000000012, 2e-10, "1 ± 2e-10"),
])
def test_numbers_are_printed_as_their_errors_allow(value, error, text):
    assert _with_error(value, error) == text


@pytest.mark.parametrize("of, kind", [("dipole", "plus"), ("transient", "plus")])
def test_command_prints_a_table_and_draws(probed, of, kind, tmp_path, capsys):
    picture = tmp_path / "seen.png"
    assert command(["spectrum", str(probed.path), "--of", of, "--kind", kind,
                    "--picture", str(picture)]) == 0
    out, error = capsys.readouterr()
    assert "THz  cm^-1" in out and "starts" in out.splitlines()[0]
    assert len(out.splitlines()) < 45 and str(picture) in error
    assert picture.read_bytes()[:4] == b"\x89PNG"


def test_command_for_programs_and_its_default_picture(dark, capsys):
    assert command(["spectrum", str(dark.path), "--of", "kerr", "--json"]) == 0
    found = json.loads(capsys.readouterr().out)
    assert found["starts"] == 3 and found["frequency"]["unit"] == "THz"
    assert len(found["curves"]["susceptibility"]["real_values"]) == len(
        found["frequency"]["values"])
    assert (dark.path / "spectrum-kerr.png").is_file()


def test_command_refuses_a_picture_it_cannot_draw(dark, capsys):
    assert command(["spectrum", str(dark.path), "--of", "kerr", "--picture", "seen.gif"]) == 2
    assert "needs a name that ends in .png" in capsys.readouterr().err
