"""Envelopes: how the intensity of a pulse rises and falls.

An envelope knows f(t) = I(t)/I(peak), t from the pulse centre, and the amplitude a = √f that
multiplies |𝓔|. `duration` τ is always the full width at half maximum of f. Adding an envelope
means one class here and its line in `ENVELOPES`.

Averaged light needs f only. Carrier-resolved light is E = −dA/dt and needs a, da/dt and
d²a/dt²: `resolved` returns the envelope that has them (rectangles and tables jump, so theirs
rise and fall over half a cycle of the carrier, inside their length).

Times in ps; no numba here, `swirlight check` needs this module.
"""

from dataclasses import dataclass
from math import asin, inf, log, pi, sqrt

import numpy as np

from swirlight.errors import InputError

# Below this fraction of its peak intensity a pulse counts as absent (1e-12 of its amplitude):
# Gaussians have no end, but copies of a train and dark stretches can then be skipped exactly.
FAINT = 1e-24
MOST_KNOTS = 200_000  # of a smoothed table


@dataclass(frozen=True)
class Envelope:
    """A symmetric envelope; subclasses give the shape.

    duration : τ, FWHM of the intensity. [ps]
    """

    duration: float

    name = ""
    fluence_factor = 1.0  # ∫f dt / τ

    def intensity(self, t):
        """f(t), relative to the peak, same shape as t."""
        raise TypeError(f"{type(self).__name__} has no shape of its own")

    def amplitude(self, t):
        """a(t) = √f, same shape as t."""
        return np.sqrt(self.intensity(t))

    def derivatives(self, t):
        """a, da/dt, d²a/dt² as one array [3, ...]; in 1, 1/ps, 1/ps². Smooth envelopes only."""
        raise TypeError(f"a {self.name} envelope has jumps: use its resolved form")

    def reach(self, level):
        """(before, after): how far from the centre f first and last exceeds `level`; 0: whole."""
        raise TypeError(f"{type(self).__name__} has no shape of its own")

    @property
    def default_centre(self):
        """Where the centre goes when the config leaves it out, from the start of the stage."""
        return self.reach(0.0)[0]

    def resolved(self, carrier):
        """The smooth form that carrier-resolved light uses; carrier in rad/ps."""
        return self


@dataclass(frozen=True)
class Gaussian(Envelope):
    """f = exp(−4 ln2 (t/τ)²); fluence √(π/(4 ln2)) I0 τ = 1.06447 I0 τ."""

    name = "gaussian"
    fluence_factor = sqrt(pi / (4.0 * log(2.0)))

    def intensity(self, t):
        return np.exp(-4.0 * log(2.0) * np.square(np.asarray(t) / self.duration))

    def derivatives(self, t):
        rate = 4.0 * log(2.0) / self.duration**2
        t = np.asarray(t, float)
        a = np.exp(-0.5 * rate * t * t)
        return np.stack([a, -rate * t * a, (rate * rate * t * t - rate) * a])

    def reach(self, level):
        side = self.duration * sqrt(log(1.0 / level) / (4.0 * log(2.0))) if level > 0.0 else inf
        return side, side

    @property
    def default_centre(self):
        return 2.5 * self.duration


@dataclass(frozen=True)
class Sech2(Envelope):
    """f = sech²(t/T), T = τ/(2 ln(1+√2)); fluence 2T I0 = 1.13459 I0 τ."""

    name = "sech2"
    fluence_factor = 1.0 / log(1.0 + sqrt(2.0))

    @property
    def scale(self):
        """T. [ps]"""
        return self.duration / (2.0 * log(1.0 + sqrt(2.0)))

    def intensity(self, t):
        return np.square(self.amplitude(t))

    def amplitude(self, t):
        falling = np.exp(-np.abs(np.asarray(t, float)) / self.scale)  # never overflows, cosh would
        return 2.0 * falling / (1.0 + falling * falling)

    def derivatives(self, t):
        a = self.amplitude(t)
        slope = -a * np.tanh(np.asarray(t, float) / self.scale)
        return np.stack([a, slope / self.scale, a * (1.0 - 2.0 * a * a) / self.scale**2])

    def reach(self, level):
        # sech x = √level, solved for e^x
        side = self.scale * log((1.0 + sqrt(1.0 - level)) / sqrt(level)) if level > 0.0 else inf
        return side, side

    @property
    def default_centre(self):
        return 3.1 * self.duration


@dataclass(frozen=True)
class FlatTop(Envelope):
    """Plateau between two sin² ramps of the intensity, each `rise` long; τ = plateau + one ramp."""

    rise: float = 0.0

    name = "flat-top"

    def __post_init__(self):
        if not 0.0 < self.rise <= self.duration:
            raise InputError(
                f"rise of a flat-top pulse: {self.rise:g} ps; it must be positive and at most the"
                f" duration ({self.duration:g} ps), which is the plateau plus one ramp"
            )

    def _ramp(self, t):
        """How far up the ramp, 0 … 1."""
        half = 0.5 * (self.duration + self.rise)
        return np.clip((half - np.abs(np.asarray(t, float))) / self.rise, 0.0, 1.0)

    def intensity(self, t):
        return np.square(self.amplitude(t))

    def amplitude(self, t):
        return np.sin(0.5 * pi * self._ramp(t))

    def derivatives(self, t):
        x = self._ramp(t)
        a = np.sin(0.5 * pi * x)
        rate = 0.5 * pi / self.rise
        ramping = (x > 0.0) & (x < 1.0)
        slope = np.where(ramping, -np.sign(t) * rate * np.cos(0.5 * pi * x), 0.0)
        return np.stack([a, slope, np.where(ramping, -rate * rate * a, 0.0)])

    def reach(self, level):
        side = 0.5 * (self.duration + self.rise) - self.rise * asin(sqrt(level)) * 2.0 / pi
        return side, side


@dataclass(frozen=True)
class Rectangle(Envelope):
    """f = 1 for |t| < τ/2, ½ at the two edges, so that steps that meet them sum to exactly τ."""

    name = "rectangle"

    def intensity(self, t):
        beyond = np.abs(np.asarray(t, float)) / (0.5 * self.duration) - 1.0
        return np.where(np.abs(beyond) < 1e-9, 0.5, (beyond < 0.0) * 1.0)

    def reach(self, level):
        return 0.5 * self.duration, 0.5 * self.duration

    def resolved(self, carrier):
        return RampedRectangle(self.duration, min(pi / carrier, 0.5 * self.duration))


@dataclass(frozen=True)
class RampedRectangle(Envelope):
    """A rectangle whose *amplitude* rises and falls as sin², `rise` long, inside its length.

    The whole length stays `duration`, so the light still fits where the rectangle did; at half
    the maximum of f it is 1.272 ramps shorter. E is continuous.
    """

    rise: float = 0.0

    name = "rectangle"

    @property
    def fluence_factor(self):
        """∫f dt / duration: the plateau, and 3/8 of each ramp."""
        return 1.0 - 1.25 * self.rise / self.duration

    def _ramp(self, t):
        beyond = 0.5 * self.duration - np.abs(np.asarray(t, float))
        return np.clip(beyond / self.rise, 0.0, 1.0)

    def intensity(self, t):
        return np.square(self.amplitude(t))

    def amplitude(self, t):
        return np.square(np.sin(0.5 * pi * self._ramp(t)))

    def derivatives(self, t):
        x = self._ramp(t)
        rate = pi / self.rise
        curve = np.where((x > 0.0) & (x < 1.0), 0.5 * rate * rate * np.cos(pi * x), 0.0)
        slope = -np.sign(t) * 0.5 * rate * np.sin(pi * x)
        return np.stack([self.amplitude(t), slope, curve])

    def reach(self, level):
        side = 0.5 * self.duration - self.rise * asin(level**0.25) * 2.0 / pi
        return side, side


@dataclass(frozen=True)
class Table(Envelope):
    """Straight lines between given points; the centre is the middle of the half maximum.

    times, values : the points, in any unit of time; the time axis is stretched so that the
        outermost half-maximum points are τ apart, the values scaled to peak 1.
    Outside the points there is no light; a duration of None keeps the times, read as ps.
    """

    duration: float | None
    times: tuple[float, ...] = ()
    values: tuple[float, ...] = ()

    name = "table"

    def __post_init__(self):
        t, f = np.asarray(self.times, float), np.asarray(self.values, float)
        if t.ndim != 1 or t.shape != f.shape or t.size < 2 or not np.isfinite([t, f]).all():
            raise InputError("an envelope table needs two columns of finite numbers, two rows or"
                             " more: time, relative intensity")
        if (np.diff(t) <= 0.0).any() or (f < 0.0).any() or not f.max() > 0.0:
            raise InputError("an envelope table needs rising times and intensities that are"
                             " nowhere negative and somewhere positive")
        f = f / f.max()
        first, last = _crossings(t, f, 0.5)
        width = last - first
        if not width > 0.0:
            raise InputError("the table's intensity has no width at half its maximum")
        stretch = 1.0 if self.duration is None else self.duration / width
        object.__setattr__(self, "duration", width * stretch)
        object.__setattr__(self, "times", tuple(float(x) for x in (t - 0.5 * (first + last))
                                                * stretch))
        object.__setattr__(self, "values", tuple(float(x) for x in f))

    @property
    def fluence_factor(self):
        """∫f dt / τ, exact for straight lines."""
        return float(np.trapezoid(self.values, self.times)) / self.duration

    def intensity(self, t):
        return np.interp(t, self.times, self.values, left=0.0, right=0.0)

    def reach(self, level):
        first, last = _crossings(np.array(self.times), np.array(self.values), level)
        return -first, last

    def resolved(self, carrier):
        return _smoothed(self, pi / carrier)


@dataclass(frozen=True)
class SmoothTable(Envelope):
    """A table's amplitude for resolved light: smoothed and ramped over half a cycle.

    A cubic spline of 40 knots a cycle, flat and zero at both ends of the table, so A and dA/dt
    are continuous everywhere.
    """

    times: tuple[float, ...] = ()
    amplitudes: tuple[float, ...] = ()

    name = "table"

    def __post_init__(self):
        from scipy.interpolate import CubicSpline  # slow to import, and only tables need it

        spline = CubicSpline(self.times, self.amplitudes, bc_type="clamped")
        object.__setattr__(self, "_parts", (spline, spline.derivative(), spline.derivative(2)))

    @property
    def fluence_factor(self):
        """∫f dt / τ by Simpson's rule on the knots and the points between."""
        t = np.array(self.times)
        f, mid = np.square(self.amplitudes), self.intensity(0.5 * (t[1:] + t[:-1]))
        area = (np.diff(t) * (f[1:] + 4.0 * mid + f[:-1]) / 6.0).sum()
        return float(area) / self.duration

    def intensity(self, t):
        return np.square(self.amplitude(t))

    def amplitude(self, t):
        return self.derivatives(t)[0]

    def derivatives(self, t):
        inside = (np.asarray(t) > self.times[0]) & (np.asarray(t) < self.times[-1])
        return np.stack([np.where(inside, part(t), 0.0) for part in self._parts])

    def reach(self, level):
        first, last = _crossings(np.array(self.times), np.square(self.amplitudes), level)
        return -first, last


def _smoothed(table, window):
    """The table's amplitude averaged with a half sine `window` long (half a cycle), and ramped
    by sin² over as much at both ends, inside its length."""
    begin, end = table.times[0], table.times[-1]
    knots = int(np.ceil(20.0 * (end - begin) / window)) + 1
    if knots > MOST_KNOTS:
        raise InputError(f"a resolved table of {knots // 40} cycles of the carrier is too long;"
                         f" at most {MOST_KNOTS // 40}")
    t = np.linspace(begin, end, max(knots, 41))
    offsets, weights = np.polynomial.legendre.leggauss(32)
    weights = weights * np.cos(0.5 * pi * offsets)
    weights /= weights.sum()
    a = sum(w * table.amplitude(t + 0.5 * window * x)
            for w, x in zip(weights, offsets, strict=True))
    ramp = np.minimum(t - begin, end - t) / min(window, 0.5 * (end - begin))
    a *= np.square(np.sin(0.5 * pi * np.clip(ramp, 0.0, 1.0)))
    a[0] = a[-1] = 0.0
    return SmoothTable(table.duration, tuple(t.tolist()), tuple((a / a.max()).tolist()))


def _crossings(t, f, level):
    """First and last time at which the lines through (t, f) exceed `level` (0: the whole table)."""
    if level <= 0.0:
        return t[0], t[-1]
    above = np.flatnonzero(f > level)
    if above.size == 0:  # only the very peak is left
        return t[f.argmax()], t[f.argmax()]
    i, j = above[0], above[-1]
    first = t[0] if i == 0 else t[i] - (f[i] - level) / (f[i] - f[i - 1]) * (t[i] - t[i - 1])
    last = t[-1] if j == t.size - 1 else t[j] + (f[j] - level) / (f[j] - f[j + 1]) * (
        t[j + 1] - t[j])
    return float(first), float(last)


ENVELOPES = {shape.name: shape for shape in (Gaussian, Sech2, FlatTop, Rectangle, Table)}


def make_envelope(name, duration, rise=None, table=None):
    """The envelope called `name`.

    duration, rise : [ps]; rise is for "flat-top" and is required there.
    table : (times, values) for "table".
    Raises InputError for an unknown name, or parts that do not belong together.
    """
    if name not in ENVELOPES:
        raise InputError(f"envelope: {name!r}; there are {', '.join(ENVELOPES)}")
    if (rise is None) == (name == "flat-top"):
        raise InputError("rise: a flat-top envelope needs it, for example 'rise: 0.2 ps', and"
                         " no other has it")
    if (table is None) == (name == "table"):
        raise InputError("file: a table envelope needs it, and no other has it")
    if name == "flat-top":
        return FlatTop(duration, rise)
    if name == "table":
        return Table(duration, *table)
    return ENVELOPES[name](duration)


