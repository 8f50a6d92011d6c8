"""Pulses: 𝓔(t), the complex amplitude of E(t) = Re[𝓔(t) exp(−iωt)] at the sample.

The time of the envelope, of the turning azimuth and of the carrier all count from the pulse's
own centre, so the copies of a train are exact. `phase` φ multiplies 𝓔 by exp(−iφ).
Internal units throughout; intensities and fluences (W/cm², J/cm²) enter and leave here.
No numba here, `swirlight check` needs this module.
"""

from dataclasses import dataclass
from math import cos, pi, sin, sqrt

import numpy as np

from swirlight.light.envelope import FAINT, Envelope
from swirlight.light.polarisation import jones, transverse_axes
from swirlight.units import LIGHT_SPEED, PICOSECOND, VACUUM_PERMITTIVITY, WATT_PER_CM2

SECOND = 1.0 / PICOSECOND  # ps


def amplitude_of_intensity(intensity, refractive_index=1.0):
    """|𝓔| inside the sample for I = ½ ε0 c n |𝓔|². [W/cm²] -> [u nm/ps²/e]"""
    return sqrt(2.0 * intensity * WATT_PER_CM2
                / (VACUUM_PERMITTIVITY * LIGHT_SPEED * refractive_index))


def intensity_of_amplitude(amplitude, refractive_index=1.0):
    """I = ½ ε0 c n |𝓔|² inside the sample. [u nm/ps²/e] -> [W/cm²]"""
    return (0.5 * VACUUM_PERMITTIVITY * LIGHT_SPEED * refractive_index * amplitude**2
            / WATT_PER_CM2)


def intensity_of_fluence(fluence, envelope):
    """Peak intensity of a pulse that delivers `fluence`. [J/cm²] -> [W/cm²]"""
    return fluence / (envelope.fluence_factor * envelope.duration / SECOND)


@dataclass(frozen=True)
class Pulse:
    """One pulse, or a train of equal ones.

    carrier : ω. [rad/ps]
    amplitude : |𝓔| at the peak, in the sample, without local field. [u nm/ps²/e]
    envelope : Envelope, in its resolved form when `coupling` is "resolved".
    centre : of the first copy, from the start of the lit stage. [ps]
    ellipticity, azimuth, phase : χ, ψ0, φ. [rad]
    turning : (ν, β) of ψ(t) = ψ0 + νt + ½βt². [rad/ps], [rad/ps²]
    direction : k̂, three numbers of unit length.
    count, period : copies of a train and the time between them. [1], [ps]
    coupling : "averaged" or "resolved"; reason: why, in words.
    refractive_index : n at the carrier.
    local_field : "none" or "lorentz".
    in_kinds : "exposed", or "same" for a probe that every exposure leaves alone.
    mirror : normal of a plane in which the pulse is reflected (exposures), or None.
    """

    carrier: float
    amplitude: float
    envelope: Envelope
    centre: float
    ellipticity: float = pi / 4.0
    azimuth: float = 0.0
    turning: tuple[float, float] = (0.0, 0.0)
    phase: float = 0.0
    direction: tuple[float, float, float] = (0.0, 0.0, 1.0)
    count: int = 1
    period: float = 0.0
    coupling: str = "averaged"
    reason: str = ""
    refractive_index: float = 1.0
    local_field: str = "none"
    in_kinds: str = "exposed"
    mirror: tuple[float, float, float] | None = None

    @property
    def intensity(self):
        """Peak intensity in the sample. [W/cm²]"""
        return intensity_of_amplitude(self.amplitude, self.refractive_index)

    @property
    def fluence(self):
        """Of one copy, from the envelope. [J/cm²]"""
        return (self.intensity * self.envelope.fluence_factor
                * self.envelope.duration / SECOND)

    @property
    def peak_field(self):
        """Largest |E(t)|, |𝓔| cos χ. [u nm/ps²/e]"""
        return self.amplitude * cos(self.ellipticity)

    @property
    def s3(self):
        """sin 2χ as the sample sees it: +1 for helicity +1. [1]"""
        return sin(2.0 * self.ellipticity) * (1.0 if self.mirror is None else -1.0)

    @property
    def beam(self):
        """k̂ as the sample sees it, (3,): G = s3 |𝓔|² k̂."""
        k = np.array(self.direction)
        return k if self.mirror is None else _reflected(k, np.array(self.mirror))

    @property
    def local_factor(self):
        """Field at a body over the field in the sample; Lorentz: (n² + 2)/3. [1]"""
        return (self.refractive_index**2 + 2.0) / 3.0 if self.local_field == "lorentz" else 1.0

    @property
    def centres(self):
        """(count,) centre of every copy. [ps]"""
        return self.centre + self.period * np.arange(self.count)

    def span(self, level=1e-4):
        """(begin, end) of the light: where it first and last exceeds `level` of its peak. [ps]"""
        before, after = self.envelope.reach(level)
        return self.centre - before, float(self.centres[-1]) + after

    def azimuth_at(self, t):
        """ψ, t from the pulse centre. [rad]"""
        rate, acceleration = self.turning
        return self.azimuth + (rate + 0.5 * acceleration * t) * t

    def amplitude_at(self, t):
        """𝓔 exp(iφ) of one copy, complex [..., 3]; t from its centre. [u nm/ps²/e]

        Exactly 0 where the intensity is below `FAINT` of its peak.
        """
        t = np.asarray(t, float)
        vector, _ = jones(self.ellipticity, self.azimuth_at(t), *transverse_axes(self.direction))
        shape = np.where(self._near(t), self.envelope.amplitude(t), 0.0)
        return self._seen((self.amplitude * shape)[..., None] * vector)

    def derivatives_at(self, t):
        """𝓔, 𝓔̇, 𝓔̈ times exp(iφ) of one copy, complex [3, ..., 3]; t from its centre."""
        t = np.asarray(t, float)
        rate, acceleration = self.turning
        speed = (rate + acceleration * t)[..., None]
        j, by_azimuth = jones(self.ellipticity, self.azimuth_at(t),
                              *transverse_axes(self.direction))
        j1, j2 = speed * by_azimuth, acceleration * by_azimuth - speed**2 * j
        shape = np.where(self._near(t), self.envelope.derivatives(t), 0.0)
        a, a1, a2 = (self.amplitude * shape)[..., None]
        return self._seen(np.stack([a * j, a1 * j + a * j1, a2 * j + 2.0 * a1 * j1 + a * j2]))

    def _near(self, t):
        before, after = self.envelope.reach(FAINT)
        slack = 1e-9 * self.envelope.duration  # an edge that only rounding has put beyond itself
        return (t >= -before - slack) & (t <= after + slack)

    def _seen(self, vector):
        return vector if self.mirror is None else _reflected(vector, np.array(self.mirror))


def _reflected(vector, normal):
    return vector - 2.0 * (vector @ normal)[..., None] * normal


@dataclass(frozen=True)
class Bias:
    """A static field, on from `begin` until `end`; without times always and in every stage.

    vector : F. [u nm/ps²/e]
    begin, end : from the start of the lit stage. [ps]
    """

    vector: tuple[float, float, float]
    begin: float = -np.inf
    end: float = np.inf

    @property
    def always(self):
        """Whether it is on in every stage."""
        return self.begin == -np.inf and self.end == np.inf

    def field(self, times):
        """F at each time, [T, 3]."""
        times = np.asarray(times, float)
        on = (times >= self.begin) & (times < self.end)
        return on[..., None] * np.array(self.vector)
