"""What `swirlight check` hands back: sections of rows, warnings, and what no figure covers."""

import functools
import json
import math
import textwrap
from dataclasses import dataclass

from swirlight import units

WIDTH = 100  # columns of the text form

OUTSIDE = (
    "induction between molecules, and the real antisymmetric part of the polarizability",
    "field gradients and electrostriction",
    "vibration (all mid-infrared carriers), and electrons: ionisation, breakdown, saturation",
    "depletion and propagation of the beam: every body sees the same field",
    "quantum rotation, such as the discrete rotational revivals of gases",
)
CAUTION = (
    "A beam at these intensities is far into class 4 (IEC 60825-1; ANSI Z136.1). This is no safety"
    " assessment: the laser safety officer and the local rules decide."
)


@dataclass(frozen=True)
class Row:
    """One figure: its name, a number or words, the unit, and where it comes from or what it means.

    A dimensionless number has the unit "". `text` is the value as shown, where four digits
    are not what is wanted.
    """

    name: str
    value: float | int | bool | str
    unit: str = ""
    note: str = ""
    text: str = ""

    def __str__(self):
        return f"{self.shown} {self.unit}".rstrip()

    @property
    def shown(self):
        """The value as text: four digits, whole numbers in full."""
        if self.text:
            return self.text
        if isinstance(self.value, bool):
            return "true" if self.value else "false"
        if isinstance(self.value, float):
            return f"{self.value:.4g}"
        return str(self.value)


def quantity(name, value, kind, note=""):
    """A Row of a quantity given in internal units, in the unit in which its kind is shown.

    kind : a name of `units.KINDS`.
    """
    return Row(name, float(value) / _one(kind), units.KINDS[kind].shown, note)


@functools.cache
def _one(kind):
    return units.parse(f"1 {units.KINDS[kind].shown}", kind)


@dataclass(frozen=True)
class Section:
    """Rows that belong together."""

    title: str
    rows: tuple[Row, ...]


@dataclass(frozen=True)
class Notice:
    """A warning: a stable short code for programs, and a sentence that says what to do."""

    code: str
    text: str


@dataclass(frozen=True)
class Plan:
    """All that is known about a run before it starts.

    sections : of rows. warnings : of `Notice`. lit : whether the config has light.
    """

    title: str
    sections: tuple[Section, ...]
    warnings: tuple[Notice, ...]
    lit: bool

    def find(self, name, section=None):
        """All rows called `name`, in order; `section` narrows it to titles that begin so."""
        return [
            row for part in self.sections for row in part.rows
            if row.name == name and (section is None or part.title.startswith(section))
        ]

    @property
    def codes(self):
        """The codes of the warnings, in order."""
        return [notice.code for notice in self.warnings]

    def to_dict(self):
        """The plan as plain dicts and lists; what is not finite becomes None."""
        content = {
            "title": self.title,
            "sections": [
                {
                    "title": part.title,
                    "rows": [
                        {"name": r.name, "value": _finite(r.value), "unit": r.unit, "note": r.note}
                        for r in part.rows
                    ],
                }
                for part in self.sections
            ],
            "warnings": [{"code": n.code, "text": n.text} for n in self.warnings],
            "outside_the_model": list(OUTSIDE),
        }
        return content | ({"laser_caution": CAUTION} if self.lit else {})

    def to_json(self):
        """`to_dict` as JSON text."""
        return json.dumps(self.to_dict(), indent=2, ensure_ascii=False, allow_nan=False)

    def __str__(self):
        blocks = [self.title, *map(_section_text, self.sections)]
        if self.warnings:
            lines = [_item(f"{n.code}: {n.text}") for n in self.warnings]
            blocks.append("\n".join([f"warnings ({len(lines)})", *lines]))
        blocks.append("\n".join(["outside the model", *map(_item, OUTSIDE)]))
        if self.lit:
            blocks.append(textwrap.fill(CAUTION, WIDTH))
        return "\n\n".join(block for block in blocks if block)


def _section_text(section):
    names = max(len(row.name) for row in section.rows)
    values = max(min(len(str(row)), 28) for row in section.rows)
    lines = [section.title]
    for row in section.rows:
        head = f"  {row.name:<{names}}  {row!s:<{values}}"
        if not row.note:
            lines.append(head.rstrip())
        elif len(head) + 2 + len(row.note) <= WIDTH:
            lines.append(f"{head}  {row.note}")
        else:
            lines.append(head.rstrip())
            lines.append(textwrap.fill(row.note, WIDTH, initial_indent=6 * " ",
                                       subsequent_indent=6 * " "))
    return "\n".join(lines)


def _item(text):
    return textwrap.fill(text, WIDTH, initial_indent="  - ", subsequent_indent="    ",
                         break_on_hyphens=False)


def _finite(value):
    return None if isinstance(value, float) and not math.isfinite(value) else value
