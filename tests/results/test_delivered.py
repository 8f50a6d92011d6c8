"""What the light delivered, from real runs of a few hundred steps."""

import json
import re

import jsonschema
import numpy as np
import pytest

from swirlight import units
from swirlight.cli.main import run as command
from swirlight.config import load_config
from swirlight.results.delivered import control, delivered, heating, photon_fluence
from swirlight.results.response import respond
from swirlight.results.trajectories import Experiment
from swirlight.run.launch import launch
from swirlight.run.summary import summary_schema
from swirlight.store.run import open_run

ABSORBER = """
name: absorber
source: invented
sites:
  - {label: K, mass: 12 u, at: 0 0 0 nm, sigma: 0.33 nm, epsilon: 0.30 kJ/mol}
  - {label: A, mass: 15 u, at: 0.085 0.085 0.085 nm, sigma: 0.35 nm, epsilon: 0.80 kJ/mol}
  - {label: B, mass: 19 u, at: 0.078 -0.078 -0.078 nm, sigma: 0.29 nm, epsilon: 0.30 kJ/mol}
  - {label: C, mass: 35 u, at: -0.101 0.101 -0.101 nm, sigma: 0.34 nm, epsilon: 1.20 kJ/mol}
light_response:
  at: 800 nm
  polarizability: {principal: 6 6 6 angstrom^3}
  absorptive_polarizability: {principal: 0.1 0.1 0.1 angstrom^3}
  source: invented
heat_capacity: {value: 80 J/mol/K, source: invented}
"""
CONFIG = """
title: an isotropic absorber
seed: 5
sample:
  species: [{use: absorber.yaml, count: 32}]
  density: 1.0 g/cm^3
  temperature: 298.15 K
forces: {cutoff: 0.6 nm, electrostatics: none}
light:
  - {carrier: 800 nm, peak_intensity: 1e12 W/cm^2, duration: 0.05 ps, helicity: -1}
stages:
  - {name: settle, length: 0.4 ps, timestep: 4 fs,
     thermostat: {method: langevin, friction: 4 /ps}}
  - {name: exposure, length: 0.48 ps, lit: true}
exposures: {kinds: [plus, minus, dark], starts: 8, spacing: 0.1 ps}
record: {every: 40 fs, totals_every: 8 fs}
"""


@pytest.fixture(scope="module")
def folder(tmp_path_factory):
    place = tmp_path_factory.mktemp("absorber")
    (place / "absorber.yaml").write_text(ABSORBER)
    (place / "config.yaml").write_text(CONFIG)
    into = place / "run"
    launch(load_config(place / "config.yaml"), into=into, progress=False, threads=1)
    return into


@pytest.fixture(scope="module")
def experiment(folder):
    return Experiment(open_run(folder))


@pytest.mark.published
def test_an_isotropic_absorber_takes_one_quantum_of_spin_a_photon(experiment, table):
    """s3 ħ per absorbed photon, here helicity -1 (Beth, Phys. Rev. 50, 115 (1936)), in a liquid
    of general bodies. Absorbed energy is a trapezoid sum over steps, the impulse a sum of kicks at
    the same times: equal to rounding."""
    figure = delivered(experiment)["impulse_per_photon"]
    table("light impulse per absorbed photon / ħ", f"{figure.value:.12f}", "-1")
    assert figure.value == pytest.approx(-1.0, abs=1e-9)
    assert figure.interval[0] - 1e-9 <= -1.0 <= figure.interval[1] + 1e-9


def test_the_spin_decays_while_the_impulse_stays(experiment):
    impulse, spin = (respond(experiment, name).along for name in ("light_impulse",
                                                                  "angular_momentum"))
    end = impulse.row_at(impulse.span[1])
    assert np.ptp(impulse.odd[end:]) < 1e-3 * abs(impulse.odd[-1])
    assert abs(spin.odd[-1]) < 0.5 * abs(impulse.odd[-1])
    # nothing else turns them: no thermostat, and angular momentum of pairs goes to orbits
    neighbours = respond(experiment, "pair_impulse").along
    np.testing.assert_allclose(spin.odd, impulse.odd + neighbours.odd, atol=1e-9)


def test_fluence_is_the_integral_of_the_pulse(experiment):
    """∫I dt/ħω of a Gaussian, √(π/(4 ln 2)) I τ, by hand in SI units."""
    pulse, = experiment.seen
    hbar, seconds, omega = 1.054571817e-34, 0.05e-12, 2 * np.pi * 299792458.0 / 800e-9
    per_square_metre = 1e16 * seconds * np.sqrt(np.pi / (4 * np.log(2))) / (hbar * omega)
    assert photon_fluence([pulse]) == pytest.approx(per_square_metre * 1e-18, rel=1e-9)
    found = delivered(experiment)
    assert found["impulse_per_fluence"].value == pytest.approx(
        found["impulse"].value / photon_fluence([pulse]))
    assert found["impulse_per_fluence"].unit == "hbar nm2"


def test_absorbed_energy_is_that_of_the_cross_section(experiment):
    """Photons per body = fluence · σ with σ = k·4πα″/n in the vacuum (n = 1), α″/4πε0 = 0.1 Å³:
    common optics, e.g. Bohren & Huffman, eq. 5.11 (from memory)."""
    cross_section = 2 * np.pi / 800.0 * 4 * np.pi * 0.1e-3  # nm²
    pulse, = experiment.seen
    energy = photon_fluence([pulse]) * cross_section * units.HBAR * pulse.carrier
    assert delivered(experiment)["absorbed_energy"].value * units.KJ_PER_MOL == pytest.approx(
        energy, rel=1e-3)


def test_heating_both_ways_and_the_control(experiment):
    found = heating(experiment)
    energy = delivered(experiment)["absorbed_energy"].value
    assert found["absorbed_over_heat_capacity"]["value"] == pytest.approx(energy * 1e3 / 80)
    assert {"own_temperature", "work_over_heat_capacity"} <= set(found)
    odd = control(experiment)
    assert set(odd) == {"temperature", "light_work"}
    assert all(f["p"] > 1e-3 or f["error"] == 0.0 for f in odd.values())


def test_summary_says_the_same(experiment, folder):
    summary = json.loads((folder / "summary.json").read_text())
    jsonschema.validate(summary, summary_schema())
    figures = respond(experiment, "light_impulse").figures()
    assert summary["response"]["light_impulse"]["odd"]["value"] == figures["value"]


def test_the_command_answers_first_and_draws(folder, tmp_path, capsys):
    assert command(["response", str(folder), "--picture", str(tmp_path / "a.png")]) == 0
    out, error = capsys.readouterr()
    assert out.splitlines()[1].startswith("Answer: yes, the pulse turns these molecules.")
    assert re.search(r"angular impulse of the light +-\d", out)
    assert "impulse per photon: -1 " in out and "control, zero by symmetry" in out
    assert (tmp_path / "a.png").stat().st_size > 10_000 and str(tmp_path / "a.png") in error
    assert command(["response", str(folder), "--of", "temperature", "--json"]) == 0
    found = json.loads(capsys.readouterr()[0])
    assert set(found["response"]) == {"light_impulse", "angular_momentum", "temperature"}
    assert found["drawn"]["observable"] == "temperature"
    assert (folder / "response-temperature.png").is_file()


def test_the_command_refuses_in_one_line(folder, capsys):
    assert command(["response", str(folder), "--of", "spin"]) == 2
    out, error = capsys.readouterr()
    assert out == "" and "angular_momentum" in error and "Traceback" not in error
