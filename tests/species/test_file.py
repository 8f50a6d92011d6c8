"""Species files: what they may say, in which units, and how faults are told."""

import jsonschema
import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from swirlight import units
from swirlight.config.reader import read_text
from swirlight.errors import ConfigError
from swirlight.species.body import ATOM, GENERAL, LINEAR
from swirlight.species.file import read_species, species_schema

TOP = """\
name: leaning top (invented)
source: invented for demonstration
mixing: lorentz-berthelot
sites:
  - {label: A, mass: 14.0 u, at: 0 0 0 nm, charge: 0.20 e, sigma: 0.34 nm, epsilon: 0.40 kJ/mol}
  - {label: B, mass: 16.0 u, at: 0.11 0.01 -0.02 nm, charge: -0.35 e, sigma: 0.30 nm, epsilon: 0.55 kJ/mol}
  - {label: C, mass: 19.0 u, at: -0.03 0.12 0.04 nm, charge: 0.05 e, sigma: 0.29 nm, epsilon: 0.25 kJ/mol}
  - {label: D, mass: 12.0 u, at: -0.05 -0.07 0.13 nm, charge: 0.10 e, sigma: 0.36 nm, epsilon: 0.80 kJ/mol}
light_response:
  at: 800 nm
  polarizability: {matrix: [4.0 0.2 0 angstrom^3, 0.2 5.5 0.1 angstrom^3, 0 0.1 4.8 angstrom^3]}
  absorptive_polarizability: {principal: 0.02 0.02 0.02 angstrom^3}
  gyration: 0.01 0 0.02 angstrom^3
  rectification: {matrix: [1e-50 0 0 C m^3/V^2, 0 0 0 C m^3/V^2, 0 0 0 C m^3/V^2]}
  symmetry: checked
heat_capacity: {value: 75.3 J/mol/K, source: "made up"}
"""  # noqa: E501

ROD = """\
name: rod
source: invented for this test
sites:
  - {label: A, mass: 12 u, at: 0 0 0 nm}
  - {label: B, mass: 16 u, at: 0 0 0.12 nm}
light_response: RESPONSE
"""


def species(text):
    return read_species(read_text(text, "some.yaml"))


def rod(response):
    return species(ROD.replace("RESPONSE", response))


def test_a_file_with_everything():
    top = species(TOP)
    assert (top.name, top.freedom, top.labels) == ("leaning top (invented)", GENERAL,
                                                   ("A", "B", "C", "D"))
    assert top.total_mass == pytest.approx(61.0)
    assert top.total_charge == pytest.approx(0.0, abs=1e-15)
    np.testing.assert_allclose(top.epsilon, units.KJ_PER_MOL * np.array([0.4, 0.55, 0.25, 0.8]))
    assert top.heat_capacity == pytest.approx(75.3e-3 * units.KJ_PER_MOL)
    assert top.heat_capacity_source == "made up"
    (response,) = top.responses
    assert response.at == pytest.approx(2 * np.pi * units.LIGHT_SPEED / 800)
    # Every tensor is turned from the frame of the file into that of the body, R T Rᵀ and R g.
    turn = top.frame
    given = np.array([[4.0, 0.2, 0], [0.2, 5.5, 0.1], [0, 0.1, 4.8]]) * units.CUBIC_ANGSTROM
    np.testing.assert_allclose(response.polarizability, turn @ given @ turn.T, rtol=1e-9)
    np.testing.assert_allclose(response.absorptive, 0.02 * units.CUBIC_ANGSTROM * np.eye(3),
                               rtol=1e-9)
    np.testing.assert_allclose(response.gyration,
                               turn @ [0.01, 0, 0.02] * units.CUBIC_ANGSTROM, rtol=1e-9)
    kappa = 1e-50 * units.COULOMB_METRE / units.VOLT_PER_METRE**2
    np.testing.assert_allclose(response.rectification, kappa * np.outer(turn[:, 0], turn[:, 0]),
                               rtol=1e-9)


def test_the_body_does_not_depend_on_the_frame_of_the_file():
    """Sites and tensors turned together describe the same body."""
    turn = np.array([[0.36, 0.48, -0.8], [-0.8, 0.6, 0.0], [0.48, 0.64, 0.6]])  # proper, exact
    sites = np.array([[0, 0, 0], [0.11, 0.01, -0.02], [-0.03, 0.12, 0.04], [-0.05, -0.07, 0.13]])
    alpha = np.array([[4.0, 0.2, 0], [0.2, 5.5, 0.1], [0, 0.1, 4.8]])
    kappa = np.diag([1e-50, 0, 0])
    turned = TOP

    def row(values, unit):
        return " ".join(f"{v:.15g}" for v in values) + f" {unit}"

    def matrix(values, unit):
        return "[" + ", ".join(row(v, unit) for v in values) + "]"

    for site, old in zip(sites, ("0 0 0 nm", "0.11 0.01 -0.02 nm", "-0.03 0.12 0.04 nm",
                                 "-0.05 -0.07 0.13 nm"), strict=True):
        turned = turned.replace(f"at: {old}", f"at: {row(turn @ site + [1, 2, 3], 'nm')}")
    turned = turned.replace("[4.0 0.2 0 angstrom^3, 0.2 5.5 0.1 angstrom^3, 0 0.1 4.8 angstrom^3]",
                            matrix(turn @ alpha @ turn.T, "angstrom^3"))
    turned = turned.replace("gyration: 0.01 0 0.02 angstrom^3",
                            f"gyration: {row(turn @ [0.01, 0, 0.02], 'angstrom^3')}")
    turned = turned.replace("[1e-50 0 0 C m^3/V^2, 0 0 0 C m^3/V^2, 0 0 0 C m^3/V^2]",
                            matrix(turn @ kappa @ turn.T, "C m^3/V^2"))
    assert turned != TOP
    first, other = species(TOP), species(turned)
    np.testing.assert_allclose(other.sites, first.sites, atol=1e-13)
    np.testing.assert_allclose(other.frame @ turn, first.frame, atol=1e-12)
    for name in ("polarizability", "absorptive", "gyration", "rectification"):
        a, b = getattr(first.responses[0], name), getattr(other.responses[0], name)
        np.testing.assert_allclose(b, a, atol=1e-11 * np.abs(a).max())


@pytest.mark.parametrize("text, ratio", [
    ("4 4 6 angstrom^3", 1.0),
    ("0.004 0.004 0.006 nm^3", 1.0),
    ("4 4 6 bohr^3", 0.1481847112),            # OPT: 1 a.u. in Å³, CODATA 2022
    ("4e-40 4e-40 6e-40 C m^2/V", 1 / 1.1126500562),
])  # fmt: skip
def test_units_of_polarizability(text, ratio):
    alpha = rod(f"{{polarizability: {{principal: {text}}}}}").responses[0].polarizability
    np.testing.assert_allclose(alpha, ratio * units.CUBIC_ANGSTROM * np.diag([4, 4, 6]), rtol=1e-9)


def test_epsilon_in_kelvin_and_calories():
    text = TOP.replace("epsilon: 0.40 kJ/mol", "epsilon: 120 K").replace(
        "epsilon: 0.55 kJ/mol", "epsilon: 0.2 kcal/mol")
    found = species(text).epsilon
    np.testing.assert_allclose(found[:2], [120 * units.BOLTZMANN, 0.8368 * units.KJ_PER_MOL])


def test_sites_may_be_mass_only_or_charge_only():
    body = species("""\
name: four-site
source: invented for this test
sites:
  - {label: O, mass: 16 u, at: 0 0 0 nm, sigma: 0.3 nm, epsilon: 0.6 kJ/mol}
  - {label: H, mass: 1 u, at: 0.08 0.06 0 nm, charge: 0.5 e}
  - {label: H, mass: 1 u, at: -0.08 0.06 0 nm, charge: 0.5 e}
  - {label: M, at: 0 0.015 0 nm, charge: -1 e}
  - {label: X, mass: 2 u, at: 0 0.02 0 nm, sigma: 0 nm, epsilon: 0 kJ/mol}
""")
    assert list(body.mass) == [16, 1, 1, 0, 2]
    assert list(body.epsilon > 0) == [True, False, False, False, False]
    assert body.responses == () and body.heat_capacity is None


def test_atoms_and_linear_bodies():
    assert rod("{polarizability: {principal: 4 4 6 angstrom^3}}").freedom == LINEAR
    atom = species("name: a\nsource: s\nsites: [{label: A, mass: 4 u, at: 1 1 1 nm}]\n")
    assert atom.freedom == ATOM and (atom.sites == 0).all()


def test_several_wavelengths():
    found = rod("[{at: 800 nm, gyration: 0 0 1 angstrom^3}, {at: 400 nm}]").responses
    assert [round(2 * np.pi * units.LIGHT_SPEED / r.at) for r in found] == [800, 400]
    assert found[1].gyration.any() == 0
    for second in ("{gyration: 0 0 1 angstrom^3}", "{at: 0.8 um}"):
        with pytest.raises(ConfigError, match=r"some.yaml:6:.*light_response\[1\].at: "):
            rod(f"[{{at: 800 nm}}, {second}]")


def test_forbidden_parts_name_the_place_and_can_be_kept():
    swirl = "{matrix: [1e-50 0 0 C m^3/V^2, 0 1e-50 0 C m^3/V^2, 0 0 0 C m^3/V^2]}"
    with pytest.raises(ConfigError) as refused:
        rod(f"{{rectification: {swirl}}}")
    assert str(refused.value).startswith(
        "some.yaml:6:18: light_response.rectification: component xx, yy is forbidden by the "
        "symmetry C∞v of the sites; in the body frame it may have: xy = -yx ")
    kept = rod(f"{{rectification: {swirl}, symmetry: ignore}}")
    assert kept.responses[0].rectification[0, 0] > 0
    assert "C∞v forbids it" in kept.notes[0]


@pytest.mark.parametrize("response, message", [
    ("{polarizability: {principal: 4 5 6 angstrom^3}, symmetry: ignore}",
     "light_response.polarizability: component xx, yy has no meaning on a linear body"),
    ("{absorptive_polarizability: {principal: 1 1 -1 angstrom^3}}",
     "light_response.absorptive_polarizability: a principal value is negative"),
    ("{gyration: 1 0 0 angstrom^3}", "light_response.gyration: component x has no meaning"),
    ("{polarizability: {matrix: [4 1 0 angstrom^3, 0 4 0 angstrom^3, 0 0 6 angstrom^3]}}",
     "light_response.polarizability.matrix: is not symmetric"),
    ("{polarizability: {}}", "light_response.polarizability: needs either matrix or principal"),
    ("{polarizability: {principal: 4 4 6 angstrom^2}}", "light_response.polarizability.principal:"),
    ("{polarisability: {principal: 4 4 6 angstrom^3}}",
     'light_response.polarisability: unknown key (did you mean "polarizability"?)'),
    ("{symmetry: ignored}", "light_response.symmetry:"),
    ("[{symmetry: ignored}]", "light_response[0].symmetry:"),
    ("{at: 800}", "light_response.at:"),
])  # fmt: skip
def test_refused_responses(response, message):
    with pytest.raises(ConfigError) as refused:
        rod(response)
    assert "some.yaml:6:" in str(refused.value) and message in str(refused.value)


@pytest.mark.parametrize("old, new, place, message", [
    ("source: invented", "sauce: invented", "2:1: sauce", "unknown key"),
    ("mixing: lorentz-berthelot", "mixing: arithmetic", "3:1: mixing", "lorentz-berthelot"),
    ("mass: 14.0 u", "mass: 14.0", "5:16: sites[0].mass", "unit"),
    ("mass: 14.0 u", "mass: -14.0 u", "5:16: sites[0].mass", "0 u"),
    ("at: 0 0 0 nm", "at: 0 0 nm", "5:30: sites[0].at", "three"),
    ("at: 0 0 0 nm", "at: 0 0 0 ps", "5:30: sites[0].at", "length"),
    (", epsilon: 0.40 kJ/mol", "", "5:5: sites[0]", "missing epsilon"),
    ("sigma: 0.34 nm", "sigma: 0 nm", "sites[0].sigma", "is 0 although epsilon is not"),
    ("label: A", "label: A.1", "5:6: sites[0].label", "point"),
    ("name: leaning top (invented)", "name: a/b", "1:1: name", "slash"),
    ("name: leaning top (invented)", "name: no", "", ""),
    ("name: leaning top (invented)", "name: true", "1:1: name", "text"),
    ('source: "made up"', "sources: x", "heat_capacity", "source"),
])  # fmt: skip
def test_broken_files_name_file_line_and_key(old, new, place, message):
    assert old in TOP
    text = TOP.replace(old, new, 1)
    if not place:
        assert species(text).name == "no"  # plain text, as in YAML 1.2
        return
    with pytest.raises(ConfigError) as refused:
        species(text)
    assert "some.yaml:" in str(refused.value)
    assert place in str(refused.value) and message in str(refused.value)


def test_bodies_that_cannot_move_are_told_apart_from_typing_errors():
    text = TOP
    for mass in ("14.0", "16.0", "19.0", "12.0"):
        text = text.replace(f"mass: {mass} u, ", "")
    with pytest.raises(ConfigError, match="some.yaml:4:1: sites: no site has a mass"):
        species(text)
    with pytest.raises(ConfigError, match="sites: a list of 0; expected 1 to"):
        species("name: a\nsource: b\nsites: []\n")


def test_the_schema_accepts_what_the_loader_accepts():
    schema = species_schema()
    jsonschema.Draft202012Validator.check_schema(schema)
    validator = jsonschema.Draft202012Validator(schema)
    for text in (TOP, ROD.replace("RESPONSE", "[{at: 800 nm}, {at: 400 nm}]")):
        validator.validate(read_text(text, "x").tree)
    for text in (TOP.replace("source: invented", "sauce: invented"), TOP.replace("14.0 u", "14.0"),
                 TOP.replace("symmetry: checked", "symmetry: maybe")):
        assert not validator.is_valid(read_text(text, "x").tree)


WORDS = st.sampled_from(["0", "-1", "1e30 u", "0 0 0 nm", "null", "[]", "{}", "[1, 2]", "true", "C",
                         "1e-9 nm", "nan u", "'", "{", ":", "0 u", "1 angstrom^3", "x" * 300])


@settings(max_examples=150, deadline=None, derandomize=True)
@given(st.data())
def test_mutated_files_are_read_or_refused_but_never_fail_otherwise(data):
    parts = TOP.replace("{", " { ").replace("}", " } ").replace(", ", " , ").split(" ")
    for _ in range(data.draw(st.integers(1, 4))):
        place = data.draw(st.integers(0, len(parts) - 1))
        parts[place] = data.draw(WORDS)
    try:
        body = species(" ".join(parts))
    except ConfigError as refused:
        assert all(line.startswith("some.yaml:") for line in refused.lines)
    else:
        assert np.isfinite(body.inertia).all() and np.isfinite(body.sites).all()
