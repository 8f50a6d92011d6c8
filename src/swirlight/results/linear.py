"""The zero-intensity limit of a run, told from its dark trajectories, beside what was driven.

    r = linear_response(run, "angular_momentum")
    r.times, r.values, r.errors          predicted from fluctuations in the dark alone
    r.driven, r.driven_errors            the response of the same run, from the same starts
    r.parted_at                          when they part beyond errors, or None

Formulas: `analysis.kubo`. Errors come from the spread over starts: starts are drawn anew with
replacement, kernels averaged, and the whole convolution done again (bootstrap: Efron &
Tibshirani, An Introduction to the Bootstrap, 1993, ch. 6; from memory). Prediction and driven
response share starts, so that their difference is drawn jointly.
"""

from dataclasses import dataclass
from functools import partial

import numpy as np
from scipy import stats
from scipy.ndimage import uniform_filter1d

from swirlight.analysis.kubo import FEWEST, noise_lag
from swirlight.analysis.statistics import LEAST_STARTS, largest_t, mean_and_error
from swirlight.errors import InputError
from swirlight.results.dark import Subject
from swirlight.results.linear_observables import ALIASES, OBSERVABLES
from swirlight.store.run import open_run

RESAMPLES = 400  # an error is then known to 4 %, less than a few starts leave of it
LEVEL = 0.05  # p of "they agree at all times" below which they part
BEYOND = 3.0  # combined standard errors at the time that is named
BLOCK = 2_000_000  # numbers of a kind held at once
FLOOR = 1e-100  # of a variance, so that none is 0
WARM = 0.03  # by which the dark runs may be off the temperature in the formulas
SHARE = 0.05  # of the largest prediction: less is looked at neither as response nor as parting


@dataclass(frozen=True)
class LinearResponse:
    """A response at its lowest order in intensity, as the dark runs tell it.

    observable, part ("odd" or "even"), unit; label : "linear response", or "estimate" where
    the formula is not exact; intensity : peak of the strongest exposed pulse [W/cm²].
    times : (T,) [ps]; values, errors : (T,) per body, standard errors over starts.
    starts : how many; lag : where the kernels were cut. [ps]
    driven, driven_errors : (T,) the response of the lit runs, None where a kind is missing.
    ratio, ratio_error : driven over predicted, weighted least squares over all times; NaN of one
        start.
    p : of "they agree", twice the smaller of the p of ratio 1 and of the largest |t| over times,
    NaN below 8 starts; parted_at : first time at which they do not [ps], or None.
    notes : sentences that the reader must see.
    """

    observable: str
    part: str
    unit: str
    label: str
    intensity: float
    times: np.ndarray
    values: np.ndarray
    errors: np.ndarray
    starts: int
    lag: float
    driven: np.ndarray | None
    driven_errors: np.ndarray | None
    ratio: float
    ratio_error: float
    p: float
    parted_at: float | None
    notes: tuple

    def to_xarray(self):
        """An `xarray.Dataset` over `time` with predicted and driven curves (extra `data`).

        Raises InputError where xarray is not installed.
        """
        from swirlight.store.labelled import xarray

        curves = {"predicted": self.values, "predicted_error": self.errors,
                  "driven": self.driven, "driven_error": self.driven_errors}
        attributes = {"units": self.unit}
        return xarray.Dataset(
            {name: ("time", curve, attributes) for name, curve in curves.items()
             if curve is not None},
            {"time": ("time", self.times, {"units": "ps"})},
            {"observable": self.observable, "part": self.part, "label": self.label,
             "starts": self.starts, "notes": "; ".join(self.notes)},
        )


@dataclass(frozen=True)
class LinearRange:
    """The same observable over several intensities.

    responses : a LinearResponse of each run, by rising intensity.
    departs_at : lowest intensity at which driven and predicted part [W/cm²], or None.
    """

    responses: tuple
    departs_at: float | None


def linear_response(run, observable="angular_momentum", longest_lag=None):
    """The LinearResponse of a run.

    run : Run, or path of one. observable : a name of `linear_observables.OBSERVABLES`, or of the
    recorded total. longest_lag : where kernels are cut [ps]; None: once they are noise.
    Raises InputError for an unknown observable, one that dark runs cannot tell, or runs about
    which linear response says nothing (no dark kind, a bias field, nothing recorded).
    """
    run = run if hasattr(run, "exposures") else open_run(run)
    name = ALIASES.get(observable, observable)
    if name not in OBSERVABLES:
        raise InputError(f"observable {observable!r}: expected one of {', '.join(OBSERVABLES)}")
    subject = Subject(run)
    kind = OBSERVABLES[name]
    parts = kind.contributions(subject)
    kernels = _kernels(subject, parts)
    lags = {n: _lags(subject, k, longest_lag) for n, k in kernels.items()}
    cut = {n: k[:, : lags[n]] for n, k in kernels.items()}
    scale = kind.scale(subject)

    def predict(means):
        """(..., T) of kernels averaged over starts."""
        nothing = np.zeros(len(subject.instants))
        return scale * sum((p.predict(means) for p in parts), nothing)[..., :: subject.finer]

    driven, rows = _driven(subject, kind)
    rows = np.arange(len(subject.times)) if driven is None else rows
    return _result(subject, name, predict, cut, driven, rows,
                   max(lags.values(), default=0) * subject.interval,
                   _notes(subject, parts, kernels, lags))


def linear_overview(run, longest_lag=None):
    """[LinearResponse] of everything that the light of a run moves and its dark runs can tell.

    Raises InputError as `linear_response` where that is nothing at all.
    """
    found, refusals = [], []
    for name in OBSERVABLES:
        try:
            found.append(linear_response(run, name, longest_lag))
        except InputError as refusal:
            refusals.append(refusal)
    if not found:
        raise refusals[0]
    return [r for r in found if r.values.any()] or found


def linear_range(runs, observable="angular_momentum", longest_lag=None):
    """The LinearRange of runs (or paths) that differ in intensity only."""
    responses = sorted((linear_response(r, observable, longest_lag) for r in runs),
                       key=lambda r: r.intensity)
    parted = [r.intensity for r in responses if r.parted_at is not None]
    return LinearRange(tuple(responses), min(parted, default=None))


def _kernels(subject, parts):
    """{name: (starts, T)} of the dark trajectories."""
    wanted = {name: read for p in parts for name, read in p.sums.items()}
    found = []
    for start in subject.starts.numbers if wanted else ():
        phases = []
        for key in subject.starts.keys("dark", start):
            sums = subject.sums(subject.run[key], wanted)
            phases.append({n: k for p in parts for n, k in p.kernels(sums).items()})
        found.append({n: np.mean([one[n] for one in phases], axis=0) for n in phases[0]})
    return {n: np.array([one[n] for one in found]) for n in (found[0] if found else ())}


def _lags(subject, kernels, longest):
    if longest is None:
        return noise_lag(kernels)
    return int(np.clip(round(longest / subject.interval) + 1, FEWEST, kernels.shape[-1]))


def _driven(subject, kind):
    """(starts, T) of the lit runs, and the frames that they belong to; (None, None) without."""
    needed = ("plus", "minus") if kind.part == "odd" else ("plus", "minus", "dark")
    if not set(needed) <= set(subject.starts.phases):
        return None, None
    seen, steps = {}, None
    for which in needed:
        rows = []
        for start in subject.starts.numbers:
            phases = []
            for key in subject.starts.keys(which, start):
                trajectory = subject.run[key]
                values, steps = kind.driven(subject, trajectory)
                trajectory.close()
                phases.append(values)
            rows.append(np.mean(phases, axis=0))
        seen[which] = np.array(rows)
    _, frames, totals = np.intersect1d(subject.steps, steps, return_indices=True)
    plus, minus = seen["plus"][:, totals], seen["minus"][:, totals]
    if kind.part == "odd":
        return 0.5 * (plus - minus), frames
    return 0.5 * (plus + minus) - seen["dark"][:, totals], frames


def _resampled(predict, kernels, driven, counts, rows, instants):
    """predicted (b, T) and driven (b, T) of starts weighted by counts (b, n)."""
    weights = counts / counts.sum(axis=1, keepdims=True)
    predicted, some = np.empty((len(counts), len(rows))), max(1, BLOCK // instants)
    for begin in range(0, len(counts), some):
        part = slice(begin, begin + some)
        predicted[part] = predict({n: weights[part] @ k for n, k in kernels.items()})[..., rows]
    return predicted, None if driven is None else weights @ driven


def _result(subject, name, predict, kernels, driven, rows, lag, notes):
    kind, starts = OBSERVABLES[name], len(subject.starts.numbers)
    drawn_with = partial(_resampled, predict, kernels, driven, rows=rows,
                         instants=len(subject.instants))
    whole, lit = (x if x is None else x[0] for x in drawn_with(np.ones((1, starts))))
    nothing = np.full(len(rows), np.nan)
    errors, lit_errors, between, ratio_error = nothing, nothing, nothing, np.nan
    p, parted, ratio = np.nan, None, np.nan
    there = None if lit is None else _there(whole, lit)
    if starts > 1:
        random = np.random.default_rng(starts)
        counts = random.multinomial(starts, np.full(starts, 1 / starts), RESAMPLES)
        drawn, lit_drawn = drawn_with(counts)
        spread = np.sqrt(starts / (starts - 1))  # a resample varies by (n − 1)/n too little
        errors = spread * drawn.std(axis=0) if kernels else np.zeros(len(rows))
        if lit is not None:
            lit_errors = spread * lit_drawn.std(axis=0)
        if lit is not None and whole.any():  # else there is nothing to compare with
            between = spread * (lit_drawn - drawn).std(axis=0)
            without = drawn_with(1.0 - np.eye(starts))
            pseudo = starts * (lit - whole) - (starts - 1) * (without[1] - without[0])
            weights = _weights(np.vstack([np.ones(starts), counts]), pseudo, there)
            ratio = float(_ratio(lit, whole, weights[0]))
            ratio_error = float(spread * np.std(_ratio(lit_drawn, drawn, weights[1:])))
        if lit is not None and whole.any() and starts >= LEAST_STARTS:
            p = min(largest_t(pseudo[:, there], random)[0], _p_of_ratio(ratio, ratio_error, starts))
            p = float(min(1.0, 2.0 * p))  # the better of two tests
            parted = _parted(subject.times[rows], lit - whole, between, whole, p)
    return LinearResponse(
        name, kind.part, kind.unit, kind.label(subject), subject.intensity, subject.times[rows],
        whole, errors, starts, lag, lit, None if lit is None else lit_errors, ratio, ratio_error,
        p, parted, notes)


def _ratio(driven, predicted, weights):
    """Least squares over time, (...,); NaN where nothing is predicted."""
    with np.errstate(divide="ignore", invalid="ignore"):
        return (driven * predicted * weights).sum(axis=-1) / (predicted**2 * weights).sum(axis=-1)


def _p_of_ratio(ratio, error, starts):
    """Two-sided p of "the ratio is 1", Student's t; 1 where there is no error."""
    return 2.0 * stats.t.sf(abs(ratio - 1.0) / error, starts - 1) if error > 0.0 else 1.0


def _weights(counts, differences, there):
    """(b, T) of the times in a ratio: variances⁻¹ over starts, 0 before there is a response.

    counts : (b, n) starts of each sample, the first of all once; differences : (n, T).
    Variances of few starts are rough, and those that chance makes small must not decide: they
    are averaged over a fifth of the time, and drawn anew with the starts, so that their noise
    is part of the ratio's error.
    """
    share = counts / counts.sum(axis=1, keepdims=True)
    variance = share @ differences**2 - (share @ differences) ** 2
    variance = uniform_filter1d(variance, max(3, variance.shape[-1] // 5), mode="nearest")
    floor = 1e-3 * variance[:1] + 1e-12 * variance[0].max() + FLOOR  # one start drawn n times
    return there / np.maximum(variance, floor)


def _there(predicted, driven):
    """The times at which there is a response; before it rounding would be looked at."""
    floor = SHARE * np.abs(predicted).max(initial=0.0)
    there = (np.abs(predicted) > floor) | (np.abs(driven) > floor)
    return there if there.any() else np.ones_like(there)


def _parted(times, difference, errors, predicted, p):
    """The first time at which the difference is beyond errors and no trifle, or None."""
    if p >= LEVEL:
        return None
    size, largest = np.abs(difference), np.abs(predicted).max(initial=0.0)
    beyond = (size > BEYOND * errors) & (size > SHARE * largest)
    return float(times[beyond][0]) if beyond.any() else None


def _notes(subject, parts, kernels, lags):
    said, starts = [], len(subject.starts.numbers)
    if not parts or (not kernels and all(p.sums for p in parts)):
        said.append("at lowest order this light does not move it: no such response tensor in the"
                    " species")
    for n, kernel in kernels.items():
        length = kernel.shape[1]
        if lags[n] >= 4 * length // 5:
            said.append(f"the {n.rstrip(' 0123456789')} kernel has not died away in the record:"
                        f" what is older than {lags[n] * subject.interval:.3g} ps is left out")
    off, error = _off_temperature(subject)
    if abs(off) > WARM and abs(off) > 3 * error:
        said.append(f"rotation in the dark runs is {100 * off:+.0f} % off the temperature that kT"
                    " is taken from: they were not in equilibrium")
    if starts == 1:
        said.append("1 start: no errors")
    elif starts < LEAST_STARTS:
        said.append(f"{starts} starts: the errors are rough themselves, and whether curves part is"
                    f" not told; {LEAST_STARTS} are needed")
    return tuple(said)


def _off_temperature(subject):
    """Rotational temperature of the dark runs over that of the config, less 1; its error."""
    found = []
    for start in subject.starts.numbers:
        trajectory = subject.run["dark", start]
        found.append(np.mean(trajectory["temperature_rotation"]))
        trajectory.close()
    mean, error, _ = mean_and_error(np.array(found) / subject.system.temperature - 1.0)
    return float(mean), float(np.nan_to_num(error))
