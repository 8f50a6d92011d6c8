"""Annotated types for the values of YAML files: read with a helpful refusal, written back.

Each is used as ``Annotated[float, Quantity("time", low="0 ps")]``: it reads what the user
wrote into internal units, writes it back as text that reads as the same value, and gives its
part of the JSON Schema. Refusals name what was given, what is expected and an example.
"""

import difflib
import pathlib
import typing
from dataclasses import dataclass, field

from pydantic_core import core_schema

from swirlight import units
from swirlight.config.reader import path_text, shown


class Problems(ValueError):
    """Faults between keys, each a path (relative to the validated section) and a message."""

    def __init__(self, *problems):
        self.problems = problems
        super().__init__("; ".join(f"{path_text(path)}: {text}" for path, text in problems))


class Value:
    """Base of the types below: `read`, `write`, `expected` and `schema` say what each is."""

    def expected(self):
        """What belongs here, with an example, to follow "expected"."""
        raise TypeError(f"{type(self).__name__} does not say what it expects")

    def read(self, value, folder):
        """The value to keep. Raises ValueError with a whole message."""
        raise TypeError(f"{type(self).__name__} does not say how it is read")

    def write(self, value):
        """The value as YAML holds it."""
        return value

    def schema(self):
        """JSON Schema of what a user may write."""
        return {}

    def refusal(self, value, reason=""):
        """A message on a value: what was given, what is wrong with it, what is expected."""
        return ValueError(f"{shown(value)}{' ' if reason else ''}{reason}; "
                          f"expected {self.expected()}")

    def __get_pydantic_core_schema__(self, source, handler):
        plain = core_schema.with_info_plain_validator_function(
            lambda value, info: self.read(value, (info.context or {}).get("folder")),
            serialization=core_schema.plain_serializer_function_ser_schema(
                # Defaults stand in the models as text and reach the schema unread.
                lambda value: value if isinstance(value, str) else self.write(value)
            ),
        )
        optional = type(None) in typing.get_args(source)
        # A None that has a word ("auto") is written as that word, never as null.
        spelt = None in getattr(self, "words", {}).values()
        return core_schema.nullable_schema(plain) if optional and not spelt else plain

    def __get_pydantic_json_schema__(self, schema, handler):
        return self.schema()


@dataclass(frozen=True)
class Quantity(Value):
    """A float in internal units, given as number and unit.

    kind : a name in `units.KINDS`.
    low, high : the plausible range, as quantities, ends included.
    words : text that stands for a value, such as {"auto": None}.
    """

    kind: str
    low: str | None = None
    high: str | None = None
    example: str | None = None
    words: dict = field(default_factory=dict, hash=False)

    def expected(self):
        kind = units.KINDS[self.kind]
        words = "".join(f"{word} or " for word in self.words)
        return f"{words}{kind}, for example \"{self.example or kind.example}\""

    def read(self, value, folder=None):
        if isinstance(value, str) and value in self.words:
            return self.words[value]
        if not isinstance(value, str):
            number = isinstance(value, int | float) and not isinstance(value, bool)
            raise self.refusal(value, "has no unit" if number else "")
        try:
            return units.parse(value, self.kind, self.low, self.high)
        except ValueError as error:
            raise self.refusal(value, str(error)) from None

    def write(self, value):
        return _word(self.words, value) or units.text(value, self.kind)

    def schema(self):
        quantity = {"type": "string", "pattern": units.QUANTITY_PATTERN,
                    "maxLength": units.LONGEST, "description": self.expected()}
        return _or_words(quantity, self.words)


@dataclass(frozen=True)
class Vector(Value):
    """Three floats in internal units: one text with one unit, or a list of three quantities."""

    kind: str
    low: str | None = None
    high: str | None = None
    example: str | None = None

    def expected(self):
        kind = units.KINDS[self.kind]
        unit = kind.example.split(" ", 1)[1]
        return f"three numbers and the unit of {kind}, for example " \
               f"\"{self.example or f'0 0 1 {unit}'}\""

    def read(self, value, folder=None):
        item = Quantity(self.kind, self.low, self.high)
        if isinstance(value, list) and len(value) == 3:
            return tuple(item.read(entry) for entry in value)
        if not isinstance(value, str):
            raise self.refusal(value)
        try:
            return units.parse_vector(value, self.kind, self.low, self.high)
        except ValueError as error:
            raise self.refusal(value, str(error)) from None

    def write(self, value):
        return units.vector_text(value, self.kind)

    def schema(self):
        text = {"type": "string", "pattern": units.VECTOR_PATTERN, "maxLength": units.LONGEST}
        item = Quantity(self.kind).schema()
        return {"anyOf": [text, {"type": "array", "items": item, "minItems": 3, "maxItems": 3}],
                "description": self.expected()}


@dataclass(frozen=True)
class Matrix(Value):
    """Three rows of three floats in internal units: a list of three vectors."""

    kind: str
    low: str | None = None
    high: str | None = None

    def expected(self):
        unit = units.KINDS[self.kind].example.split(" ", 1)[1]
        return f"a list of three rows, for example [1 0 0 {unit}, 0 1 0 {unit}, 0 0 1 {unit}]"

    def read(self, value, folder=None):
        if not isinstance(value, list) or len(value) != 3:
            raise self.refusal(value)
        row = Vector(self.kind, self.low, self.high)
        return tuple(row.read(entry) for entry in value)

    def write(self, value):
        return [units.vector_text(row, self.kind) for row in value]

    def schema(self):
        row = Vector(self.kind).schema()
        return {"type": "array", "items": row, "minItems": 3, "maxItems": 3}


@dataclass(frozen=True)
class Number(Value):
    """A plain number, as a float; `words` as in `Quantity`."""

    low: float
    high: float
    example: float
    words: dict = field(default_factory=dict, hash=False)

    def expected(self):
        words = "".join(f"{word} or " for word in self.words)
        return f"{words}a number from {self.low:g} to {self.high:g}, for example {self.example:g}"

    def read(self, value, folder=None):
        if isinstance(value, str) and value in self.words:
            return self.words[value]
        if isinstance(value, bool) or not isinstance(value, int | float):
            raise self.refusal(value)
        if not self.low <= value <= self.high:
            raise self.refusal(value, "is out of range")
        return float(value)

    def write(self, value):
        return _word(self.words, value) or value

    def schema(self):
        number = {"type": "number", "minimum": self.low, "maximum": self.high,
                  "description": self.expected()}
        return _or_words(number, self.words)


@dataclass(frozen=True)
class Count(Value):
    """A whole number; `only` lists the few that are allowed."""

    low: int
    high: int
    example: int
    only: tuple = ()

    def expected(self):
        if self.only:
            return " or ".join(str(n) for n in self.only)
        return f"a whole number from {self.low} to {self.high}, for example {self.example}"

    def read(self, value, folder=None):
        if isinstance(value, bool) or not isinstance(value, int):
            raise self.refusal(value)
        if not self.low <= value <= self.high or self.only and value not in self.only:
            raise self.refusal(value, "is out of range")
        return value

    def schema(self):
        if self.only:
            return {"enum": list(self.only)}
        return {"type": "integer", "minimum": self.low, "maximum": self.high,
                "description": self.expected()}


class Choice(Value):
    """One of a few words."""

    def __init__(self, *options):
        self.options = options

    def expected(self):
        return self.options[0] if len(self.options) == 1 else "one of " + ", ".join(self.options)

    def read(self, value, folder=None):
        if not isinstance(value, str) or value not in self.options:
            raise self.refusal(value, did_you_mean(value, self.options))
        return value

    def schema(self):
        return {"enum": list(self.options)}


@dataclass(frozen=True)
class Text(Value):
    """Text of at most `longest` characters."""

    example: str
    longest: int = 1000

    def expected(self):
        return f"text, for example {self.example}"

    def read(self, value, folder=None):
        if not isinstance(value, str):
            raise self.refusal(value, "is no text (put it in quotes if it is meant as text)")
        if not value.strip():
            raise self.refusal(value, "is empty")
        if len(value) > self.longest:
            raise self.refusal(value, f"is longer than {self.longest} characters")
        return value

    def schema(self):
        return {"type": "string", "maxLength": self.longest}


class Flag(Value):
    """true or false."""

    def expected(self):
        return "true or false"

    def read(self, value, folder=None):
        if not isinstance(value, bool):
            raise self.refusal(value)
        return value

    def schema(self):
        return {"type": "boolean"}


@dataclass(frozen=True)
class File(Value):
    """Path of an existing file, relative to the folder of the YAML file; kept absolute.

    names : plain names are allowed too (of a library) and kept as they are.
    """

    example: str
    names: bool = False

    def expected(self):
        what = "a name of the library, or the path" if self.names else "the path"
        return f"{what} of a file relative to this one, for example {self.example}"

    def read(self, value, folder=None):
        if not isinstance(value, str):
            raise self.refusal(value, "is no text (put it in quotes if it is meant as text)")
        if not value.strip() or "\0" in value or len(value) > 1000:
            raise self.refusal(value, "is no path")
        if self.names and not is_path(value):
            return value
        path = (pathlib.Path(folder or ".") / value).absolute()
        try:
            missing = not path.is_file()
        except OSError as error:
            raise self.refusal(value, f"cannot be read: {error.strerror}") from None
        if missing:
            raise self.refusal(value, "is no file")
        return str(path)

    def schema(self):
        return {"type": "string", "description": self.expected()}


def is_path(name):
    """Whether a species is given by a file rather than by its name in the library."""
    return "/" in name or "\\" in name or name.endswith((".yaml", ".yml"))


def nearest(word, known):
    """The known word that is most like a word, or None."""
    near = difflib.get_close_matches(word, known, n=1) if isinstance(word, str) else ()
    return near[0] if near else None


def did_you_mean(word, known):
    """``(did you mean "…"?)`` for the nearest known word, or nothing."""
    near = nearest(word, known)
    return f'(did you mean "{near}"?)' if near else ""


def _word(words, value):
    return next((word for word, meaning in words.items() if meaning == value), None)


def _or_words(schema, words):
    return {"anyOf": [{"enum": list(words)}, schema]} if words else schema
