"""Even and odd response of a collective observable over time, with its errors and significance.

even = (A₊ + A₋)/2 − A₀ and odd = (A₊ − A₋)/2, start by start after the mean over carrier phases.
Errors and tests: `swirlight.analysis.statistics`; gain of pairing: `swirlight.analysis.twins`.
"""

from dataclasses import dataclass, replace
from functools import cached_property

import numpy as np

from swirlight.analysis.statistics import (
    LEAST_STARTS,
    function_of_means,
    half_width,
    largest_t,
    mean_and_error,
    smallest_p,
    starts_needed,
    studentised_interval,
)
from swirlight.analysis.twins import even_odd, pairing_gain
from swirlight.errors import InputError
from swirlight.results.observables import Observable, find_observable
from swirlight.results.trajectories import Experiment
from swirlight.store.run import open_run

CLEAR, HINT = 0.001, 0.05  # p that is called a detection, and a hint
_PEAK_TIMES = 200  # times looked at for the interval of a peak; more would only take longer
_SEED = 20  # of sign flips and resamples: the same answer at every call


@dataclass(frozen=True)
class Significance:
    """Whether a part along the beam differs from zero, from the beginning of the light on.

    peak_p : that the largest |t| over all times is chance, corrected for looking at all of them;
        peak_t, peak_time [ps] : that |t| and where; smallest_p : the smallest peak_p that so many
        starts can give.
    integrated_p : Student's t of the mean over those times; integrated, integrated_error : it.
    """

    peak_p: float
    peak_t: float
    peak_time: float
    smallest_p: float
    integrated_p: float
    integrated: float
    integrated_error: float


@dataclass(frozen=True)
class Peak:
    """The largest magnitude of a mean over starts, with its sign.

    time [ps], value, error (jackknife), interval (low, high) at 95 %: NaN below 8 starts and
    where the part is not told from zero, whose largest value is only noise.
    """

    time: float
    value: float
    error: float
    interval: tuple


@dataclass(frozen=True)
class Response:
    """Response of one observable.

    observable : Observable; times : (T,) [ps]; unit : of all values.
    plus, minus, dark : (starts, T) or (starts, T, 3), after the mean over carrier phases;
        dark is None without dark runs.
    odd_by_phase : (starts, phases, T) along the beam.
    beam : (3,) k̂; span : (begin, end) of the light [ps]; notes : sentences that belong to it.

    odd, even : means over starts, (T,) or (T, 3); odd_error, even_error : standard errors.
    """

    observable: Observable
    times: np.ndarray
    plus: np.ndarray
    minus: np.ndarray
    dark: np.ndarray | None
    odd_by_phase: np.ndarray
    beam: np.ndarray
    span: tuple
    notes: tuple = ()

    @property
    def unit(self):
        """"hbar", "K", ...; "" for numbers."""
        return self.observable.unit

    @property
    def starts(self):
        """How many starts there are."""
        return len(self.plus)

    @cached_property
    def along(self):
        """The response of the projection on the beam; of a scalar the response itself."""
        if self.plus.ndim == 2:
            return self
        project = [None if a is None else a @ self.beam for a in (self.plus, self.minus, self.dark)]
        return replace(self, plus=project[0], minus=project[1], dark=project[2])

    @cached_property
    def _parts(self):
        even, odd = even_odd(self.plus, self.minus, self.dark)
        return {"odd": odd, "even": even}

    def of_starts(self, part):
        """(starts, T) or (starts, T, 3) of "odd" or "even"; None for even without dark runs."""
        return self._parts[part]

    @cached_property
    def _means(self):
        return {part: (None, None) if values is None else mean_and_error(values)[:2]
                for part, values in self._parts.items()}

    odd = property(lambda self: self._means["odd"][0])
    odd_error = property(lambda self: self._means["odd"][1])
    even = property(lambda self: self._means["even"][0])
    even_error = property(lambda self: self._means["even"][1])

    def half_width(self, part="odd", level=0.95):
        """Half width of the band over starts, like `odd`; NaN for one start."""
        return half_width(self._means[part][1], self.starts, level)

    @property
    def identical(self):
        """Whether plus and minus agree to the last bit at all times."""
        return bool(np.array_equal(self.plus, self.minus))

    @cached_property
    def significance(self):
        """{"odd": Significance, "even": Significance or None} along the beam."""
        return {part: None if values is None else self._significance(values)
                for part, values in self.along._parts.items()}

    @property
    def _lit(self):
        """Index of the first time that the light has reached; the first if none has."""
        row = int(np.searchsorted(self.times, self.span[0]))
        return row if row < len(self.times) else 0

    def _significance(self, values):
        values = values[:, self._lit :]
        p, t, index, _ = largest_t(values, np.random.default_rng(_SEED))
        mean, error, integrated_p = mean_and_error(values.mean(axis=1))
        return Significance(float(p), float(t), float(self.times[self._lit + index]),
                            smallest_p(self.starts), float(integrated_p), float(mean),
                            float(error))

    def peak(self, part="odd"):
        """The `Peak` of "odd" or "even" along the beam."""
        values = self.along.of_starts(part)
        row = int(np.argmax(np.abs(values.mean(axis=0))))
        nothing = (float("nan"), float("nan"))
        if self.starts < 2:
            return Peak(float(self.times[row]), float(values[0, row]), nothing[0], nothing)
        stride = -(-len(self.times) // _PEAK_TIMES)
        some = values[:, np.union1d(np.arange(0, len(self.times), stride), row)]
        value, error = function_of_means(some, _largest)
        interval = nothing
        if self.starts >= LEAST_STARTS and self.significance[part].peak_p < HINT:
            interval = tuple(map(float, studentised_interval(
                some, _largest, np.random.default_rng(_SEED))))
        return Peak(float(self.times[row]), float(value), float(error), interval)

    @cached_property
    def gain(self):
        """(T,) [Var A₊ + Var A₋]/Var(A₊ − A₋) along the beam: how many times fewer starts twins
        need than runs without; infinite while they are identical, 1 when they have parted."""
        return pairing_gain(self.along.plus, self.along.minus)

    @property
    def parted(self):
        """When the gain first falls below 2, as nearly independent trajectories have it [ps];
        None if it never does."""
        apart = np.flatnonzero(self.gain < 2.0)
        return float(self.times[apart[0]]) if len(apart) else None

    @cached_property
    def phase_gain(self):
        """(T,) variance of the odd part of one carrier phase over that of the mean of all of
        them, along the beam; as many independent runs would give their number. None without."""
        phases = self.odd_by_phase.shape[1]
        if phases < 2 or self.starts < 2:
            return None
        single = self.odd_by_phase.var(axis=0, ddof=1).mean(axis=0)
        with np.errstate(divide="ignore", invalid="ignore"):
            return single / self.odd_by_phase.mean(axis=1).var(axis=0, ddof=1)

    def row_at(self, time):
        """Index of the first time not before `time` [ps], or the last there is."""
        return min(int(np.searchsorted(self.times, time - 1e-9)), len(self.times) - 1)

    def figures(self, part="odd", time=None, level=CLEAR):
        """One part along the beam at one time chosen before looking, as plain numbers.

        time : [ps]; the end of the light if not given. Returns {value, error, p (Student's t),
        half_width_95, starts, unit, at, peak, integrated, starts_needed}; None for even without
        dark runs. level : p that starts_needed refers to.
        """
        values = self.along.of_starts(part)
        if values is None:
            return None
        row = self.row_at(self.span[1] if time is None else time)
        mean, error, p = mean_and_error(values[:, row])
        found = self.significance[part]
        return {
            "value": float(mean), "error": float(error), "p": float(p),
            "half_width_95": float(half_width(error, self.starts)), "starts": self.starts,
            "unit": self.unit, "at": {"value": float(self.times[row]), "unit": "ps"},
            "peak": {"p": found.peak_p, "time": found.peak_time, "smallest_p": found.smallest_p},
            "integrated": {"value": found.integrated, "error": found.integrated_error,
                           "p": found.integrated_p},
            "starts_needed": self.starts_needed(level, part=part, time=time),
        }

    def parts(self, time=None, level=CLEAR):
        """{"odd": figures, "even": figures}, without "even" where there are no dark runs."""
        found = {part: self.figures(part, time, level) for part in ("odd", "even")}
        return {part: figures for part, figures in found.items() if figures is not None}

    def starts_needed(self, level=CLEAR, power=0.9, part="odd", time=None):
        """Starts that reach Student's p < level with probability `power` at this pulse, from the
        mean and scatter seen; above `statistics.MANY` it is no advice.

        time : [ps]; the end of the light if not given. MANY + 1 for one start, which shows no
        scatter.
        """
        row = self.row_at(self.span[1] if time is None else time)
        mean, error, _ = mean_and_error(self.along.of_starts(part)[:, row])
        return starts_needed(float(mean), float(error * np.sqrt(self.starts)), level, power)

    def to_xarray(self):
        """An `xarray.Dataset`: odd and even with errors, dark, gain, over `time` (extra `data`)."""
        from swirlight.results.labelled import response_dataset

        return response_dataset(self)


def _largest(means):
    """The value of largest magnitude along the last axis, with its sign."""
    index = np.argmax(np.abs(means), axis=-1)
    return np.take_along_axis(means, index[..., None], -1)[..., 0]


def response(run, observable="angular_momentum"):
    """The `Response` of an observable (names: `swirlight.results.observables`).

    run : of `open_run`, or a folder. Raises InputError for an unknown or unrecorded observable,
    without light, without both lit kinds, and without a complete start.
    """
    return respond(Experiment(run if hasattr(run, "exposures") else open_run(run)), observable)


def respond(experiment, observable):
    """As `response`, of an `Experiment` that are already open."""
    observable = find_observable(observable)
    if not experiment.pulses:
        raise InputError(f"{experiment.run.path}: has no light to respond to")
    experiment.require("plus", "minus")
    first = experiment.first("plus")
    if observable.source not in first:
        raise InputError(f"{experiment.run.path}: {observable.source} was not recorded"
                         f" (record.vectors); there are {', '.join(first.names)}")
    times = first[observable.source].times
    first.close()
    by_phase = experiment.by_phase(observable.read)
    kinds = {kind: values.mean(axis=1) for kind, values in by_phase.items()}
    odd = 0.5 * (by_phase["plus"] - by_phase["minus"])
    if odd.ndim == 4:
        odd = odd @ experiment.beam
    return Response(observable, times, kinds["plus"], kinds["minus"], kinds.get("dark"), odd,
                    experiment.beam, experiment.span, tuple(_notes(experiment, observable, kinds)))


def _notes(experiment, observable, kinds):
    if np.array_equal(kinds["plus"], kinds["minus"]):
        yield "no response: the twins are identical"
    n = len(experiment)
    if n < experiment.wanted:
        yield f"{n} of {experiment.wanted} starts are complete and count"
    if n == 1:
        yield "one start: no error, no statement"
    elif n < LEAST_STARTS:
        yield (f"{n} starts: means carry Student's t; ratios and peaks no interval, which takes"
               f" {LEAST_STARTS}")
    if n > 1 and smallest_p(n) >= CLEAR:
        yield f"with {n} starts the p of a peak cannot be below {smallest_p(n):.2g}"
    if experiment.resolved and observable.symmetry == "polar":
        yield "across the beam the odd part of this vector is the ordinary linear response"
    if experiment.resolved and experiment.phases["plus"] < 2:
        yield ("one carrier phase: terms of odd order in the field are still in it, and scatter"
               " with it")
    if "dark" not in kinds:
        yield "no dark runs: no even part"
