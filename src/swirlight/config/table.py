"""Envelope tables: CSV files of time and relative intensity."""

import csv
import io
import math
import re
from dataclasses import dataclass

from swirlight import units
from swirlight.config.reader import printable, shown
from swirlight.config.values import Problems

LARGEST = 2**22  # bytes


@dataclass(frozen=True)
class Table:
    """A measured envelope; `middle` and `width` are of its half maximum. [ps]"""

    times: tuple[float, ...]
    values: tuple[float, ...]
    middle: float
    width: float


def read_table(path):
    """Read an envelope: two columns, time and relative intensity, rising times.

    Commas or semicolons part the columns. A first line of names may stand above them; it may
    give the unit of time, ``time (fs)``, which is ps otherwise. Empty lines and lines that
    begin with # are skipped.
    Returns a Table. Raises Problems at the key `file`.
    """
    try:
        with open(path, "rb") as file:
            data = file.read(LARGEST + 1)
        text = data.decode("utf-8-sig")
        if len(data) > LARGEST:
            raise ValueError(f"is larger than {LARGEST >> 20} MiB")
        times, values = _columns(text)
    except OSError as error:
        raise _problem(path, f"cannot be read: {error.strerror}") from None
    except UnicodeDecodeError:
        raise _problem(path, "is not UTF-8 text") from None
    except (ValueError, csv.Error) as error:
        raise _problem(path, str(error)) from None
    first, last = _half_maximum(times, values)
    return Table(tuple(times), tuple(values), 0.5 * (first + last), last - first)


def _problem(path, reason):
    return Problems((("file",), f"{printable(str(path))} {reason}; expected lines of time and "
                                'relative intensity, for example "0.25, 0.8"'))


def _columns(text):
    """The two columns, times in ps. Raises ValueError."""
    times, values, scale = [], [], 1.0
    for number, row in enumerate(csv.reader(io.StringIO(text.replace(";", ","))), start=1):
        cells = [cell.strip() for cell in row]
        if not any(cells) or cells[0].startswith("#"):
            continue
        try:
            time, value = map(float, cells)
        except ValueError:
            if times or scale != 1.0 or not re.match(r"[A-Za-z]", cells[0]):
                raise ValueError(f"has {shown(','.join(row))} in line {number}") from None
            scale = _time_unit(cells[0])
            continue
        times.append(time * scale)
        values.append(value)
        if not (math.isfinite(time) and math.isfinite(value) and value >= 0.0):
            raise ValueError(f"has a negative or infinite number in line {number}")
        if len(times) > 1 and not times[-1] > times[-2]:
            raise ValueError(f"has a time in line {number} that is not after the one before")
    if len(times) < 2 or not max(values) > 0.0:
        raise ValueError("has fewer than two points, or no light")
    return times, values


def _time_unit(name):
    """ps in the unit that a column name ends with, in brackets; 1 if it has none."""
    found = re.search(r"[(\[]([^()\[\]]+)[)\]]\s*$", name)
    return units.parse(f"1 {found.group(1).strip()}", "time") if found else 1.0


def _half_maximum(times, values):
    """First and last time at which straight lines through the points cross half the maximum."""
    half = 0.5 * max(values)
    above = [i for i, value in enumerate(values) if value > half]
    return tuple(_crossing(times, values, inside, side, half)
                 for inside, side in ((above[0], -1), (above[-1], 1)))


def _crossing(times, values, inside, side, half):
    outside = inside + side
    if not 0 <= outside < len(times):
        return times[inside]
    part = (values[inside] - half) / (values[inside] - values[outside])
    return times[inside] + part * (times[outside] - times[inside])
