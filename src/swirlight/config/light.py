"""The sections `light` and `bias_field`."""

import typing
from typing import Annotated

from pydantic import Field, PrivateAttr, model_validator

from swirlight.config.table import read_table
from swirlight.config.validate import Section
from swirlight.config.values import Choice, Count, File, Number, Problems, Quantity, Value, Vector

_AXES = {"x": (1.0, 0.0, 0.0), "y": (0.0, 1.0, 0.0), "z": (0.0, 0.0, 1.0),
         "-x": (-1.0, 0.0, 0.0), "-y": (0.0, -1.0, 0.0), "-z": (0.0, 0.0, -1.0)}  # fmt: skip

Angle = Annotated[float, Quantity("angle", "-360 deg", "360 deg")]
Moment = Annotated[float, Quantity("time", "-1 us", "1 us", example="3.0 ps")]
Span = Annotated[float, Quantity("time", "0.01 fs", "1 us")]


class Direction(Value):
    """A unit vector, given as an axis or as three numbers of any length."""

    def expected(self):
        return "x, y, z, -x, -y, -z or three numbers, for example [0, 1, 1]"

    def read(self, value, folder=None):
        if isinstance(value, str) and value in _AXES:
            return _AXES[value]
        if not isinstance(value, list) or len(value) != 3:
            raise self.refusal(value)
        if any(isinstance(v, bool) or not isinstance(v, int | float) for v in value):
            raise self.refusal(value)
        if not all(abs(v) <= 1e6 for v in value):
            raise self.refusal(value, "is out of range")
        length = sum(v * v for v in value) ** 0.5
        if length < 1e-6:
            raise self.refusal(value, "has no direction")
        # A unit vector stays as it is, so that what is written back reads as the same floats.
        return tuple(v / (length if abs(length - 1.0) > 1e-14 else 1.0) for v in map(float, value))

    def write(self, value):
        word = next((word for word, axis in _AXES.items() if axis == tuple(value)), None)
        return word or list(value)

    def schema(self):
        numbers = {"type": "array", "items": {"type": "number"}, "minItems": 3, "maxItems": 3}
        return {"anyOf": [{"enum": list(_AXES)}, numbers], "description": self.expected()}


class Turning(Section):
    """How the azimuth turns: ψ(t) = azimuth + rate t + ½ acceleration t², t from the centre."""

    rate: Annotated[float, Quantity("angular velocity", "-1e6 rad/ps", "1e6 rad/ps")] = "0 rad/ps"
    acceleration: Annotated[
        float, Quantity("angular acceleration", "-1e6 rad/ps^2", "1e6 rad/ps^2")
    ] = "0 rad/ps^2"


class Train(Section):
    """Exact copies of the pulse, one a period; the first as the pulse says."""

    count: Annotated[int, Count(1, 1_000_000, 4)] = 1
    period: Span = "10 ps"


class Pulse(Section):
    """One pulse of light."""

    carrier: Annotated[float, Quantity("carrier", "0.1 GHz", "30 PHz")]
    peak_intensity: Annotated[
        float | None, Quantity("intensity", "0 W/cm^2", "1e17 W/cm^2")] = None
    peak_field: Annotated[float | None, Quantity("field", "0 V/m", "1e12 V/m")] = None
    fluence: Annotated[float | None, Quantity("fluence", "0 J/cm^2", "1e5 J/cm^2")] = None
    envelope: Annotated[
        str, Choice("gaussian", "sech2", "flat-top", "rectangle", "table")] = "gaussian"
    rise: Annotated[float | None, Quantity("time", "0.01 fs", "1 us")] = None
    file: Annotated[str | None, File("shapes/measured.csv")] = None
    duration: Annotated[float | None, Quantity("time", "0.1 fs", "1 us")] = None
    centre: Annotated[
        float | None, Quantity("time", "-1 us", "1 us", example="3.0 ps")] = None
    helicity: Annotated[int | None, Count(-1, 1, 1, only=(1, -1))] = None
    ellipticity: Annotated[float | None, Quantity("angle", "-45 deg", "45 deg")] = None
    azimuth: Angle = "0 deg"
    turning: Turning = Field(default_factory=dict, validate_default=True)
    phase: Angle = "0 deg"
    direction: Annotated[tuple[float, float, float], Direction()] = "z"
    train: Train = Field(default_factory=dict, validate_default=True)
    coupling: Annotated[str, Choice("auto", "averaged", "resolved")] = "auto"
    refractive_index: Annotated[float, Number(0.1, 10.0, 1.34)] = 1.0
    local_field: Annotated[str, Choice("none", "lorentz")] = "none"
    in_kinds: Annotated[str, Choice("exposed", "same")] = "exposed"

    _table: typing.Any = PrivateAttr(None)

    @property
    def table(self):
        """(times [ps], relative intensities) as the file gives them; None for other envelopes."""
        return None if self._table is None else (self._table.times, self._table.values)

    @property
    def reach(self):
        """How long the light lasts before and after its centre. [ps]

        Below 1e-4 of the peak a Gaussian or sech² pulse counts as over.
        """
        if self.envelope == "table":
            stretch = self.duration / self._table.width
            return (stretch * (self._table.middle - self._table.times[0]),
                    stretch * (self._table.times[-1] - self._table.middle))
        whole = {"gaussian": 5.0 * self.duration, "sech2": 6.2 * self.duration,
                 "flat-top": self.duration + (self.rise or 0.0), "rectangle": self.duration}
        return 0.5 * whole[self.envelope], 0.5 * whole[self.envelope]

    @property
    def end(self):
        """When the last copy is over, from the start of the lit stage. [ps]"""
        return self.centre + (self.train.count - 1) * self.train.period + self.reach[1]

    @model_validator(mode="after")
    def _complete(self):
        problems = [*self._strength(), *self._shape()]
        if self.helicity is not None and self.ellipticity is not None:
            problems.append((("ellipticity",), "helicity is given too; keep one of the two "
                                               "(helicity 1 is an ellipticity of 45 deg)"))
        if self.coupling == "resolved" and self.local_field != "none":
            problems.append((("local_field",), f"{self.local_field} acts on averaged light only, "
                             "and coupling is resolved; expected local_field: none"))
        if problems:
            raise Problems(*problems)
        if self.envelope == "table":
            self._table = read_table(self.file)
            if self.duration is None:
                self.fill(duration=self._table.width)
        if self.helicity is None and self.ellipticity is None:
            self.fill(helicity=1)
        if self.centre is None:
            self.fill(centre=self.reach[0])
        return self

    def _strength(self):
        keys = ("peak_intensity", "peak_field", "fluence")
        given = [key for key in keys if getattr(self, key) is not None]
        if not given:
            yield (), ("none of peak_intensity, peak_field, fluence is given; expected one, "
                       "for example peak_intensity: 5e11 W/cm^2")
        for key in given[1:]:
            yield (key,), (f"{given[0]} is given too; expected only one of "
                           "peak_intensity, peak_field, fluence")

    def _shape(self):
        if self.duration is None and self.envelope != "table":
            yield ("duration",), 'missing; expected a time, for example "120 fs"'
        if (self.envelope == "flat-top") != (self.rise is not None):
            yield ("rise",), ("a flat-top envelope needs it, for example rise: 0.2 ps"
                              if self.rise is None else
                              f"belongs to a flat-top envelope, and envelope is {self.envelope}")
        if (self.envelope == "table") != (self.file is not None):
            yield ("file",), ("a table envelope needs it, for example file: shapes/measured.csv"
                              if self.file is None else
                              f"belongs to a table envelope, and envelope is {self.envelope}")
        if self.rise and self.duration and self.rise > self.duration:
            yield ("rise",), (f"{self.rise:g} ps is longer than the duration, {self.duration:g} "
                              "ps, which is the plateau plus one ramp; expected a shorter rise")


class BiasField(Section):
    """A uniform static field; between two times of the last stage, or throughout."""

    vector: Annotated[
        tuple[float, float, float],
        Vector("field", "-1e12 V/m", "1e12 V/m", example="0 0 1e7 V/m"),
    ]
    from_: Moment | None = Field(default=None, alias="from")
    to: Moment | None = None

    @model_validator(mode="after")
    def _ordered(self):
        if (self.from_ is None) != (self.to is None):
            missing, given = ("from", "to") if self.from_ is None else ("to", "from")
            raise Problems(((missing,), f'missing; expected a time, for example "0 ps", because '
                                        f"{given} is given"))
        if self.from_ is not None and not self.from_ < self.to:
            raise Problems((("to",), f"{self.to:g} ps is not after from, {self.from_:g} ps; "
                                     "expected a later time"))
        return self
