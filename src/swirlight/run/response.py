"""A first, plain even and odd response of a finished run, at one time chosen before looking.

Signals, all projected on the beam k̂ of the first exposed pulse and given per body:
    light_impulse      ∫Σ τ_light dt · k̂ / N    [ħ]
    angular_momentum   Σ L · k̂ / N              [ħ]
    alignment          ⟨P2(axis · k̂)⟩, axis = body z
The time is the end of the light: the first recorded one at which the last exposed pulse has
fallen below 1e-4 of its peak, or the end of the stage.
"""

from dataclasses import dataclass

import numpy as np

from swirlight.analysis.statistics import MANY, half_width, mean_and_error, starts_needed
from swirlight.analysis.twins import even_odd
from swirlight.light.exposure import exposed
from swirlight.units import HBAR

SIGNALS = {"light_impulse": "hbar", "angular_momentum": "hbar", "alignment": ""}
SHOWN = 2000  # rows of a curve; more would only fill memory
DETECTED = "clear detection"
CLEAR, HINT = 0.001, 0.05  # p of the odd part that is called a detection, and a hint


@dataclass(frozen=True)
class Curves:
    """One signal along time over all starts, thinned where there are very many rows.

    rows : (T,) which rows of the files; times : (T,) [ps]; even, odd : (starts, T).
    """

    rows: np.ndarray
    times: np.ndarray
    even: np.ndarray | None
    odd: np.ndarray
    unit: str


def beam(pulses):
    """(3,) k̂ of the first exposed pulse, of the first pulse if none is exposed."""
    return np.array((exposed(pulses) or pulses)[0].direction, float)


def end_of_light(pulses):
    """When the last exposed pulse has fallen below 1e-4 of its peak. [ps]"""
    return max(pulse.span()[1] for pulse in (exposed(pulses) or pulses))


def signal_of(trajectory, signal, k):
    """(T,) one signal of one trajectory, per body."""
    bodies = len(trajectory.mass)
    if signal == "light_impulse":
        return np.asarray(trajectory["light_impulse"]) @ k / HBAR / bodies
    if signal == "angular_momentum":
        return np.asarray(trajectory["total_angular_momentum"]) @ k / HBAR / bodies
    return np.asarray(trajectory["alignment"], float)


def open_all(run, exposures):
    """{(kind, start, phase): Trajectory} of those that are there, each looked through once.

    Their files are closed again, as there may be thousands; reading opens them.
    """
    found = {}
    for e in exposures:
        key = (e.kind, e.start, e.phase)
        if key in run:
            found[key] = run[key]
            found[key].close()
    return found


def collect(run, exposures, read):
    """Kind -> (starts, T): `read(trajectory)` after the mean over carrier phases.

    run : of `open_all`. Only starts of which every exposure is complete count, so that twins
        stay paired.
    """
    names = [(e.kind, e.start, e.phase) for e in exposures]
    there = {key for key in names if key in run and run[key].complete}
    whole = sorted({s for _, s, _ in names} - {key[1] for key in set(names) - there})
    rows = {}

    def read_and_close(trajectory):
        value = read(trajectory)
        trajectory.close()
        return value

    for kind in dict.fromkeys(e.kind for e in exposures):
        rows[kind] = np.array([
            np.mean([read_and_close(run[key]) for key in names if key[:2] == (kind, start)],
                    axis=0)
            for start in whole
        ])
    return rows


def curves(run, exposures, pulses):
    """Signal -> Curves; empty without both lit kinds or without a complete start."""
    if not {"plus", "minus"} <= {e.kind for e in exposures} or not run:
        return {}
    k, found = beam(pulses), {}
    times = next(iter(run.values()))["light_impulse"].times
    rows = _shown(times, pulses)
    for signal, unit in SIGNALS.items():
        kinds = collect(run, exposures, lambda t, s=signal: signal_of(t, s, k)[rows])
        if not len(kinds["plus"]):
            return {}
        parts = even_odd(kinds["plus"], kinds["minus"], kinds.get("dark"))
        found[signal] = Curves(rows, times[rows], *parts, unit)
    return found


def _shown(times, pulses):
    """At most `SHOWN` rows, evenly spread, and that of the end of the light."""
    end = min(int(np.searchsorted(times, end_of_light(pulses) - 1e-9)), len(times) - 1)
    stride = -(-len(times) // SHOWN)
    return np.union1d(np.arange(0, len(times), stride), end)


def at_the_end_of_light(found, pulses):
    """Signal -> {odd, even: {value, error, p, interval, starts, unit, at}} of `curves`."""
    if not found:
        return {}
    times = next(iter(found.values())).times
    row = min(int(np.searchsorted(times, end_of_light(pulses) - 1e-9)), len(times) - 1)
    return {
        signal: {
            part: _figures(values[:, row], curve.unit, float(times[row]))
            for part, values in (("odd", curve.odd), ("even", curve.even)) if values is not None
        }
        for signal, curve in found.items()
    }


def _figures(values, unit, at):
    mean, error, p = mean_and_error(values)
    return {
        "value": float(mean), "error": float(error), "p": float(p),
        "half_width_95": float(half_width(error, len(values))),
        "starts": len(values), "unit": unit, "at": {"value": at, "unit": "ps"},
    }


def verdict(figures):
    """What one odd or even part says, in words."""
    starts = figures["starts"]
    if starts < 2:
        return "one start only: no error, no statement"
    if figures["value"] == 0.0 and figures["error"] == 0.0:
        return "no response: the twins are identical"
    if figures["p"] < CLEAR:
        return DETECTED
    scatter = figures["error"] * np.sqrt(starts)
    needed = max(starts + 1, starts_needed(figures["value"], scatter, CLEAR))
    more = "" if needed > MANY else f"; if it is this large, some {needed} starts would tell"
    return ("a hint" if figures["p"] < HINT else "not told from zero") + more
