"""Broken configs: every message names the place, the key, and what to write instead.

In each case « stands where the message must point.
"""

import re

import pytest

from swirlight.config import parse_config
from swirlight.errors import ConfigError
from tests.config.good import GOOD

# name: (text of the good config, what replaces it, key, words of the message)
BROKEN = {
    "misspelt key": (
        "  density:", "  «densty:", "sample.densty", ["unknown key", '"density"']),
    "key of another section": (
        "record:\n", "record:\n  «timestep: 2 fs\n", "record.timestep",
        ["unknown key", "stages[0].timestep", "another section"]),
    "key of an inner section": (
        "    phase: 0 deg", "    «rate: 1 rad/ps", "light[0].rate",
        ["light[0].turning.rate", "another section"]),
    "key nobody knows": (
        "seed: 41", "«zzz: 41", "zzz", ["unknown key; expected one of title, seed"]),
    "duplicate key": (
        "seed: 41", "seed: 41\n«seed: 42", "seed", ["duplicate key", "line 2"]),
    "misspelt unit": (
        "    «duration: 1.0 ps", "    «duration: 1.0 pS", "light[0].duration",
        ['"1.0 pS"', 'unknown unit "pS"', 'did you mean "ps"', '"120 fs"']),
    "wrong dimension": (
        "    «duration: 1.0 ps", "    «duration: 1.0 nm", "light[0].duration",
        ['"1.0 nm"', "not the unit of a time", '"120 fs"']),
    "no unit": (
        "  «temperature: 298.15 K", "  «temperature: 298.15", "sample.temperature",
        ["298.15 has no unit", '"298.15 K"']),
    "quoted number without unit": (
        "  «temperature: 298.15 K", '  «temperature: "298.15"', "sample.temperature",
        ["has no unit"]),
    "degrees Celsius": (
        "  «temperature: 298.15 K", "  «temperature: 25 degC", "sample.temperature",
        ["temperatures are in K"]),
    "comma in a quantity": (
        "  «density: 0.777 g/cm^3", "  «density: 0,777 g/cm^3", "sample.density",
        ["comma", "decimal point"]),
    "expression instead of a quantity": (
        "  «density: 0.777 g/cm^3", "  «density: 9**9**9 g/cm^3", "sample.density",
        ["no number with a unit"]),
    "a prefix of the wrong case": (
        "    «duration: 1.0 ps", "    «duration: 1.0 Ps", "light[0].duration",
        ["out of range", "at most 1 us"]),
    "negative duration": (
        "    «duration: 1.0 ps", "    «duration: -1.0 ps", "light[0].duration", ["out of range"]),
    "missing required key": (
        "«  temperature: 298.15 K\n", "", "sample.temperature", ["missing", '"298.15 K"']),
    "required key left empty": (
        "  temperature: 298.15 K", "  temperature:", "sample.temperature", ["missing"]),
    "missing section": (
        GOOD[GOOD.index("stages:") : GOOD.index("exposures:")], "", "stages",
        ["missing", "a list"]),
    "wrong word": (
        "    «envelope: gaussian", "    «envelope: gausian", "light[0].envelope",
        ['"gausian"', 'did you mean "gaussian"', "rectangle"]),
    "word of a later release": (
        "  «arrangement: lattice", "  «arrangement: random", "sample.arrangement",
        ['"random"', "expected lattice"]),
    "text where a number belongs": (
        "  «tolerance: 1e-4", "  «tolerance: tight", "forces.tolerance", ['"tight"', "0.0001"]),
    "number out of range": (
        "    «refractive_index: 1.0", "    «refractive_index: 133", "light[0].refractive_index",
        ["133 is out of range", "from 0.1 to 10"]),
    "fraction where a count belongs": (
        "count: 256", "«count: 25.6", "sample.species[0].count", ["25.6", "whole number"]),
    "zero bodies": (
        "count: 256", "«count: 0", "sample.species[0].count", ["0 is out of range"]),
    "helicity of two": (
        "    «helicity: 1", "    «helicity: 2", "light[0].helicity", ["2", "1 or -1"]),
    "helicity and ellipticity": (
        "    helicity: 1\n", "    helicity: 1\n    «ellipticity: 45 deg\n", "light[0].ellipticity",
        ["helicity is given too"]),
    "two strengths": (
        "    fluence: 20 mJ/cm^2\n", "    fluence: 20 mJ/cm^2\n    peak_field: 1e8 V/m\n",
        "light[1].fluence", ["peak_field is given too", "only one of"]),
    "no strength": (
        "«    fluence: 20 mJ/cm^2\n", "", "light[1]", ["none of peak_intensity, peak_field"]),
    "flat top without rise": (
        "    rise: 50 fs\n", "", "light[1].rise", ["flat-top", "rise: 0.2 ps"]),
    "rise longer than the pulse": (
        "    «rise: 50 fs", "    «rise: 500 fs", "light[1].rise", ["longer than the duration"]),
    "no light table": (
        "    envelope: flat-top\n    rise: 50 fs",
        "    envelope: table\n    «file: no-such-file.csv", "light[1].file",
        ['"no-such-file.csv" is no file']),
    "direction zero": (
        "    «direction: [0, 1, 1]", "    «direction: [0, 0, 0]", "light[1].direction",
        ["no direction", "[0, 1, 1]"]),
    "two numbers for a vector": (
        "«vector: 0 0 1e7 V/m", "«vector: 0 1e7 V/m", "bias_field.vector",
        ["2 numbers instead of three", '"0 0 1e7 V/m"']),
    "bias ends before it begins": (
        "«to: 5 ps", "«to: 0 ps", "bias_field.to", ["not after from"]),
    "bias without an end": (
        "bias_field: {vector: 0 0 1e7 V/m, from: 0 ps, to: 5 ps}",
        "«bias_field: {vector: 0 0 1e7 V/m, from: 0 ps}", "bias_field.to",
        ["missing", "from is given"]),
    "two boxes": (
        "  density: 0.777 g/cm^3", "  density: 0.777 g/cm^3\n  «edges: 3 3 3 nm",
        "sample.edges", ["density is given too"]),
    "no box": (
        "«  density: 0.777 g/cm^3\n", "", "sample", ["none of density, edges, begin_from"]),
    "no such start file": (
        "  «density: 0.777 g/cm^3", "  «begin_from: starts/000.h5", "sample.begin_from",
        ['"starts/000.h5" is no file']),
    "species listed twice": (
        "{use: water,", "{«use: acetonitrile,", "sample.species[1].use", ["listed twice"]),
    "override of an absent species": (
        "between: [«water.O", "between: [«methanol.O", "forces.pairs[0].between[0]",
        ["methanol is not in the sample", "acetonitrile or water"]),
    "no first timestep": (
        "    timestep: 2 fs\n", "", "stages[0].timestep", ["missing", '"2 fs"']),
    "length no whole multiple": (
        "    «length: 40 ps", "    «length: 40.001 ps", "stages[0].length",
        ["no whole multiple", "equilibrate", "0.002 ps", '"40 ps"']),
    "stride no whole multiple": (
        "  «every: 20 fs", "  «every: 3 fs", "record.every", ["no whole multiple", "exposure"]),
    "two lit stages": (
        "    timestep: 2 fs\n", "    timestep: 2 fs\n    «lit: true\n", "stages[0].lit",
        ["only the last stage"]),
    "no lit stage": (
        "{name: exposure, after_light: 6 ps, lit: true}", "«{name: exposure, length: 6 ps}",
        "stages[1]", ["no stage is lit"]),
    "length and after_light": (
        "after_light: 6 ps,", "length: 9 ps, «after_light: 6 ps,", "stages[1].after_light",
        ["length is given too"]),
    "after_light in the dark": (
        "    length: 40 ps", "    «after_light: 40 ps", "stages[0].after_light",
        ["only a lit stage"]),
    "friction missing": (
        "    thermostat: {method: langevin, friction: 2 /ps, acts_on: all}",
        "    «thermostat: {method: langevin}", "stages[0].thermostat.friction", ["missing"]),
    "a thermostat of a later release": (
        "{«method: langevin", "{«method: nose-hoover-chain", "stages[0].thermostat.method",
        ['"nose-hoover-chain"', "none, langevin"]),
    "unknown vector": (
        "  vectors: [light_torque, torque,", "  vectors: [light_torque, «torqe,",
        "record.vectors[1]", ['did you mean "torque"']),
    "kind given twice": (
        "  «kinds: [plus, minus, dark]", "  «kinds: [plus, plus]", "exposures.kinds",
        ["each kind once"]),
    "boolean of old YAML": (
        "«lit: true", "«lit: yes", "stages[1].lit", ['"yes"', "true or false"]),
    "title that is no text": (
        "«title: Spinning up a chilled polar solvent", "«title: 2026", "title",
        ["2026 is no text", "quotes"]),
    "section that is a word": (
        "exposures:\n  kinds: [plus, minus, dark]\n  starts: 16\n  spacing: 10 ps\n"
        "  carrier_phases: 2\n", "«exposures: many\n", "exposures", ['"many"', "a section"]),
    "list that is a section": (
        "    - {use: acetonitrile, count: 256}\n    - {use: water, count: 8}\n",
        "    use: acetonitrile\n", "sample.species", ["a section; expected a list"]),
    "control characters": (
        "    «envelope: gaussian", '    «envelope: "gau\\e[31mss"', "light[0].envelope",
        [r'"gau\x1b[31mss"']),
}  # fmt: skip
POINTED_AT_PARENT = {
    "missing required key": "sample:", "required key left empty": "temperature:",
    "missing section": "title:", "no strength": "- carrier: 800 nm", "no box": "sample:",
    "two strengths": "fluence:", "flat top without rise": "- carrier: 800 nm",
    "no first timestep": "- name: equilibrate", "list that is a section": "species:",
}  # fmt: skip


def _place(text, mark):
    """Line and column (from 1) of a mark, and the text without marks."""
    before = text[: text.index(mark)].replace("«", "")
    return before.count("\n") + 1, len(before) - before.rfind("\n")


@pytest.mark.parametrize("name", BROKEN)
def test_message_names_place_key_and_remedy(name):
    good, broken, key, words = BROKEN[name]
    good = good.replace("«", "")
    assert GOOD.count(good) >= 1
    text = GOOD.replace(good, broken, 1)
    line, column = _place(text, "«") if "«" in text else (0, 0)
    text = text.replace("«", "")
    if name in POINTED_AT_PARENT:
        line, column = _place(text, POINTED_AT_PARENT[name])
        column += 2 * POINTED_AT_PARENT[name].startswith("- ")
    with pytest.raises(ConfigError) as caught:
        parse_config(text, name="broken.yaml")
    assert len(caught.value.lines) == 1, str(caught.value)
    message = caught.value.lines[0]
    assert message.startswith(f"broken.yaml:{line}:{column}: {key}: ")
    for word in words:
        assert word in message
    assert message.isprintable()


def test_there_are_many_kinds():
    assert len(BROKEN) >= 25


def test_every_fault_is_told_in_the_order_of_the_file():
    text = GOOD.replace("298.15 K", "warm").replace("1e-4", "-1").replace("20 fs", "20 nm")
    with pytest.raises(ConfigError) as caught:
        parse_config(text)
    keys = [line.split(": ")[1] for line in caught.value.lines]
    assert keys == ["sample.temperature", "forces.tolerance", "record.every"]


def test_rules_of_a_plain_equilibrium_run():
    dark = GOOD[: GOOD.index("light:")] + "stages: [{length: 10 ps, timestep: 2 fs}]\n"
    assert parse_config(dark).exposures is None
    with pytest.raises(ConfigError, match=r"stages\[0\].lit: true, but there is no light"):
        parse_config(dark.replace("2 fs}", "2 fs, lit: true}"))
    with pytest.raises(ConfigError, match="exposures.kinds: plus and minus without light"):
        parse_config(dark + "exposures: {starts: 1}\n")
    with pytest.raises(ConfigError, match="exposures.starts: 2 starts need a stage before"):
        parse_config(dark + "exposures: {kinds: [dark], starts: 2}\n")
    assert parse_config(dark + "exposures: {kinds: [dark], starts: 1}\n").exposures.starts == 1


def test_sampled_steps_are_those_of_the_mesh():
    every = "forces.mesh_every=2"
    with pytest.raises(ConfigError) as caught:
        parse_config(GOOD, overrides=[every], name="c.yaml")
    line, column = _place(GOOD.replace("  totals", "  «totals"), "«")
    assert list(caught.value.lines) == [
        f"c.yaml:{line}:{column}: record.totals_every: 0.01 ps is no whole multiple of 2 timesteps"
        f' (forces.mesh_every) of stage {stage}, 0.004 ps; expected one, for example "0.008 ps"'
        for stage in ("equilibrate", "exposure")]
    fine = [every, "record.totals_every=20 fs"]
    config = parse_config(GOOD, overrides=[*fine, "stages[1].after_light=6.001 ps"])
    assert config.stages[1].steps % 2 == 0  # rounded up
    for key, value in {"stages[0].length": "39.998 ps", "record.every": "18 fs",
                       "exposures.spacing": "9.998 ps"}.items():
        with pytest.raises(ConfigError, match=re.escape(f"{key}: ")):
            parse_config(GOOD, overrides=[*fine, f"{key}={value}"])
    with pytest.raises(ConfigError, match="forces.mesh_every: 2, and electrostatics is none, which"
                                          " has no mesh; expected 1"):
        parse_config(GOOD, overrides=[*fine, "forces.electrostatics=none"])


def test_a_stage_begins_where_its_mesh_acts():
    """Ticks go on from stage to stage, and energies are read at whole multiples of them."""
    text = GOOD[: GOOD.index("light:")] + (
        "stages: [{length: 12 fs, timestep: 1 fs}, {length: 16 fs, timestep: 4 fs},\n"
        "         {length: 16 fs}]\nrecord: {every: 16 fs, totals_every: 8 fs}\n")
    parse_config(text)
    with pytest.raises(ConfigError) as caught:
        parse_config(text, overrides=["forces.mesh_every=2"])
    assert [line.split(": ", 1)[1] for line in caught.value.lines] == [
        "stages[1]: with the stages before it, it begins at 0.012 ps, which is no whole multiple"
        ' of 2 timesteps (forces.mesh_every) of stage stage-2, 0.008 ps; expected one, for'
        ' example "0.008 ps"']


def test_overrides_are_named_in_messages():
    with pytest.raises(ConfigError) as caught:
        parse_config(GOOD, overrides=["light[0].duration=5 Ps", "record.evry=2 fs"])
    assert [line.split(": ")[:2] for line in caught.value.lines] == [
        ["--set", "light[0].duration"], ["--set", "record.evry"]]  # fmt: skip
    for assignment, words in {
        "light[0].duration": "needs KEY=VALUE",
        "light[0]..duration=1 ps": "needs KEY=VALUE",
        "=1": "needs KEY=VALUE",
        "light[7].duration=1 ps": "light has 2 entries, counted from 0",
        "light.duration=1 ps": "light is no section",
        "sample[0]=1": "sample is no list",
        "title.x=1": "title is no section",
        "light[0].duration=[1": "--set light[0].duration: not readable",
        "seed=*a": "aliases",
    }.items():
        with pytest.raises(ConfigError, match=".") as caught:
            parse_config(GOOD, overrides=[assignment])
        assert str(caught.value).startswith("--set") and words in str(caught.value)
