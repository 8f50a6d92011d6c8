import json
import math
import pickle
import subprocess
import sys

import jsonschema
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from swirlight.config import (
    Config,
    config_hash,
    config_schema,
    load_config,
    parse_config,
    physical_differences,
    physical_part,
)
from swirlight.config.reader import read_text, yaml_text
from swirlight.errors import ConfigError
from tests.config.good import GOOD

SHORT = """\
sample: {species: [{use: water, count: 216}], density: 0.998 g/cm^3, temperature: 298.15 K}
stages: [{length: 10 ps, timestep: 2 fs}]
"""
PULSE = "light: [{carrier: 800 nm, peak_intensity: 1e10 W/cm^2, duration: 100 fs}]\n"
LIT = SHORT.replace("[{length", "[{length: 1 ps, timestep: 1 fs}, {lit: true, length") + PULSE


def test_values_are_in_internal_units():
    config = parse_config(GOOD)
    first, second = config.light
    assert first.carrier == pytest.approx(2.0 * math.pi, rel=1e-15)
    assert (first.peak_intensity, first.duration, first.centre) == (2e10, 1.0, 3.0)
    assert (first.helicity, first.ellipticity, first.direction) == (1, None, (0.0, 0.0, 1.0))
    assert second.fluence == 0.02
    assert second.ellipticity == pytest.approx(math.pi / 6.0)
    assert second.direction == pytest.approx((0.0, 0.5**0.5, 0.5**0.5))
    assert config.forces.pairs[0].sites == (("water", "O"), ("acetonitrile", "Me"))
    assert config.forces.reaction_permittivity == math.inf
    assert (config.forces.splitting, config.forces.mesh.order) == (None, 5)
    assert (config.bias_field.from_, config.bias_field.to) == (0.0, 5.0)
    # Length after the light: centre 3 ps, a Gaussian lasts 2.5 durations beyond, 6 ps more.
    assert config.stages[1].length == 11.5 and config.stages[1].steps == 5750
    assert config.stages[1].timestep == config.stages[0].timestep == 0.002


def test_defaults_are_those_of_the_documentation():
    config = parse_config(SHORT, name="short")
    assert config.light == () and config.bias_field is None and config.exposures is None
    assert (config.seed, config.author, config.output) == (41, "not given", "runs/short")
    forces = config.forces
    assert (forces.cutoff, forces.cutoff_form) == (1.0, "switched")
    assert (forces.electrostatics, forces.tolerance) == ("mesh-ewald", 1e-4)
    assert (forces.splitting, forces.mesh, forces.pairs) == (None, None, ())
    assert (forces.reaction_permittivity, forces.damping) == (math.inf, 2.0)
    assert (forces.mixing, forces.precision) == ("lorentz-berthelot", "mixed")
    record = config.record
    assert (record.every, record.totals_every, record.precision) == (0.02, 0.01, "single")
    assert record.vectors == ("light_torque", "torque", "angular_momentum", "orientation")
    assert config.stages[0].name == "stage-1"
    assert config.stages[0].thermostat.method == "none"
    config = parse_config(LIT + "exposures:\n  starts: 4\n")
    pulse = config.light[0]
    assert (pulse.helicity, pulse.azimuth, pulse.phase, pulse.coupling) == (1, 0.0, 0.0, "auto")
    assert (pulse.turning.rate, pulse.train.count, pulse.train.period) == (0.0, 1, 10.0)
    assert (pulse.refractive_index, pulse.local_field, pulse.in_kinds) == (1.0, "none", "exposed")
    exposures = config.exposures
    assert (exposures.kinds, exposures.starts) == (("plus", "minus", "dark"), 4)
    assert (exposures.spacing, exposures.carrier_phases) == (None, 2)


@pytest.mark.parametrize(
    ("shape", "centre"),
    [
        ("envelope: gaussian", 0.25), ("envelope: sech2", 0.31), ("envelope: rectangle", 0.05),
        ("envelope: flat-top, rise: 20 fs", 0.06),  # 80 fs plateau, two ramps: 120 fs in all
    ],
)  # fmt: skip
def test_default_centre(shape, centre):
    config = parse_config(LIT.replace("duration:", f"{shape}, duration:"))
    assert config.light[0].centre == pytest.approx(centre)


def test_length_after_a_train_is_rounded_up_to_whole_steps():
    text = LIT.replace("100 fs}", "100 fs, train: {count: 3, period: 1 ps}}").replace(
        "lit: true, length: 10 ps", "lit: true, after_light: 1.0001 ps")
    # 0.25 centre + 2 periods + 0.25 reach + 1.0001 = 3.5001 ps, in steps of 2 fs
    assert parse_config(text).stages[-1].length == 3.502


def test_empty_keys_count_as_left_out():
    config = parse_config(SHORT + "light:\nexposures: null\nrecord:\nforces:\n  splitting:\n")
    assert config == parse_config(SHORT)


def test_what_is_resolved_reads_back_as_equal():
    for text in (GOOD, SHORT, LIT):
        config = parse_config(text)
        again = parse_config(yaml_text(config.resolved()))
        assert again == config and again.resolved() == config.resolved()
        for name in Config.model_fields:
            assert getattr(again, name) == getattr(config, name)
        assert config_hash(again) == config_hash(config)
    assert parse_config(GOOD) != parse_config(SHORT)


@given(st.lists(st.floats(0.2, 1e3), min_size=8, max_size=8))
@settings(max_examples=50, deadline=None)
def test_any_numbers_survive_the_round_trip(x):
    text = LIT.replace(
        "duration: 100 fs", f"duration: {x[0]!r} fs, centre: {x[1]!r} fs, azimuth: {x[2] / 9!r} "
        f"deg, turning: {{rate: {x[3]!r} deg/ps}}, direction: [{x[4]!r}, -{x[5]!r}, 1]"
    ).replace("0.998 g", f"{x[6] / 99!r} g").replace("298.15", repr(x[7]))
    config = parse_config(text)
    assert parse_config(yaml_text(config.resolved())) == config


def test_files_are_relative_to_the_config(tmp_path):
    (tmp_path / "shape.csv").write_text("# measured\ntime (fs), intensity\n0, 0\n100, 2\n300, 0\n")
    (tmp_path / "own.yaml").write_text("name: own\n")
    text = LIT.replace("duration: 100 fs", "envelope: table, file: shape.csv").replace(
        "use: water", "use: own.yaml")
    (tmp_path / "a.yaml").write_text(text)
    config = load_config(tmp_path / "a.yaml")
    assert config.text == text and config.path == tmp_path / "a.yaml"
    assert config.folder == tmp_path and config.output == "runs/a"
    assert config.sample.species[0].use == str(tmp_path / "own.yaml")
    pulse = config.light[0]
    assert pulse.table == (pytest.approx((0.0, 0.1, 0.3)), (0.0, 2.0, 0.0))
    # Half the maximum at 50 and 200 fs: width 150 fs, the middle 125 fs after the first point.
    assert (pulse.duration, pulse.centre) == (pytest.approx(0.15), pytest.approx(0.125))
    assert pulse.end == pytest.approx(0.3)
    stretched = load_config(tmp_path / "a.yaml", ["light[0].duration=300 fs"]).light[0]
    assert (stretched.centre, stretched.end) == (pytest.approx(0.25), pytest.approx(0.6))
    again = parse_config(yaml_text(config.resolved()), folder="/")
    assert again == config
    # The hash follows the contents of files, not where they lie.
    other = tmp_path / "other"
    other.mkdir()
    for name in ("shape.csv", "own.yaml", "a.yaml"):
        (other / name).write_bytes((tmp_path / name).read_bytes())
    moved = load_config(other / "a.yaml")
    assert config_hash(moved) == config_hash(config)
    (other / "own.yaml").write_text("name: changed\n")
    assert [line.split(":")[0] for line in physical_differences(config, moved)] == [
        "sample.species[0].use"]


@pytest.mark.parametrize(
    ("table", "words"),
    [
        ("0, 1\n", "fewer than two points"), ("0, 0\n1, 0\n", "no light"),
        ("0, 1\n0, 1\n", "line 2 that is not after"), ("0, -1\n1, 1\n", "negative"),
        ("0, 1\n1, nan\n", "line 2"), ("0, 1\nx, 1\n", 'has "x, 1" in line 2'),
        ("0, 1, 2\n", 'has "0, 1, 2" in line 1'), ("time (kg), i\n0, 1\n", "not the unit of"),
        ("\xff", "not UTF-8"), ("", "fewer than two"), ('"', "line"),
    ],
)  # fmt: skip
def test_envelope_tables_that_cannot_be_used(tmp_path, table, words):
    (tmp_path / "shape.csv").write_bytes(table.encode("latin-1"))
    text = LIT.replace("duration: 100 fs", "envelope: table, file: shape.csv")
    with pytest.raises(ConfigError) as caught:
        parse_config(text, folder=tmp_path)
    message = str(caught.value)
    assert message.startswith("config:3:") and "light[0].file: " in message
    assert words in message


def test_configs_and_their_errors_survive_pickling():
    config = parse_config(GOOD)
    assert pickle.loads(pickle.dumps(config)) == config
    error = ConfigError(["a:1:1: b: c", "a:2:1: d: e"])
    assert pickle.loads(pickle.dumps(error)).lines == error.lines


def test_differences_are_told_key_by_key():
    a = parse_config(GOOD)
    b = parse_config(GOOD, overrides=["light[0].duration=120 fs", "title=other", "output=x",
                                      "author=b", "forces.mesh=auto", "stages[1].after_light=3 ps"])
    assert physical_differences(a, a) == []
    # Compared with what was stored, which has been through JSON.
    stored = json.loads(json.dumps(physical_part(a)))
    assert physical_differences(stored, a) == []
    assert physical_differences(stored, b) == [
        "forces.mesh.order: 5 -> not given", "forces.mesh.spacing: 0.1 nm -> not given",
        "light[0].duration: 1 ps -> 0.12 ps", "stages[1].length: 11.5 ps -> 6.3 ps",
        "forces.mesh: not given -> auto"]  # fmt: skip
    assert config_hash(a) != config_hash(b)
    assert config_hash(a) == config_hash(parse_config(GOOD, overrides=["title=other"]))


def test_schema_accepts_good_configs_and_refuses_others():
    schema = config_schema()
    jsonschema.Draft202012Validator.check_schema(schema)
    check = jsonschema.Draft202012Validator(schema).is_valid
    good = read_text(GOOD, "good").tree
    assert check(good) and check(parse_config(GOOD).resolved())
    assert check(read_text(SHORT, "short").tree) and check(parse_config(LIT).resolved())
    for assignment in ("light[0].duration=1", "light[0].duration=1,0 ps", "zzz=1", "seed=1.5",
                       "sample.species[0].count=0", "light[0].envelope=gausian",
                       "forces.mesh=none", "forces.cutoff=auto", "bias_field.vector=0 1 V/m"):
        document = read_text(GOOD, "good")
        document.override(assignment)
        assert not check(document.tree), assignment


CHARACTERS = "abc:-[]{},&*!|>'\"%@` \n\t#?<0159.e/^\x00\x1b\u202e\ud800é"
PIECES = ["null", "[]", "{}", "true", "-1", "0", "1e308", "1e400", "nan ps", "1 Ps", "9**9**9 ps",
          "1,5 nm", "'", "*a", "&a 1", "!!int 1", "<<: {}", "---\n", "\t", "x" * 300, "0 nm",
          "[[[[[[[[[[[[[[[[[[[[[[[[1", "auto", "0 0 0 nm", "/etc", "a\0b", "light[0]"]  # fmt: skip


@st.composite
def mutated(draw):
    """The good config with a few lines or words changed, moved or lost."""
    text = GOOD
    for _ in range(draw(st.integers(1, 4))):
        lines = text.splitlines(keepends=True)
        i, j = sorted(draw(st.integers(0, len(lines))) for _ in range(2))
        at = draw(st.integers(0, len(text)))
        end = min(len(text), at + draw(st.integers(0, 12)))
        piece = draw(st.sampled_from(PIECES) | st.text(CHARACTERS, max_size=8)
                     | st.text(max_size=5))
        text = draw(st.sampled_from([
            text[:at] + piece + text[end:],
            "".join(lines[:i] + lines[j:]),
            "".join(lines[:i] + lines[j:] + lines[i:j]),
            "".join(lines[:j] + lines[i:]),
            "".join(lines[:i] + [line.split(":")[0] + f": {piece}\n" for line in lines[i : i + 1]]
                    + lines[i + 1 :]),
        ]))  # fmt: skip
    return text


@settings(max_examples=400, deadline=5000)
@given(mutated())
def test_mutations_are_configs_or_config_errors(text):
    try:
        config = parse_config(text, name="m.yaml")
    except ConfigError as error:
        assert all(line.startswith("m.yaml:") and line.isprintable() for line in error.lines)
    else:
        assert parse_config(yaml_text(config.resolved())) == config


LEAVES = ["sample", "sample.species", "sample.species[0]", "sample.edges", "forces.mesh",
          "forces.splitting", "forces.pairs", "light", "light[0]", "light[0].direction",
          "light[0].duration", "light[0].turning", "bias_field", "bias_field.vector", "stages",
          "stages[0].thermostat", "stages[1].after_light", "exposures", "exposures.kinds",
          "record.vectors", "record.every", "title", "seed"]  # fmt: skip
VALUES = st.recursive(
    st.sampled_from([None, True, -1, 0, 1e308, 10**39, "", "auto", "1 ps", "0 ps", "1e-300 ps",
                     "1 2 3 nm", "x", "water", "a.b", [], {}, "\x1b[0m", "no/such/file"]),
    lambda inner: st.lists(inner, max_size=4)
    | st.dictionaries(st.sampled_from(["use", "count", "name", "length", "rate", "between", "z"]),
                      inner, max_size=3),
    max_leaves=6,
)  # fmt: skip


@settings(max_examples=300, deadline=5000)
@given(st.sampled_from(LEAVES), VALUES)
def test_any_value_anywhere_is_a_config_or_a_config_error(key, value):
    written = yaml_text([value]).strip() if not isinstance(value, dict | list) else \
        json.dumps(value)
    if not isinstance(value, dict | list):
        written = written.removeprefix("- ")
    try:
        parse_config(GOOD, overrides=[f"{key}={written}"])
    except ConfigError as error:
        assert all(line.isprintable() for line in error.lines)


def test_reading_needs_no_heavy_imports():
    """`swirlight check` must answer quickly: no compiler, no plotting, no cluster."""
    code = ("import sys; from swirlight.config import parse_config; "
            f"parse_config({GOOD!r}); "
            "print([m for m in ('numba', 'matplotlib', 'distributed', 'h5py') "
            "if m in sys.modules])")
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    assert done.stdout.strip() == "[]"
