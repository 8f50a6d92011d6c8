"""Guarded reading of YAML: text to plain Python values that remember where they stood.

Scalars are read as in the core schema of YAML 1.2, only narrower: true, false, null, decimal
numbers (``1e5`` is a number); everything else is text (``no``, ``12:30``, ``2024-01-02``).
Anchors, aliases, tags, merge keys, further documents, duplicate keys and oversized files are
refused before anything is built, so a hostile file costs no more than a large honest one.
"""

import pathlib
import re
from dataclasses import dataclass, field

import yaml

from swirlight.errors import ConfigError, InputError

LARGEST = 2**20  # bytes
DEEPEST = 20
MOST_VALUES = 50_000
LONGEST_NUMBER = 40  # digits and signs

_Loader = getattr(yaml, "CSafeLoader", yaml.SafeLoader)
_WORDS = {"true": True, "True": True, "TRUE": True, "false": False, "False": False,
          "FALSE": False, "null": None, "Null": None, "NULL": None, "~": None,
          "": None}  # fmt: skip
_INTEGER = re.compile(r"[-+]?[0-9]+")
_DECIMAL = re.compile(r"[-+]?(?:\.[0-9]+|[0-9]+(?:\.[0-9]*)?)(?:[eE][-+]?[0-9]{1,3})?")
_KEY = re.compile(r"[A-Za-z_][A-Za-z_0-9]*|\[[0-9]{1,5}\]")


@dataclass(frozen=True, order=True)
class Place:
    """Where a value was written: overrides come after the file; line and column from 1."""

    override: int
    line: int
    column: int
    origin: str

    def __str__(self):
        return f"{self.origin}:{self.line}:{self.column}" if self.line else self.origin


@dataclass
class Document:
    """A YAML file as plain values.

    name : what messages call the file.
    text : the file verbatim.
    tree : dicts, lists and scalars.
    places : where each value stands, by path; of a mapping's entries the place of the key.
    """

    name: str
    text: str
    tree: object
    places: dict[tuple, Place] = field(default_factory=dict)

    def place(self, path):
        """The place of the value at this path, or of the nearest section around it."""
        path = tuple(path)
        while path and path not in self.places:
            path = path[:-1]
        return self.places.get(path) or Place(0, 1, 1, printable(self.name))

    def message(self, path, text):
        """One line, ``FILE:LINE:COL: key: text``."""
        key, text = path_text(path), printable(text, 10_000)
        return f"{self.place(path)}: {key}: {text}" if key else f"{self.place(path)}: {text}"

    def override(self, assignment):
        """Set one value from ``light[0].duration=120 fs``; the value is read as YAML.

        Sections on the way are made where the file has none; list entries must exist.
        Raises ConfigError.
        """
        key, equals, value = assignment.partition("=")
        origin = "--set"
        path = parse_path(key.strip())
        if not equals or path is None:
            raise ConfigError(f'--set {printable(assignment)}: needs KEY=VALUE, for example '
                              '--set light[0].duration="120 fs"')
        read = read_text(value, f"--set {printable(key.strip())}")
        target = self._section(path, origin)
        target[path[-1]] = read.tree
        inside = [known for known in self.places if known[: len(path)] == path]
        for known in inside:
            del self.places[known]
        order = 1 + max(place.override for place in [*self.places.values(), self.place(())])
        for known in [(), *read.places]:
            self.places[path + known] = Place(order, 0, 0, origin)

    def _section(self, path, origin):
        """The dict or list that holds, or will hold, the value at this path."""
        if self.tree is None:
            self.tree = {}
        here = self.tree
        for depth, step in enumerate(path):
            wanted = list if isinstance(step, int) else dict
            if not isinstance(here, wanted):
                name = path_text(path[:depth]) or "the file"
                kind = "list" if wanted is list else "section"
                hint = f"; it is a list: {name}[0].{step}" if isinstance(here, list) else ""
                raise ConfigError(f"{origin}: {name} is no {kind}{hint}")
            if wanted is list and step >= len(here):
                raise ConfigError(f"{origin}: {path_text(path[:depth])} has {len(here)} "
                                  f"entr{'y' if len(here) == 1 else 'ies'}, counted from 0")
            if depth == len(path) - 1:
                return here
            if wanted is dict and here.get(step) is None:
                here[step] = {}
            here = here[step]


def read_yaml(path):
    """Read a YAML file.

    path : of the file.
    Returns a Document. Raises ConfigError for what is in it, InputError if it cannot be read.
    """
    path = pathlib.Path(path)
    try:
        with path.open("rb") as file:
            data = file.read(LARGEST + 1)
    except (OSError, ValueError) as error:
        reason = getattr(error, "strerror", None) or error
        raise InputError(f"{printable(str(path))}: cannot be read: {reason}") from None
    name = str(path)
    if len(data) > LARGEST:
        raise ConfigError(f"{printable(name)}:1:1: the file is larger than {LARGEST >> 20} MiB")
    try:
        text = data.decode("utf-8-sig")
    except UnicodeDecodeError as error:
        line = data.count(b"\n", 0, error.start) + 1
        column = error.start - data.rfind(b"\n", 0, error.start)
        raise ConfigError(f"{printable(name)}:{line}:{column}: byte 0x{data[error.start]:02x} is "
                          "not UTF-8 text; save the file as UTF-8") from None
    return read_text(text, name)


def read_text(text, name):
    """Read YAML text; `name` stands for the file in messages. See `read_yaml`."""
    document = Document(name, text, None)
    builder = _Builder(document)
    try:
        document.tree = builder.build()
    except yaml.MarkedYAMLError as error:
        mark = error.problem_mark or error.context_mark
        builder.refuse(mark, _syntax(error, text, mark))
    except yaml.reader.ReaderError as error:
        character = error.character if isinstance(error.character, int) else 0
        builder.refuse_at(*_position(text, error.position),
                          f"the character U+{character:04X} is not allowed in YAML")
    except UnicodeEncodeError as error:
        builder.refuse_at(*_position(text, error.start), "this is not UTF-8 text")
    return document


def yaml_text(tree):
    """Plain values as YAML text that `read_text` reads back as the same values."""
    return yaml.dump(tree, Dumper=_Dumper, sort_keys=False, allow_unicode=True, width=90)


class _Dumper(yaml.SafeDumper):
    """Quotes text that would read as a number here, though not in YAML 1.1 (1e5, 08), and
    text with unusual line breaks, which the plain style loses."""

    def represent_text(self, text):
        quoted = text in _WORDS or _DECIMAL.fullmatch(text) or not text.isprintable()
        return self.represent_scalar("tag:yaml.org,2002:str", text, style='"' if quoted else None)


_Dumper.add_representer(str, _Dumper.represent_text)


def path_text(path):
    """A key path as users write it: ``light[0].duration``."""
    parts = (f"[{step}]" if isinstance(step, int) else f".{printable(str(step))}" for step in path)
    return "".join(parts).lstrip(".")


def printable(text, limit=200):
    """Text for a message: control characters escaped, cut when very long."""
    cut = text if len(text) <= limit else text[: limit - 1] + "…"
    return "".join(c if c.isprintable() else c.encode("unicode_escape", "backslashreplace").decode()
                   for c in cut)


def shown(value):
    """A value that somebody wrote, for a message."""
    if isinstance(value, str):
        return f'"{printable(value, 60)}"'
    if isinstance(value, dict):
        return "a section"
    if isinstance(value, list):
        return f"a list of {len(value)}"
    if value is None:
        return "nothing"
    if isinstance(value, float):
        return f"{value:.12g}"
    return str(value).lower() if isinstance(value, bool) else printable(str(value), 60)


class _Builder:
    """Turns the events of the parser into values, refusing what the guard forbids."""

    def __init__(self, document):
        self.document = document
        self.values = 0

    def refuse_at(self, line, column, message):
        place = printable(self.document.name)
        if not place.startswith("--set "):
            place = f"{place}:{line}:{column}"
        raise ConfigError(f"{place}: {message}") from None

    def refuse(self, mark, message):
        self.refuse_at(mark.line + 1 if mark else 1, mark.column + 1 if mark else 1, message)

    def build(self):
        self.events = yaml.parse(self.document.text, Loader=_Loader)
        value, documents = None, 0
        for event in self.events:
            if isinstance(event, yaml.DocumentStartEvent):
                documents += 1
                if documents > 1:
                    self.refuse(event.start_mark, "a second document begins here; one is allowed")
                if event.tags:
                    self.refuse(event.start_mark, "tag directives are not allowed")
            elif isinstance(event, yaml.NodeEvent):
                value = self._value(event, ())
        return value

    def _value(self, event, path):
        self.values += 1
        if self.values > MOST_VALUES:
            self.refuse(event.start_mark, f"more than {MOST_VALUES} values")
        if len(path) >= DEEPEST:
            self.refuse(event.start_mark, f"nested deeper than {DEEPEST} levels")
        if event.anchor is not None:
            what = "aliases (*name)" if isinstance(event, yaml.AliasEvent) else "anchors (&name)"
            self.refuse(event.start_mark, f"{what} are not allowed; write the value out, and quote "
                                          "text that begins with * or &")
        if event.tag is not None:
            self.refuse(event.start_mark, f"the tag {printable(event.tag, 60)} is not allowed; "
                                          "quote text that begins with !")
        self.document.places.setdefault(path, self._place(event))
        if isinstance(event, yaml.MappingStartEvent):
            return self._mapping(path)
        if isinstance(event, yaml.SequenceStartEvent):
            return self._sequence(path)
        return self._scalar(event, path)

    def _place(self, event):
        mark = event.start_mark
        return Place(0, mark.line + 1, mark.column + 1, printable(self.document.name))

    def _mapping(self, path):
        found = {}
        while not isinstance(event := next(self.events), yaml.MappingEndEvent):
            if not isinstance(event, yaml.ScalarEvent):
                self.refuse(event.start_mark, "a key must be plain text")
            self.values += 1
            key, place = event.value, self._place(event)
            if event.anchor is not None or event.tag is not None:
                self.refuse(event.start_mark, "anchors and tags are not allowed")
            if key == "<<" and event.implicit[0]:
                self.refuse(event.start_mark, "merge keys (<<) are not allowed; write the keys out")
            if key in found:
                first = self.document.places[(*path, key)].line
                self.refuse(event.start_mark, f"{path_text((*path, key))}: duplicate key (first "
                                              f"given on line {first}); keep one of the two")
            self.document.places[(*path, key)] = place
            found[key] = self._value(next(self.events), (*path, key))
        return found

    def _sequence(self, path):
        found = []
        while not isinstance(event := next(self.events), yaml.SequenceEndEvent):
            found.append(self._value(event, (*path, len(found))))
        return found

    def _scalar(self, event, path):
        text = event.value
        if not event.implicit[0]:  # quoted, or a block of text
            return text
        if text in _WORDS:
            return _WORDS[text]
        if not _DECIMAL.fullmatch(text):
            return text
        if len(text) > LONGEST_NUMBER:
            self.refuse(event.start_mark, f"{path_text(path)}: a number of {len(text)} characters")
        if _INTEGER.fullmatch(text):
            return int(text)
        number = float(text)
        if number in (float("inf"), float("-inf")):
            self.refuse(event.start_mark, f"{path_text(path)}: {text} is too large a number")
        return number


def _syntax(error, text, mark):
    """What the parser could not read, in words that help."""
    lines = text.splitlines()
    line = lines[mark.line] if mark and mark.line < len(lines) else ""
    if "\t" in line[: mark.column + 1 if mark else 0]:
        return "a tab; indent with spaces"
    if mark and line[mark.column : mark.column + 1] in tuple("%@`"):
        return f"text that begins with {line[mark.column]} must be quoted"
    problem = error.problem or error.context or "this"
    return f"not readable as YAML: {printable(problem)} (is a quote, bracket or colon missing?)"


def _position(text, index):
    """Line and column, from 1, of a position in a text."""
    index = min(index or 0, len(text))
    return text.count("\n", 0, index) + 1, index - text.rfind("\n", 0, index)


def parse_path(key):
    """``light[0].duration`` as ("light", 0, "duration"), or None."""
    parts = re.split(r"\.|(?=\[)", key)
    if not all(_KEY.fullmatch(part) for part in parts) or parts[0].startswith("["):
        return None
    return tuple(int(part[1:-1]) if part.startswith("[") else part for part in parts)
