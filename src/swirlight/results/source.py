"""The trajectories that a spectrum is made from, and their correlation functions."""

import numpy as np

from swirlight.analysis import spectra
from swirlight.analysis.statistics import function_of_means
from swirlight.errors import InputError
from swirlight.results.spectral import Curve, Spectrum
from swirlight.results.starts import complete_starts

SHARE = 8  # the longest lag is this part of the record when nothing is said
FEWEST, PIECES = 4, 8  # pieces of the record of a single start, for its errors
FADED = 0.05  # of C(0): below it a correlation counts as over


class Source:
    """The trajectories of one kind that count, and how correlation functions are taken.

    run : Run; kind; window; longest_lag : [ps] or None for a share of the record.
    wanted : the name of the recorded quantity whose clock holds.
    Raises InputError when there is nothing to read, or the lag does not fit.
    """

    def __init__(self, run, kind, wanted, window, longest_lag):
        if window not in spectra.WINDOWS:
            raise InputError(f"no window {window!r}; there are {', '.join(spectra.WINDOWS)}")
        self.run, self.kind, self.window = run, kind, window
        self.groups, self._said = trajectories(run, kind)
        self.first = self.groups[0][0]
        series = quantity(self.first, wanted)
        self.interval, self.frames = series.interval, len(series)
        self.lags = self._lags(longest_lag)
        self.resolution = spectra.resolution(window, self.longest_lag)
        self.frequencies, self.size = spectra.grid(self.lags, self.interval, self.resolution)
        self.temperature = float(np.mean([np.mean(t["temperature"]) for g in self.groups
                                          for t in g]))
        self.bodies, self.volume = len(self.first.mass), float(np.prod(self.first.box))

    longest_lag = property(lambda self: self.lags * self.interval)
    starts = property(lambda self: len(self.groups))

    @property
    def pieces(self):
        """Into how many pieces each record is cut for the errors."""
        possible = min(PIECES, self.frames // (2 * self.lags))
        return 1 if self.starts > 1 or possible < FEWEST else possible

    def note(self, sentence):
        """Say something of this source in the notes."""
        self._said.append(sentence)

    def _lags(self, longest):
        share = self.frames // SHARE
        lags = share if longest is None else round(longest / self.interval)
        if not 4 <= lags <= self.frames // 2:
            raise InputError(
                f"longest_lag: {lags * self.interval:.4g} ps does not fit the record, which has"
                f" {self.frames} frames, {self.interval:g} ps apart: at least 4 frames and at most"
                " half of it")
        return lags

    @property
    def driven(self):
        """Why this kind is no equilibrium liquid, "" if it is one."""
        light = self.first.parameters.get("light")
        if light:
            return "light acts in it"
        return "a bias field acts in it" if self.run.config.bias_field is not None else ""

    def correlations(self, read, summed=True):
        """(C of the mean over starts (lags, ...), samples (n, lags, ...)).

        read : (Trajectory) -> iterable of blocks (frames, bodies, components); the mean over
        bodies is taken, and the sum over components where `summed`.
        n samples: one a start, or pieces of the record of a single one.
        """
        found = []
        for group in self.groups:
            phases = [spectra.autocorrelation(read(t), self.lags, self.pieces) for t in group]
            for trajectory in group:
                trajectory.close()
            found.append([np.mean(part, axis=0) for part in zip(*phases, strict=True)])
        whole = np.array([c for c, _ in found])
        parts = whole if self.starts > 1 else found[0][1]
        means = [whole.mean(axis=0), parts]
        return [c.sum(axis=-1) for c in means] if summed else means

    def curve(self, mean, parts, function, unit, meaning, smooth=True):
        """Curve of a function of correlation functions, linear or not, with jackknife errors.

        mean, parts : of `correlations`. function : (lags, ...) -> (F, ...), of windowed ones where
        `smooth`.
        """
        def apply(c):
            """(..., lags) -> (..., F), a complex curve as its real and imaginary parts."""
            c = np.moveaxis(c, -1, 0)
            found = function(spectra.windowed(c, self.window) if smooth else c)
            whole = np.iscomplexobj(found)
            return np.moveaxis(np.concatenate([found.real, found.imag]) if whole else found, 0, -1)

        values, errors = apply(mean), np.nan * apply(mean)
        if len(parts) > 1:
            _, errors = function_of_means(parts, apply)
        if np.iscomplexobj(function(mean)):
            values, errors = (x[:len(x) // 2] + 1j * x[len(x) // 2:] for x in (values, errors))
        return Curve(values, errors, unit, meaning)

    def figures(self, mean, parts, functions):
        """{name: (value, error, unit)} of {name: (function as of `curve`, one number, unit)}."""
        curves = {name: self.curve(mean, parts, f, unit, "") for name, (f, unit)
                  in functions.items()}
        return {name: (float(c.values[0]), float(c.errors[0]), c.unit)
                for name, c in curves.items()}

    def notes(self, mean):
        """What holds for every spectrum; mean : (lags,) a correlation function without window."""
        said = [f"window {self.window}, longest lag {self.longest_lag:.4g} ps: a sharp line is"
                f" {self.resolution:.3g} THz ({self.resolution * spectra.WAVENUMBER:.3g} cm^-1)"
                " wide"]
        if self.starts == 1:
            said.append(f"one start: errors from {self.pieces} pieces of its record, too small"
                        " where the liquid remembers for longer than a piece"
                        if self.pieces > 1 else f"one start, its record shorter than"
                        f" {2 * FEWEST} longest lags: no errors")
        left = np.abs(mean[-max(self.lags // 20, 1):]).mean() / mean[0]
        if left > FADED:
            said.append(f"at the longest lag the correlation is still {100 * left:.0f} % of its"
                        " first value: structure narrower than the resolution is the window's")
        stages = self.first.parameters["stages"]
        bath = stages[max(stages, key=lambda name: int(name.split("-")[0]))]["thermostat"]
        if bath != "none":
            said.append(f"thermostat {bath} in the recorded stage: it damps the motion seen here")
        return said + self._said

    def result(self, of, label, curves, notes, figures=None, **more):
        """The Spectrum."""
        return Spectrum(of, label, self.kind, self.frequencies, curves, self.starts, self.window,
                        self.longest_lag, self.resolution, figures or {}, tuple(notes), **more)


def trajectories(run, kind):
    """([[Trajectory of each carrier phase] of each start that counts], notes).

    Raises InputError when there are none.
    """
    starts = complete_starts(run)
    if kind not in starts.phases:
        raise InputError(f"kind {kind}: the run has {', '.join(starts.phases)}")
    if not starts.numbers:
        raise InputError(f"{run.path}: no start is complete yet, of {starts.wanted}")
    few = len(starts.numbers) < starts.wanted
    notes = [f"{len(starts.numbers)} of {starts.wanted} starts are complete and count"] * few
    return [[run[key] for key in starts.keys(kind, n)] for n in starts.numbers], notes


def quantity(trajectory, name):
    """A Series; raises InputError where it was not recorded."""
    if name not in trajectory:
        raise InputError(f"{trajectory.path}: {name} was not recorded; it has"
                         f" {', '.join(trajectory.names)}")
    return trajectory[name]
