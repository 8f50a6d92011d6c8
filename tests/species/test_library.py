"""Finding species, and what `swirlight species` says about them."""

import json
import subprocess
import sys

import numpy as np
import pytest
import typer
from typer.testing import CliRunner

from swirlight.cli.species import species as command
from swirlight.errors import ConfigError, InputError
from swirlight.species.describe import describe, rotational_constants, species_text
from swirlight.species.library import library_names, load_species
from swirlight.species.picture import draw_species

NAMES = ("acetonitrile", "argon", "carbon-dioxide", "carbon-disulfide", "chloroform", "corkscrew",
         "nitrogen", "water")
GROUPS = {"acetonitrile": "C∞v", "argon": "Kh", "carbon-dioxide": "D∞h", "carbon-disulfide": "D∞h",
          "chloroform": "C3v", "corkscrew": "C1", "nitrogen": "D∞h", "water": "C2v"}
ROD = """\
name: rod
source: invented for this test
sites:
  - {label: A, mass: 12 u, at: 0 0 0 nm}
  - {label: B, mass: 16 u, at: 0 0 0.12 nm}
"""


def run(*arguments):
    app = typer.Typer()
    app.command()(command)
    result = CliRunner().invoke(app, arguments)
    if result.exception and not isinstance(result.exception, SystemExit):
        raise result.exception
    return result.stdout


def test_the_library_is_complete():
    assert library_names() == NAMES


@pytest.mark.parametrize("name", NAMES)
def test_every_entry_says_what_it_is(name):
    found = load_species(name)
    assert found.name == name and found.source and found.liquid.source
    assert found.total_charge == pytest.approx(0.0, abs=1e-12)
    assert found.responses and all(r.source for r in found.responses)
    assert describe(found)["symmetry"]["group"] == GROUPS[name]
    if found.heat_capacity is not None:
        assert found.heat_capacity_source
    assert found.notes == ()


def test_only_the_invented_body_absorbs_and_it_says_so():
    for name in NAMES:
        absorbs = any(r.absorptive.any() or r.gyration.any() for r in load_species(name).responses)
        assert absorbs == ("invented" in load_species(name).source) == (name == "corkscrew")
    (response,) = load_species("corkscrew").responses
    assert np.linalg.eigvalsh(response.absorptive)[0] > 0
    assert response.gyration.any() and np.trace(response.rectification) > 0
    assert np.linalg.norm(load_species("corkscrew").dipole) > 0


def test_whoever_changes_a_body_changes_only_their_own():
    load_species("water").responses[0].polarizability[:] = 0.0
    assert load_species("water").responses[0].polarizability.any()


def test_unknown_names_are_answered_with_the_nearest_and_the_list():
    with pytest.raises(InputError, match='"acetonitril".*did you mean "acetonitrile".*argon,.*'
                                         "water.*path"):
        load_species("acetonitril")
    with pytest.raises(InputError, match='"Water".*did you mean "water"'):
        load_species("Water")
    with pytest.raises(InputError) as refused:
        load_species("zzz")
    assert "did you mean" not in str(refused.value)


def test_files_are_found_relative_to_the_folder_given(tmp_path, monkeypatch):
    (tmp_path / "mine").mkdir()
    (tmp_path / "mine" / "rod.yaml").write_text(ROD)
    assert load_species("mine/rod.yaml", tmp_path).name == "rod"
    assert load_species("rod.yaml", tmp_path / "mine").name == "rod"
    assert load_species(tmp_path / "mine" / "rod.yaml").name == "rod"
    monkeypatch.chdir(tmp_path)
    assert load_species("mine/rod.yaml").name == "rod"
    with pytest.raises(InputError, match="rod.yaml.*cannot be read"):
        load_species("rod.yaml")
    (tmp_path / "bad.yaml").write_text(ROD.replace("mass", "maas"))
    with pytest.raises(ConfigError, match=r'bad.yaml:4:16: sites\[0\].maas.*did you mean "mass"'):
        load_species("bad.yaml")


def test_listing_the_library():
    text = run()
    assert [line.split()[0] for line in text.splitlines()[1:]] == list(NAMES)
    assert [entry["name"] for entry in json.loads(run("--json"))] == list(NAMES)


def test_one_body_as_text():
    text = run("water")
    assert "general body, 3 sites, symmetry C2v" in text
    assert "0 2.35054 0 D" in text
    assert "allows xz, zx; forbids xx, xy, yx, yy, yz, zy, zz" in text
    assert "74.54 J/mol/K" in text and "0.99705 g/cm^3 at 298.15 K" in text
    assert "Berendsen, Grigera & Straatsma" in text
    assert max(len(line) for line in text.splitlines()) <= 95
    assert "the body does not see averaged light" not in text


def test_one_body_as_json_says_the_same_as_the_body():
    body, told = load_species("corkscrew"), json.loads(run("corkscrew", "--json"))
    np.testing.assert_allclose([s["position_nm"] for s in told["sites"]], body.sites, atol=1e-9)
    np.testing.assert_allclose(told["frame"], body.frame, atol=1e-11)
    np.testing.assert_allclose(told["inertia_u_nm2"], body.inertia, rtol=1e-11)
    (response,) = told["light_response"]
    assert response["at_nm"] == pytest.approx(800.0)
    kappa = response["rectification"]
    assert kappa["unit"] == "C m^3/V^2"
    assert np.trace(kappa["value"]) == pytest.approx(6e-50)  # a trace survives turning
    assert np.trace(response["polarizability"]["value"]) == pytest.approx(19.4)
    assert told["heat_capacity"] is None


def test_a_body_without_light_response_says_what_follows(tmp_path):
    (tmp_path / "rod.yaml").write_text(ROD)
    text = species_text(load_species("rod.yaml", tmp_path))
    assert "the body does not see averaged light" in text
    assert "upper bound" in " ".join(text.split())
    assert describe(load_species("rod.yaml", tmp_path))["rotational_constants_per_cm"][2] is None


@pytest.mark.parametrize("name", ["corkscrew", "argon", "carbon-dioxide"])
def test_pictures(name, tmp_path):
    draw_species(load_species(name), tmp_path / "body.png")
    image = (tmp_path / "body.png").read_bytes()
    assert image.startswith(b"\x89PNG") and len(image) > 10_000


def test_pictures_need_a_body_and_a_known_suffix(tmp_path):
    with pytest.raises(InputError, match="--picture needs a species"):
        run("--picture", str(tmp_path / "a.png"))
    with pytest.raises(InputError, match="ends in .png"):
        run("water", "--picture", str(tmp_path / "a.exe"))
    with pytest.raises(InputError, match="no folder"):
        run("water", "--picture", str(tmp_path / "nowhere" / "a.png"))
    assert not list(tmp_path.iterdir())


def test_rotational_constants_of_a_linear_body():
    """B0 = 0.39021 1/cm of CO2 and 43.20 u Å² belong together (both from memory)."""
    constants = rotational_constants([0.4320, 0.4320, 0.0])
    np.testing.assert_allclose(constants[:2], 0.39021, rtol=2e-4)
    assert np.isinf(constants[2])


def test_loading_a_species_imports_neither_compiler_nor_plotting():
    code = ("import sys, swirlight.species.library as s; s.load_species('water');"
            "print([m for m in ('numba', 'matplotlib', 'h5py') if m in sys.modules])")
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, timeout=60)
    assert done.stdout.strip() == "[]", done.stderr
