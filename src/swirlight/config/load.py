"""Reading launch configs, comparing them, and the schema of what may stand in them."""

import hashlib
import json
import pathlib

from swirlight.config.models import Config
from swirlight.config.reader import read_text, read_yaml
from swirlight.config.validate import validate
from swirlight.config.values import is_path

# What may change between the halves of an interrupted run: nothing in it decides a result.
_FREE = ("title", "author", "output")


def load_config(path, overrides=()):
    """Read and validate a launch config.

    path : of the YAML file.
    overrides : texts such as ``light[0].duration=120 fs``, applied in order.
    Returns a Config. Raises InputError (no such file), ConfigError (a line per fault).
    """
    path = pathlib.Path(path)
    return _finish(read_yaml(path), overrides, path.absolute(), path.stem)


def parse_config(text, folder=".", overrides=(), name="config"):
    """A Config from YAML text; paths in it are relative to `folder`. See `load_config`."""
    return _finish(read_text(text, name), overrides, None, name, folder)


def _finish(document, overrides, path, stem, folder=None):
    for assignment in overrides:
        document.override(assignment)
    if isinstance(document.tree, dict) and document.tree.get("output") is None:
        document.tree["output"] = f"runs/{stem}"
    config = validate(Config, document, folder if path is None else path.parent)
    config._path, config._text, config._document = path, document.text, document
    return config


def physical_part(config):
    """What decides the results: the resolved config without title, author and output.

    Files it names are replaced by hashes of their contents: where they lie does not matter.
    """
    part = {key: value for key, value in config.resolved().items() if key not in _FREE}
    sample = part["sample"]
    for entry in sample["species"]:
        if is_path(entry["use"]):
            entry["use"] = _contents(entry["use"])
    if "begin_from" in sample:
        sample["begin_from"] = _contents(sample["begin_from"])
    for pulse in part.get("light", ()):
        if "file" in pulse:
            pulse["file"] = _contents(pulse["file"])
    return part


def config_hash(config):
    """SHA-256 of the physical part, as hexadecimal text."""
    canonical = json.dumps(physical_part(config), sort_keys=True, separators=(",", ":"))
    return hashlib.sha256(canonical.encode()).hexdigest()


def physical_differences(a, b):
    """Where two configs differ in what decides the results: lines ``key: a's -> b's``.

    a, b : Config, or what `physical_part` returned for one.
    """
    a, b = (_leaves(physical_part(c) if isinstance(c, Config) else c) for c in (a, b))
    keys = [*a, *(key for key in b if key not in a)]
    return [f"{key}: {a.get(key, 'not given')} -> {b.get(key, 'not given')}"
            for key in keys if a.get(key) != b.get(key)]


def config_schema():
    """JSON Schema of a launch config, for editors and programs."""
    schema = Config.model_json_schema(by_alias=True, mode="validation")
    return {"$schema": "https://json-schema.org/draft/2020-12/schema", **schema,
            "title": "swirlight launch config"}


def _contents(path):
    with open(path, "rb") as file:
        return f"sha256:{hashlib.file_digest(file, 'sha256').hexdigest()}"


def _leaves(value, key=""):
    """Every scalar of nested dicts and lists, by its key path."""
    if isinstance(value, dict) and value:
        pairs = ((f"{key}.{name}".lstrip("."), inner) for name, inner in value.items())
    elif isinstance(value, list | tuple) and value:
        pairs = ((f"{key}[{i}]", inner) for i, inner in enumerate(value))
    else:
        return {key: value}
    return {leaf: v for name, inner in pairs for leaf, v in _leaves(inner, name).items()}
