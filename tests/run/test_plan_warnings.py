"""Every warning of `check`: what triggers it, and what no longer does.

Each case names a warning, a config in which it is given, and one as near as possible in which
it is not; a last test holds that no warning is left out.
"""

import math
import pathlib
import re

import pytest

import swirlight.run
from swirlight.errors import InputError
from swirlight.run.plan import cost as plan_cost
from tests.run.plans import BASE, DARK, plan, rod, rod_plan, value

CALM = ()  # the base config
THZ = ("light[0].carrier=1 THz", "light[0].duration=2 ps", "stages[1].length=12 ps")
LANGEVIN = "stages[1].thermostat={method: langevin, friction: 2 /ps}"

# warning: (overrides that give it, overrides that do not)
OVERRIDES = {
    "refractive-index": (("light[0].refractive_index=1.0",), CALM),
    "local-field-without-index": (
        ("light[0].refractive_index=1.0", "light[0].local_field=lorentz"),
        ("light[0].local_field=lorentz",),
    ),
    "ionisation": (("light[0].peak_intensity=1e12 W/cm^2",),
                   ("light[0].peak_intensity=9.9e11 W/cm^2",)),
    "pulse-cut": (("light[0].centre=0.5 ps",), ("light[0].centre=1 ps",)),
    "subcycle-pulse": (
        ("light[0].carrier=1 THz", "light[0].duration=0.9 ps"),
        ("light[0].carrier=1 THz", "light[0].duration=1.1 ps"),
    ),
    "quantum-carrier": (
        ("light[0].carrier=6.3 THz", "light[0].duration=1 ps"),  # kT/h is 6.21 THz
        ("light[0].carrier=6.1 THz", "light[0].duration=1 ps"),
    ),
    # 2 fs: 39 and 41 steps
    "steps-per-cycle": (
        ("light[0].carrier=12.8 THz", "light[0].coupling=resolved"),
        ("light[0].carrier=12.2 THz", "light[0].coupling=resolved"),
    ),
    "steps-per-pulse": (("light[0].duration=39 fs",), ("light[0].duration=40 fs",)),
    # half a turn in 20 steps of 2 fs: 78.5 rad/ps
    "steps-per-turn": (("light[0].turning={rate: 79 rad/ps}",),
                       ("light[0].turning={rate: -78 rad/ps}",)),
    "steps-per-rotation": (
        # the fastest thermal rotation of acetonitrile takes 2.835 ps
        ("stages[0].timestep=71 fs", "stages[0].length=7.1 ps", "stages[1].timestep=2 fs",
         "exposures.spacing=7.1 ps", "record.every=142 fs", "record.totals_every=142 fs",
         "stages[1].length=4.26 ps"),
        ("stages[0].timestep=70 fs", "stages[0].length=7 ps", "stages[1].timestep=2 fs",
         "exposures.spacing=7 ps", "record.every=140 fs", "record.totals_every=140 fs",
         "stages[1].length=4.2 ps"),
    ),
    # the fastest thermal rotation of water takes 0.313 ps
    "mesh-every": (
        ("sample.species[0].use=water", "sample.species[0].count=216", "forces.mesh_every=3",
         "sample.density=1 g/cm^3", "forces.cutoff=0.9 nm", "record.every=30 fs",
         "record.totals_every=30 fs", "stages[0].length=12 ps", "stages[1].length=6 ps",
         "exposures.spacing=6 ps"),
        ("sample.species[0].use=water", "sample.species[0].count=216", "forces.mesh_every=2",
         "sample.density=1 g/cm^3", "forces.cutoff=0.9 nm"),
    ),
    "bath-on-rotation": ((LANGEVIN,), (f"{LANGEVIN[:-1]}, acts_on: translation}}",)),
    # four thermal rates of acetonitrile: 1.41 THz, shown by records every 354 fs
    "nyquist-rotation": (("record.every=356 fs",), ("record.every=352 fs",)),
    "nyquist-carrier": ((*THZ, "record.totals_every=252 fs"),
                        (*THZ, "record.totals_every=250 fs")),
    "one-start": (("exposures.starts=1",), ("exposures.starts=2",)),
    "no-twin": (("exposures.kinds=[plus, dark]",), ("exposures.kinds=[plus, minus]",)),
    "applied-field": ((*THZ, "forces.electrostatics=reaction-field"), THZ),
    # acetonitrile has neither absorption nor gyration
    "no-odd-part": (CALM, ("light[0].turning={rate: 1 rad/ps}",)),
    "dipole-in-averaged-light": (CALM, THZ),
}


@pytest.mark.parametrize("code", OVERRIDES)
def test_given_and_not_given(code):
    given, not_given = OVERRIDES[code]
    assert code in plan(*given).codes
    assert code not in plan(*not_given).codes


ANISOTROPIC = "  at: 800 nm\n  polarizability: {principal: 4 4 6 angstrom^3}\n"
ABSORBING = ANISOTROPIC + "  absorptive_polarizability: {principal: 0.02 0.02 0.02 angstrom^3}\n"

# warning: (light response of a rod, overrides) that gives it, and one that does not
RESPONSES = {
    "no-light-response": (("", CALM), (ANISOTROPIC, CALM)),
    "response-wavelength": ((ANISOTROPIC, ("light[0].carrier=900 nm",)),
                            (ANISOTROPIC, ("light[0].carrier=870 nm",))),
    # 1e12 W/cm² absorbs 0.025 photons
    "photons-absorbed": ((ABSORBING, ("light[0].peak_intensity=4.1e12 W/cm^2",)),
                         (ABSORBING, ("light[0].peak_intensity=3.8e12 W/cm^2",))),
    "few-excited": ((ABSORBING, ("light[0].peak_intensity=1e11 W/cm^2",)), (ANISOTROPIC, CALM)),
    "heating": ((ABSORBING, ("light[0].peak_intensity=1e12 W/cm^2",)),
                (ABSORBING, ("light[0].peak_intensity=1e9 W/cm^2",))),
    "rectification-without-absorption": (
        (ANISOTROPIC + "  symmetry: ignore\n  rectification: {principal: 1e-50 1e-50 2e-50"
         " C m^3/V^2}\n", CALM),
        (ABSORBING + "  symmetry: ignore\n  rectification: {principal: 1e-50 1e-50 2e-50"
         " C m^3/V^2}\n", CALM),
    ),
}


@pytest.mark.parametrize("code", RESPONSES)
def test_given_by_the_response(code, tmp_path):
    (response, overrides), (calm, fewer) = RESPONSES[code]
    assert code in rod_plan(tmp_path, *overrides, response=response).codes
    assert code not in rod_plan(tmp_path, *fewer, response=calm).codes


@pytest.mark.parametrize(("duration", "figure"), [
    ("0.4 ps", "alignment impulse"),  # the rod turns in 1.8 ps
    ("20 ps", "alignment well"),
])
def test_beyond_linear_response(duration, figure, tmp_path):
    long = (f"light[0].duration={duration}", "stages[1].length=100 ps")
    at = rod_plan(tmp_path, *long, response=ANISOTROPIC)
    limit = 0.3e9 / value(at, figure)  # W/cm²
    above = rod_plan(tmp_path, *long, f"light[0].peak_intensity={1.01 * limit:.6g} W/cm^2",
                     response=ANISOTROPIC)
    below = rod_plan(tmp_path, *long, f"light[0].peak_intensity={0.99 * limit:.6g} W/cm^2",
                     response=ANISOTROPIC)
    (notice,) = [n for n in above.warnings if n.code == "beyond-linear-response"]
    assert f"{figure} is 0.303" in notice.text
    assert "beyond-linear-response" not in below.codes


GYRATING = "  gyration: 0 0 0.01 angstrom^3\n  symmetry: ignore\n"


def test_one_signed_gyration(tmp_path):
    assert "one-signed-gyration" in rod_plan(tmp_path, response=GYRATING).codes
    rod(tmp_path, GYRATING, name="left")
    rod(tmp_path, GYRATING.replace("0.01", "-0.01"), name="right")
    text = BASE.replace("- {use: acetonitrile, count: 108}",
                        "- {use: left.yaml, count: 128}\n    - {use: right.yaml, count: 128}")
    assert "one-signed-gyration" not in plan(text=text, folder=tmp_path).codes
    text = text.replace("use: right.yaml, count: 128", "use: right.yaml, count: 127")
    assert "one-signed-gyration" in plan(text=text, folder=tmp_path).codes


@pytest.mark.parametrize(("response", "overrides", "same"), [
    (ANISOTROPIC, CALM, True),
    (ABSORBING, CALM, False),
    (GYRATING, CALM, False),
    (ABSORBING, ("light[0].ellipticity=0 deg",), True),  # linear: G = 0
    (ABSORBING, ("light[0].ellipticity=0 deg", "light[0].turning={rate: 1 rad/ps}"), False),
])
def test_whether_there_is_an_odd_part(response, overrides, same, tmp_path):
    found = rod_plan(tmp_path, *overrides, response=response)
    assert ("no-odd-part" in found.codes) is same


def test_rectification_has_an_odd_part_in_a_bias_field(tmp_path):
    response = RESPONSES["rectification-without-absorption"][0][0]
    bias = "bias_field={vector: 0 0 1e7 V/m}"
    assert "no-odd-part" in rod_plan(tmp_path, response=response).codes
    assert "no-odd-part" not in rod_plan(tmp_path, bias, response=response).codes


def test_quantum_rotation():
    water = BASE.replace("acetonitrile, count: 108", "water, count: 300").replace("0.777", "0.997")
    assert "quantum-rotation" in plan(text=water).codes
    assert "quantum-rotation" not in plan().codes


def test_only_atoms():
    argon = DARK.replace("acetonitrile", "argon").replace("0.777", "1.4").replace("108", "256")
    assert "only-atoms" in plan(text=argon).codes
    assert "only-atoms" not in plan(text=DARK).codes


def test_nyquist_of_a_beat():
    second = "  - {carrier: 380.74 THz, peak_intensity: 1e9 W/cm^2, duration: 0.4 ps}\n"
    text = BASE.replace("    refractive_index: 1.34\n", "    refractive_index: 1.34\n" + second)
    # 6 THz apart: shown by records every 83 fs
    assert "nyquist-beat" in plan("record.every=84 fs", text=text).codes
    assert "nyquist-beat" not in plan("record.every=82 fs", text=text).codes


def test_applied_field_of_a_bias_with_damped_shifted():
    bias = "bias_field={vector: 0 0 1e7 V/m}"
    assert "applied-field" in plan(bias, "forces.electrostatics=damped-shifted").codes
    assert "applied-field" not in plan(bias, "forces.electrostatics=direct-ewald").codes
    assert "applied-field" not in plan("forces.electrostatics=damped-shifted").codes


def test_disk_and_memory(monkeypatch):
    assert not {"disk-space", "memory"} & set(plan().codes)
    monkeypatch.setattr(plan_cost, "free_bytes", lambda output: 1e6)
    monkeypatch.setattr(plan_cost, "installed_bytes", lambda: 1e8)
    assert {"disk-space", "memory"} <= set(plan().codes)
    monkeypatch.setattr(plan_cost, "free_bytes", lambda output: None)
    monkeypatch.setattr(plan_cost, "installed_bytes", lambda: None)
    assert not {"disk-space", "memory"} & set(plan().codes)


def test_pulse_cut_names_what_would_do():
    found = plan("light[0].centre=0.5 ps")
    (notice,) = [n for n in found.warnings if n.code == "pulse-cut"]
    centre, length = re.search(r"at least ([\d.]+) ps.*at least ([\d.]+) ps", notice.text).groups()
    steps = math.ceil(float(length) / 0.002)
    fitting = ("record.every=2 fs", "record.totals_every=2 fs", f"light[0].centre={centre} ps")
    assert "pulse-cut" not in plan(*fitting, f"stages[1].length={2 * steps} fs").codes
    assert "pulse-cut" in plan(*fitting, f"stages[1].length={2 * steps - 4} fs").codes


def test_the_longest_timestep_named_is_accepted():
    short = ("light[0].carrier=1 THz", "stages[0].length=12 ps", "stages[1].length=6 ps")
    with pytest.raises(InputError) as refused:
        plan(*short, "stages[0].timestep=60 fs", "record.every=60 fs", "record.totals_every=60 fs",
             "exposures.spacing=6 ps")
    longest = re.search(r"longest timestep is (\d+ fs)", str(refused.value)).group(1)
    found = plan(*short, f"stages[0].timestep={longest}", f"record.every={longest}",
                 f"record.totals_every={longest}", "exposures.spacing=6 ps")
    assert "steps-per-cycle" in found.codes


def test_a_dark_config_is_calm():
    assert plan(text=DARK).codes == []


def test_no_warning_is_left_out():
    folder = pathlib.Path(swirlight.run.__file__).parent
    source = "".join(p.read_text() for p in folder.glob("plan/*.py"))
    codes = set(re.findall(r'Notice\(\s*"([a-z-]+)"', source))
    codes |= set(re.findall(r'\("(nyquist-[a-z]+)"', source))
    codes |= set(re.findall(r'^    "([a-z-]+)": "[a-z ]+",$', source, re.M))
    tests = pathlib.Path(__file__).read_text()
    assert len(codes) > 25
    assert not [code for code in codes if f'"{code}"' not in tests]
