"""From a document to a validated model, and from faults to sorted lines with places."""

import typing

from pydantic import BaseModel, ConfigDict, ValidationError, model_validator

from swirlight.config.reader import path_text, shown
from swirlight.config.values import Problems, Value, did_you_mean, nearest
from swirlight.errors import ConfigError


class Section(BaseModel):
    """Base of every section: a misspelt key stops the run, nothing is changed afterwards."""

    model_config = ConfigDict(extra="forbid", frozen=True, validate_default=True)

    @model_validator(mode="before")
    @classmethod
    def _empty_is_left_out(cls, tree):
        """A key with nothing after it counts as left out."""
        if not isinstance(tree, dict):
            return tree
        known = _fields(cls)
        return {k: v for k, v in tree.items() if v is not None or k not in known}

    def fill(self, **values):
        """Write out defaults that follow from other keys; only for validators of a section."""
        self.__dict__.update(values)
        return self


def validate(model, document, folder=None):
    """The document as an instance of a `Section`.

    folder : what paths in the document are relative to.
    Raises ConfigError with one line per fault, in the order of the file.
    """
    if document.tree is None:
        raise ConfigError(document.message((), "the file is empty"))
    if not isinstance(document.tree, dict):
        raise ConfigError(document.message((), f"{shown(document.tree)} where keys with values "
                                               "are expected, for example title: a first run"))
    try:
        return model.model_validate(document.tree, context={"folder": folder})
    except ValidationError as error:
        faults = error.errors(include_url=False)
    problems = {problem for fault in faults for problem in _problems(model, document, fault)}
    ordered = sorted(problems, key=lambda p: (document.place(p[0]), path_text(p[0]), p[1]))
    raise ConfigError([document.message(path, text) for path, text in ordered])


def _problems(model, document, fault):
    """The (path, message) pairs of one entry of pydantic's list."""
    path = tuple(fault["loc"])
    original = (fault.get("ctx") or {}).get("error")
    if isinstance(original, Problems):
        return [((*path, *inner), text) for inner, text in original.problems]
    if fault["type"] == "extra_forbidden":
        return [(path, _unknown_key(model, path))]
    if fault["type"] == "missing":
        return [(path, f"missing; expected {_expected(model, path)}")]
    if original is not None:
        return [(path, str(original))]
    return [(path, f"{shown(fault['input'])}; expected {_expected(model, path)}")]


def _unknown_key(model, path):
    """What to say about a key that no section has, or only another one."""
    *section, key = path
    owner = _section_at(model, section)
    own = list(_fields(owner)) if owner else []
    elsewhere = _all_paths(model)
    names = [found[-1] for found in elsewhere]
    near = did_you_mean(key, own)
    if near and key not in names:
        return f"unknown key {near}"
    name = nearest(key, names)
    if name is not None:
        found = next(found for found in elsewhere if found[-1] == name)
        return f'unknown key (did you mean "{path_text(found)}", in another section?)'
    return f"unknown key; expected one of {', '.join(own)}"


def _expected(model, path):
    """What belongs at a path, from the annotations of the models."""
    *section, key = path
    if isinstance(key, int):
        listed = [part for part in _parts(_annotation_at(model, section))
                  if typing.get_origin(part) is tuple]
        return _expected_of(typing.get_args(listed[0])[0]) if listed else "another value"
    owner = _section_at(model, section)
    found = _fields(owner).get(key) if owner else None
    if found is None:
        return "another value"
    if found.description:
        return found.description
    value = next((m for m in found.metadata if isinstance(m, Value)), None)
    return value.expected() if value else _expected_of(found.annotation)


def _expected_of(annotation):
    """What an annotation asks for."""
    if typing.get_origin(annotation) is tuple:
        return f"a list, each entry {_expected_of(typing.get_args(annotation)[0])}"
    for part in _parts(annotation):
        if isinstance(part, Value):
            return part.expected()
        if isinstance(part, type) and issubclass(part, Section):
            required = [name for name, f in _fields(part).items() if f.is_required()]
            keys = required or list(_fields(part))
            return f"a section with {'the key' if len(keys) == 1 else 'keys like'} " + ", ".join(
                keys[:4])
    return "another value"


def _parts(annotation):
    """An annotation and everything inside it, outermost first."""
    yield annotation
    for inner in typing.get_args(annotation):
        yield from _parts(inner)


def _fields(section):
    """The fields of a section by the name that users write."""
    return {f.alias or name: f for name, f in section.model_fields.items()}


def _sections_in(annotation):
    return [p for p in _parts(annotation) if isinstance(p, type) and issubclass(p, Section)]


def _annotation_at(model, path):
    """The annotation at a path of keys and list indices; None where there is no such key."""
    annotation = model
    for step in path:
        if isinstance(step, int):
            continue
        owners = _sections_in(annotation)
        found = _fields(owners[0]).get(step) if owners else None
        if found is None:
            return None
        annotation = found.annotation
    return annotation


def _section_at(model, path):
    annotation = _annotation_at(model, path)
    owners = _sections_in(annotation) if annotation is not None else []
    return owners[0] if owners else None


def _all_paths(model, before=()):
    """Every path of keys below a model, nearest to the top first; lists by their first entry."""
    here, deeper = [], []
    for name, found in _fields(model).items():
        here.append((*before, name))
        listed = any(typing.get_origin(part) is tuple for part in _parts(found.annotation))
        for section in _sections_in(found.annotation)[:1]:
            deeper += _all_paths(section, (*before, name, *((0,) if listed else ())))
    return here + deeper


def plain(model):
    """A section as plain YAML values, every default written out, keys without a value left out."""
    return _without_none(model.model_dump(mode="json", by_alias=True))


def _without_none(value):
    if isinstance(value, dict):
        return {key: _without_none(inner) for key, inner in value.items() if inner is not None}
    if isinstance(value, list):
        return [_without_none(inner) for inner in value]
    return value
