"""The plan as a whole: what it says back, its figures against numbers worked by hand, refusals."""

import json
import subprocess
import sys
import time

import numpy as np
import pytest

import swirlight
from swirlight.config import load_config
from swirlight.errors import ConfigError, InputError
from swirlight.run.plan import check_config
from swirlight.run.plan.page import CAUTION, OUTSIDE, Notice, Plan, Row, Section
from swirlight.store.start import save_state
from tests.config.good import GOOD
from tests.run.plans import BASE, DARK, config, plan, rod, rod_plan, value

UNIT = 1.66053906892e-27  # kg, CODATA 2022
BOLTZMANN = 1.380649e-23  # J/K


def test_every_key_is_said_back_in_its_unit():
    found = plan()
    assert value(found, "sample.density") == pytest.approx(0.777, rel=1e-14)
    assert found.find("sample.density")[0].unit == "g/cm^3"
    assert str(found.find("light[0].carrier")[0]) == "374.7405725 THz"  # c/800 nm
    assert str(found.find("stages[1].timestep")[0]) == "0.002 ps"
    assert value(found, "stages[0].lit") is False
    assert value(found, "forces.pairs") == "[]"
    assert value(found, "seed") == 41


def test_echo_reads_back_as_the_same_config():
    """Every leaf of the resolved config appears once, all digits kept."""
    from swirlight.run.plan.echo import leaves

    checked = config(text=GOOD)
    shown = {row.name: str(row) for part in check_config(checked).sections
             if part.title.startswith("config") for row in part.rows}
    for key, leaf in leaves(checked.resolved(), ""):
        text = {True: "true", False: "false"}.get(leaf, str(leaf)) \
            if isinstance(leaf, bool) else str(leaf)
        assert shown[key.lstrip(".")] == text


def test_a_title_is_no_quantity():
    found = plan("title=3 ps")
    assert value(found, "title") == "3 ps"
    assert found.title == "3 ps"


def test_sample_section():
    found = plan()
    # 108 × 41.053 u at 0.777 g/cm³
    edge = (108 * 41.053 * UNIT * 1e3 / 0.777 * 1e21) ** (1 / 3)
    for axis in "xyz":
        assert value(found, f"edge {axis}") == pytest.approx(edge, rel=1e-8)
    assert value(found, "density", "sample") == pytest.approx(0.777, rel=1e-12)
    assert value(found, "number density") == pytest.approx(108 / edge**3, rel=1e-8)
    assert value(found, "largest cutoff") == pytest.approx(edge / 2, rel=1e-8)
    assert value(found, "smallest count") == int(np.ceil(108 * (2 / edge) ** 3))
    assert value(found, "bodies", "sample") == 108 and value(found, "sites") == 324


def test_edges_and_start_file_give_the_box(tmp_path):
    edges = plan(text=BASE.replace("density: 0.777 g/cm^3", "edges: [2.1 nm, 2.2 nm, 2.3 nm]"))
    assert [value(edges, f"edge {a}") for a in "xyz"] == pytest.approx([2.1, 2.2, 2.3])

    from swirlight.sample import build_system
    from swirlight.state import State

    zeros = np.zeros((108, 3))
    turned = np.tile([1.0, 0, 0, 0], (108, 1))
    state = State(position=zeros, orientation=turned, velocity=zeros, angular_momentum=zeros,
                  box=np.array([2.5, 2.6, 2.7]), random=np.random.default_rng(1))
    save_state(tmp_path / "start.h5", state, build_system(config()))
    text = BASE.replace("density: 0.777 g/cm^3", "begin_from: start.h5")
    begun = plan(text=text, folder=tmp_path)
    assert [value(begun, f"edge {a}") for a in "xyz"] == pytest.approx([2.5, 2.6, 2.7])


def test_body_section(tmp_path):
    found = rod_plan(tmp_path, charge=0.1)
    inertia = 2 * 10 * 0.1**2
    assert value(found, "moment x") == pytest.approx(inertia)
    assert not found.find("moment z")  # nothing turns about the axis of a linear body
    period = 2 * np.pi * np.sqrt(inertia * UNIT * 1e-18 / (BOLTZMANN * 298.15)) * 1e12
    assert value(found, "thermal period y") == pytest.approx(period, rel=1e-8)
    quantum = 1.054571817e-34**2 / (2 * inertia * UNIT * 1e-18 * BOLTZMANN * 298.15)
    assert value(found, "ħ²/2IkT x") == pytest.approx(quantum, rel=1e-7)
    # 0.1 e over 0.2 nm
    assert value(found, "dipole") == pytest.approx(0.1 * 0.2 * 1.602176634e-28 / 3.33564095198e-30)
    assert value(found, "heat capacity") == pytest.approx(2.5 * 8.314462618)
    assert "upper bound" in found.find("heat capacity")[0].note


def test_light_section_of_averaged_light():
    found = plan("light[0].helicity=-1")
    assert value(found, "coupling", "light[0]") == "averaged"
    assert "cycles in it" in found.find("coupling", "light[0]")[0].note
    assert value(found, "photon energy") == pytest.approx(1239.84198 / 800.0, rel=1e-8)  # eV nm
    amplitude = 27.4492372722e2 * np.sqrt(1e9 / 1.34)
    assert value(found, "amplitude") == pytest.approx(amplitude, rel=1e-8)
    assert value(found, "largest field") == pytest.approx(amplitude / np.sqrt(2), rel=1e-8)
    assert value(found, "s3 |amplitude|^2") == pytest.approx(-amplitude**2, rel=1e-8)
    assert value(found, "s3") == -1.0
    assert value(found, "fluence") == pytest.approx(1.06446701943 * 1e9 * 0.4e-12, rel=1e-9)
    assert not found.find("achieved duration")


def test_achieved_values_of_resolved_light():
    found = plan("light[0].carrier=1 THz", "light[0].duration=4 ps", "stages[1].length=25 ps")
    assert value(found, "coupling", "light[0]") == "resolved"
    # four cycles: within a percent of what the envelope says
    assert value(found, "achieved duration") == pytest.approx(4.0, rel=0.01)
    assert value(found, "achieved fluence") == pytest.approx(value(found, "fluence"), rel=0.01)
    assert value(found, "achieved largest field") == pytest.approx(
        value(found, "largest field"), rel=0.01)
    assert value(found, "steps per fastest rotation", "stages[1]") > 1000
    assert value(found, "steps per cycle") == pytest.approx(500.0)  # of 2 fs
    assert value(found, "steps per duration") == pytest.approx(2000.0)
    assert value(found, "dipolar absorption") == "unknown before the run"
    assert value(found, "dipolar heating") == "unknown before the run"


ABSORBER = "  absorptive_polarizability: {principal: 0.02 0.02 0.02 angstrom^3}\n"


def test_absorption_heating_and_spin(tmp_path):
    found = rod_plan(tmp_path, "light[0].peak_intensity=1e11 W/cm^2",
                     "light[0].refractive_index=1.0", response=ABSORBER)
    # cross-section σ = (ω/c) α/ε0 = (2π/λ) 4π a for α/4πε0 = a, n = 1
    section = 2 * np.pi / 800e-9 * 4 * np.pi * 0.02e-30
    fluence = 1.06446701943 * 1e15 * 0.4e-12  # J/m²
    photon = 6.62607015e-34 * 299792458 / 800e-9
    photons = fluence * section / photon
    assert value(found, "photons absorbed") == pytest.approx(photons, rel=1e-8)
    energy = photons * photon * 6.02214076e23 / 1e3  # kJ/mol
    assert value(found, "energy absorbed", "light[0] on") == pytest.approx(energy, rel=1e-8)
    assert value(found, "energy absorbed", "heating") == pytest.approx(energy, rel=1e-8)
    assert value(found, "heating", "heating") == pytest.approx(
        energy * 1e3 / (2.5 * 8.314462618), rel=1e-8)
    assert "upper bound" in found.find("heating", "heating")[0].note
    # ħ a photon, two thirds of it for a linear body
    assert value(found, "spin from absorption") == pytest.approx(2 / 3 * photons, rel=1e-8)


def test_train_and_mixture_heat_together(tmp_path):
    single = rod_plan(tmp_path, response=ABSORBER)
    train = rod_plan(tmp_path, "light[0].train={count: 3, period: 0.1 ps}", response=ABSORBER)
    assert value(train, "heating", "heating") == pytest.approx(
        3 * value(single, "heating", "heating"))
    text = BASE.replace("- {use: acetonitrile, count: 108}",
                        "- {use: acetonitrile, count: 108}\n    - {use: rod.yaml, count: 216}")
    mixed = plan(text=text, folder=tmp_path)
    energy = value(single, "energy absorbed", "heating")
    assert value(mixed, "energy absorbed", "heating") == pytest.approx(energy * 2 / 3)
    capacity = (63.7 * 108 + 2.5 * 8.314462618 * 216) / 324
    assert value(mixed, "heating", "heating") == pytest.approx(energy * 2 / 3 * 1e3 / capacity)


def test_kerr_impulse_from_the_fluence(tmp_path):
    response = "  polarizability: {principal: 4 4 6 angstrom^3}\n"
    linear = rod_plan(tmp_path, "light[0].ellipticity=0 deg", response=response)
    circular = rod_plan(tmp_path, response=response)
    # Δα F/(2 ε0 c n)/√(I kT), in SI
    fluence = 1.06446701943 * 1e13 * 0.4e-12
    anisotropy = 2 * 1.1126500562e-40
    momentum = np.sqrt(0.2 * UNIT * 1e-18 * BOLTZMANN * 298.15)
    impulse = anisotropy * fluence / (2 * 8.8541878188e-12 * 299792458 * 1.34) / momentum
    assert value(linear, "alignment impulse") == pytest.approx(impulse, rel=1e-8)
    assert value(circular, "alignment impulse") == pytest.approx(impulse / 2, rel=1e-8)


def test_lorentz_factor_acts_on_wells(tmp_path):
    response = "  polarizability: {principal: 4 4 6 angstrom^3}\n"
    plain = rod_plan(tmp_path, response=response)
    lorentz = rod_plan(tmp_path, "light[0].local_field=lorentz", response=response)
    factor = ((1.34**2 + 2) / 3) ** 2
    for name in ("alignment well", "alignment impulse"):
        assert value(lorentz, name) == pytest.approx(factor * value(plain, name))


def test_quiver_of_a_dipole(tmp_path):
    found = rod_plan(tmp_path, charge=0.2,
                     response="  polarizability: {principal: 4 4 4 angstrom^3}\n")
    dipole, omega = 0.04 * 1.602176634e-28, 2 * np.pi * 299792458 / 800e-9
    quiver = dipole**2 / (0.2 * UNIT * 1e-18 * omega**2) / (4 * 1.1126500562e-40)
    assert value(found, "quiver of the dipole") == pytest.approx(quiver, rel=1e-8)


def test_dipole_figures_of_resolved_light(tmp_path):
    found = rod_plan(tmp_path, "light[0].carrier=2 THz", "light[0].ellipticity=0 deg",
                     "light[0].peak_field=1e8 V/m", "light[0].duration=2 ps",
                     "stages[1].length=12 ps", charge=0.2,
                     text=BASE.replace("    peak_intensity: 1e9 W/cm^2\n", ""))
    energy = 0.04 * 1.602176634e-28 * 1e8
    kt = BOLTZMANN * 298.15
    assert value(found, "dipole energy") == pytest.approx(energy / kt, rel=1e-8)
    swing = energy / (2 * np.pi * 2e12 * np.sqrt(0.2 * UNIT * 1e-18 * kt))
    assert value(found, "dipole impulse") == pytest.approx(swing, rel=1e-8)


def test_bias_field():
    found = plan("bias_field={vector: 0 0 1e8 V/m, from: 0 ps, to: 2 ps}")
    dipole = value(found, "dipole") * 3.33564095198e-30
    assert value(found, "largest μF on acetonitrile") == pytest.approx(
        dipole * 1e8 / (BOLTZMANN * 298.15), rel=1e-8)
    assert value(found, "on until") == pytest.approx(2.0)


def test_beats_are_stated():
    text = BASE.replace("    refractive_index: 1.34\n",
                        "    refractive_index: 1.34\n  - {carrier: 374.8 THz, peak_intensity:"
                        " 1e9 W/cm^2, duration: 0.4 ps, helicity: -1}\n")
    found = plan(text=text)
    (beat,) = found.find("beat 0")
    assert "light[0] and light[1] add as amplitudes" in beat.value
    assert [row.value for row in found.find("s3")] == [1.0, -1.0]


def test_numbers_of_trajectories():
    resolved = plan("light[0].carrier=1 THz", "light[0].duration=1 ps")
    assert [value(resolved, k, "trajectories") for k in ("plus", "minus", "dark")] == [8, 8, 4]
    assert value(resolved, "trajectories") == 20
    four = plan("light[0].carrier=1 THz", "light[0].duration=1 ps", "exposures.carrier_phases=4")
    assert value(four, "trajectories") == 36
    averaged = plan()
    assert value(averaged, "trajectories") == 12
    assert value(plan(text=DARK), "trajectories") == 1


def test_record_section():
    found = plan()
    assert value(found, "vectors show up to") == pytest.approx(25.0)  # THz, 1/(2 · 20 fs)
    rate = 1 / value(found, "thermal period x")
    assert value(found, "fastest rotations") == pytest.approx(4 * rate)


def test_dark_plan_has_no_words_on_light():
    found = plan(text=DARK)
    assert not found.lit and not found.find("coupling", "light")
    assert CAUTION not in str(found) and "laser_caution" not in found.to_dict()


# --- refusals -----------------------------------------------------------------------------


def test_too_long_a_timestep_is_refused_naming_the_longest():
    with pytest.raises(InputError, match=r"light\[0\].*longest timestep is 50 fs"):
        plan("light[0].carrier=1 THz", "stages[0].timestep=100 fs", "record.every=100 fs",
             "record.totals_every=100 fs")


def test_too_small_a_box_is_refused_naming_cutoff_and_count():
    with pytest.raises(InputError) as refused:
        plan("sample.species[0].count=64")
    assert "forces.cutoff: the box of" in str(refused.value)
    assert "Largest cutoff for this box: 0.888" in str(refused.value)
    assert "smallest number of bodies for this cutoff at the same density: 92" in str(refused.value)
    assert value(plan("sample.species[0].count=92"), "bodies", "sample") == 92


def test_far_wavelength_is_refused():
    text = BASE.replace("acetonitrile", "corkscrew").replace("0.777", "1.30").replace("108", "216")
    with pytest.raises(InputError, match=r"light\[0\]\.carrier: corkscrew: .* factor of 2"):
        plan("light[0].carrier=390 nm", text=text)


def test_charged_sample_is_refused_with_ewald(tmp_path):
    path = rod(tmp_path)
    path.write_text(path.read_text().replace("charge: 0.0 e", "charge: 0.5 e"))
    text = BASE.replace("acetonitrile, count: 108", "rod.yaml, count: 256")
    with pytest.raises(InputError, match="forces.electrostatics: mesh-ewald needs a neutral box"):
        plan(text=text, folder=tmp_path)
    assert plan("forces.electrostatics=reaction-field", text=text, folder=tmp_path)


def test_unknown_site_in_a_pair_is_refused():
    with pytest.raises(InputError, match=r"forces.pairs.*acetonitrile\.Q"):
        plan("forces.pairs=[{between: [acetonitrile.Q, acetonitrile.N], sigma: 0.3 nm,"
             " epsilon: 0.5 kJ/mol}]")


def test_refusals_of_species_files_keep_their_place(tmp_path):
    (tmp_path / "bad.yaml").write_text("name: bad\nsource: invented\nsites: []\n")
    with pytest.raises(ConfigError, match="bad.yaml:3"):
        plan(text=BASE.replace("acetonitrile", "bad.yaml"), folder=tmp_path)


@pytest.mark.parametrize(("change", "place"), [
    (("count: 108", "count: 64"), "6:10: forces.cutoff: the box of"),
    (("acetonitrile", "watter"), r"3:8: sample.species\[0\].use: no species"),
    (("density: 0.777 g/cm^3", "begin_from: run.yaml"), "4:3: sample.begin_from: "),
    (("800 nm", "100 THz\n    coupling: resolved"), r"8:5: light\[0\]: a timestep"),
])
def test_late_refusals_name_file_line_and_key(tmp_path, change, place):
    path = tmp_path / "run.yaml"
    text = BASE.replace("light:\n", "forces: {cutoff: 1 nm}\nlight:\n")
    path.write_text(text.replace(*change))
    with pytest.raises(ConfigError, match=rf"run\.yaml:{place}"):
        check_config(load_config(path))


# --- forms --------------------------------------------------------------------------------


def test_json_form_is_plain_and_complete():
    found = plan()
    content = json.loads(found.to_json())
    assert {"title", "sections", "warnings", "outside_the_model", "laser_caution"} == set(content)
    rows = {(s["title"], r["name"]): r for s in content["sections"] for r in s["rows"]}
    assert rows["light[0]", "intensity"]["value"] == pytest.approx(1e9)
    assert rows["light[0]", "intensity"]["unit"] == "W/cm^2"
    assert rows["config: light", "light[0].duration"] == {
        "name": "light[0].duration", "value": 0.4, "unit": "ps", "note": ""}


def test_text_form():
    found = plan()
    text = str(found)
    for part in found.sections:
        assert f"\n\n{part.title}\n" in text
    for notice in found.warnings:
        assert f"  - {notice.code}: " in text
    assert "IEC 60825-1" in text and "ANSI Z136.1" in text and "no safety assessment" in \
        " ".join(text.split())
    assert "safety officer" in " ".join(text.split())
    for words in ("electrostriction", "vibration", "ionisation", "depletion", "revivals"):
        assert any(words in line for line in OUTSIDE) and words in text
    assert max(map(len, text.splitlines())) <= 100


def test_public_name():
    found = swirlight.check(config())
    assert isinstance(found, Plan) and str(found) == str(plan())


def test_rows_that_are_not_finite_become_null():
    page = Plan("t", (Section("s", (Row("a", float("inf")), Row("b", float("nan")))),), (), False)
    assert [r["value"] for r in json.loads(page.to_json())["sections"][0]["rows"]] == [None, None]


def test_numbers_are_shown_with_four_digits():
    assert str(Row("a", 1.23456789, "nm")) == "1.235 nm"
    assert str(Row("a", 123456789, "steps")) == "123456789 steps"
    assert str(Row("a", 0.1 + 0.2, text="0.3")) == "0.3"


def test_warnings_are_said_once():
    text = BASE.replace("    refractive_index: 1.34\n", "    refractive_index: 1.34\n"
                        "  - {carrier: 800 nm, peak_intensity: 1e9 W/cm^2, duration: 0.4 ps}\n")
    found = plan(text=text)
    assert len(found.warnings) == len(set(found.warnings))
    assert all(isinstance(n, Notice) and n.text for n in found.warnings)


def test_answers_quickly_without_heavy_imports(tmp_path):
    path = tmp_path / "run.yaml"
    path.write_text(BASE)
    code = (
        "import sys\n"
        f"sys.argv = ['swirlight', 'check', {str(path)!r}, '--set', 'light[0].carrier=1 THz']\n"
        "from swirlight.cli.main import run\n"
        "assert run(sys.argv[1:]) == 0\n"
        # pint looks for an installed dask by itself; that costs little
        "heavy = {'numba', 'llvmlite', 'matplotlib', 'distributed', 'dask.array', 'pandas'}\n"
        "found = heavy & set(sys.modules)\n"
        "assert not found, found\n"
    )
    begin = time.monotonic()
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, timeout=60)
    assert done.returncode == 0, done.stderr
    assert "light[0] on acetonitrile" in done.stdout and done.stderr == ""
    # 0.6 s on an idle core; 1.5 s is promised, and test machines are busy
    assert time.monotonic() - begin < 6.0
