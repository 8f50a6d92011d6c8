"""Part of `check` that says back what was understood: every key, in one fixed unit a quantity."""

from swirlight.run.plan_page import Row, Section


def echo(subject):
    """One section per section of the resolved config; keys as a user would write them."""
    plain = {}
    for key, value in subject.config.resolved().items():
        rows = tuple(Row(name, value) for name, value in leaves(value, key))
        if isinstance(value, dict | list) and rows:
            yield Section(f"config: {key}", rows)
        elif rows:
            plain[key] = rows[0]
    yield Section("config", tuple(plain.values()))


def leaves(value, key):
    """(key path, text or number) of every scalar below a plain value; empty lists as ``[]``."""
    if isinstance(value, dict):
        for name, inner in value.items():
            yield from leaves(inner, f"{key}.{name}")
    elif isinstance(value, list) and any(isinstance(inner, dict | list) for inner in value):
        for index, inner in enumerate(value):
            yield from leaves(inner, f"{key}[{index}]")
    elif isinstance(value, list):
        yield key, f"[{', '.join(map(str, value))}]"
    else:
        yield key, "null" if value is None else value
