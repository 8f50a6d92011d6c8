import math
import time

import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from swirlight.config.reader import read_text, read_yaml, yaml_text
from swirlight.errors import ConfigError, InputError


@pytest.mark.parametrize(
    ("text", "value"),
    [
        ("1e5", 1e5), ("5e11", 5e11), ("1.0e+5", 1e5), ("5.", 5.0), (".5", 0.5), ("-1e-3", -1e-3),
        ("12", 12), ("017", 17), ("-0", 0), ("true", True), ("False", False), ("null", None),
        ("~", None), ("", None),
        # what YAML 1.1 takes for something else, or the 1.2 schema for a special float, is text
        ("no", "no"), ("on", "on"), ("y", "y"), ("1_000", "1_000"), ("12:30", "12:30"),
        ("2024-01-02", "2024-01-02"), ("0o17", "0o17"), ("0x1F", "0x1F"), (".inf", ".inf"),
        (".nan", ".nan"), ("695e0514", "695e0514"), ("5#c", "5#c"), ('"1e5"', "1e5"), ("=", "="),
    ],
)  # fmt: skip
def test_plain_scalars(text, value):
    read = read_text(f"a: {text}\n", "f").tree["a"]
    assert read == value and type(read) is type(value)


@pytest.mark.parametrize(
    ("text", "message"),
    [
        ("a: 1\nb:\n  c: 1\n  d: 2\n  c: 3\n", "f:5:3: b.c: duplicate key (first given on line 3)"),
        ("1: a\n1: b\n", "f:2:1: 1: duplicate key (first given on line 1)"),
        ("a: &x 1\n", "f:1:4: anchors"),
        ("a: *x\n", "f:1:4: aliases"),
        ("a: !!python/name:os.system 1\n", "f:1:4: the tag"),
        ("a: !t 1\n", "f:1:4: the tag !t is not allowed"),
        ("<<: {a: 1}\n", "f:1:1: merge keys"),
        ("a: 1\n---\nb: 2\n", "f:2:1: a second document"),
        ("%TAG ! tag:x,2000:\n---\na: 1\n", "f:1:1: tag directives"),
        ("? [a, b]\n: 1\n", "f:1:3: a key must be plain text"),
        ("a:\n\tb: 1\n", "f:2:1: a tab; indent with spaces"),
        ("a: @b\n", "f:1:4: text that begins with @ must be quoted"),
        ("a: 'b\n", "f:2:1: not readable as YAML"),
        ("a: [1, 2\nb: 3\n", "f:2:2: not readable as YAML"),
        ("a: " + "[" * 50, "f:1:23: nested deeper than 20 levels"),
        ("[" * 50_000, "f:1:"),
        ("a: 1e999\n", "f:1:4: a: 1e999 is too large"),
        ("a: " + "1" * 5000, "f:1:4: a: a number of 5000 characters"),
        ("a: b\0\n", "f:1:5: the character U+0000"),
        ("a: \ud800\n", "f:1:4: this is not UTF-8"),
        ("[" + "1," * 60_000 + "]", "f:1:100000: more than 50000 values"),
    ],
)
def test_what_the_guard_refuses(text, message):
    with pytest.raises(ConfigError) as caught:
        read_text(text, "f")
    assert str(caught.value).startswith(message)


def test_files_that_cannot_be_read(tmp_path):
    path = tmp_path / "f.yaml"
    with pytest.raises(InputError, match="f.yaml: cannot be read: No such file"):
        read_yaml(path)
    with pytest.raises(InputError, match="cannot be read"):
        read_yaml(tmp_path)
    path.write_bytes(b"a: 1\nb: caf\xe9\n")
    with pytest.raises(ConfigError, match="f.yaml:2:7: byte 0xe9 is not UTF-8"):
        read_yaml(path)
    path.write_bytes("a: 1\n".encode("utf-16"))
    with pytest.raises(ConfigError, match="f.yaml:1:1: byte 0xff is not UTF-8"):
        read_yaml(path)
    path.write_bytes(b"\xef\xbb\xbfa: 1\n")
    assert read_yaml(path).tree == {"a": 1}
    path.write_bytes(b"#" * (2**20 + 1))
    with pytest.raises(ConfigError, match="larger than 1 MiB"):
        read_yaml(path)


def test_alias_bomb_is_refused_at_once():
    bomb = "a0: &a0 [x, x]\n" + "".join(
        f"a{i}: &a{i} [{', '.join([f'*a{i - 1}'] * 9)}]\n" for i in range(1, 10))
    begin = time.perf_counter()
    with pytest.raises(ConfigError, match="anchors"):
        read_text(bomb, "f")
    assert time.perf_counter() - begin < 1.0


def test_places():
    document = read_text("a: 1\nb:\n  - c: 2\n    d: [3, 4]\n", "f")
    assert str(document.place(("b", 0, "d"))) == "f:4:5"
    assert str(document.place(("b", 0, "d", 1))) == "f:4:12"
    assert str(document.place(("b", 0, "missing"))) == "f:3:5"
    assert str(document.place(("missing",))) == "f:1:1"


def test_overrides_make_sections_and_replace_values():
    document = read_text("a:\n  b: 1\nc: [1, 2]\nd:\n", "f")
    for assignment in ("a.b=[x, {y: 2 fs}]", "c[1]=5e3", "d.e.f=no", "g='1'"):
        document.override(assignment)
    assert document.tree == {
        "a": {"b": ["x", {"y": "2 fs"}]}, "c": [1, 5e3], "d": {"e": {"f": "no"}}, "g": "1"}
    assert str(document.place(("a", "b", 1, "y"))) == "--set"
    assert str(document.place(("c", 0))) == "f:3:5"


values = st.recursive(
    st.none() | st.booleans() | st.integers(-(10**30), 10**30) | st.text(max_size=20)
    | st.floats(allow_nan=False, allow_infinity=False)
    | st.sampled_from(["1e5", "08", "12:30", "no", "~", "", "2024-01-02", "0x1", "- a", "a: b"]),
    lambda inner: st.lists(inner, max_size=3) | st.dictionaries(st.text(max_size=8), inner,
                                                                max_size=3),
    max_leaves=8,
)


@settings(max_examples=200, deadline=None)
@given(values)
def test_what_is_written_reads_back(value):
    try:
        read = read_text(yaml_text({"a": value}), "f").tree["a"]
    except ConfigError as error:
        # Two things that plain values may hold and our YAML may not.
        assert "U+" in str(error) or "not UTF-8" in str(error) or "merge keys" in str(error)
        return
    assert read == value
    if isinstance(value, float):
        assert math.copysign(1.0, read) == math.copysign(1.0, value)


@settings(max_examples=300, deadline=5000, suppress_health_check=[HealthCheck.too_slow])
@given(st.text(max_size=200) | st.text("ab:-[]{},&*!|>'\"%@` \n\t#?<0159.e", max_size=60))
def test_any_text_is_a_document_or_a_config_error(text):
    try:
        read_text(text, "f")
    except ConfigError as error:
        assert str(error).startswith("f:") and str(error).isprintable()
