"""Part of `check` that says back what was understood: every key, in one fixed unit a quantity."""

from swirlight.run.plan.page import Row, Section
from swirlight.units import KINDS

SHOWN = {kind.shown for kind in KINDS.values()}
WORDS = ("title", "author", "output")  # text that only looks like a quantity


def echo(subject):
    """One section per section of the resolved config; keys as a user would write them."""
    plain = []
    for key, value in subject.config.resolved().items():
        rows = [_row(name, leaf) for name, leaf in leaves(value, key)]
        if isinstance(value, dict | list) and rows:
            yield Section(f"config: {key}", tuple(rows))
        else:
            plain += rows
    yield Section("config", tuple(plain))


def leaves(value, key):
    """(key path, text or number) of every scalar below a plain value; a flat list is one text."""
    if isinstance(value, dict):
        for name, inner in value.items():
            yield from leaves(inner, f"{key}.{name}")
    elif isinstance(value, list) and any(isinstance(inner, dict | list) for inner in value):
        for index, inner in enumerate(value):
            yield from leaves(inner, f"{key}[{index}]")
    elif isinstance(value, list):
        yield key, f"[{', '.join(map(str, value))}]"
    else:
        yield key, value


def _row(key, value):
    """A quantity as number and unit, with all its digits; anything else as it stands."""
    if isinstance(value, float):
        return Row(key, value, text=repr(value))
    number, _, unit = value.partition(" ") if isinstance(value, str) else ("", "", "")
    if key in WORDS or unit not in SHOWN:
        return Row(key, value)
    return Row(key, float(number), unit, text=number)
