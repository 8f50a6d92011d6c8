"""What is to be correlated: components, kinds, starts, checked; and the sums over trajectories."""

import re
from dataclasses import dataclass, field, replace

import numpy as np

from swirlight import units
from swirlight.errors import InputError
from swirlight.results.starts import complete_starts
from swirlight.results.vectors import blocks, find_vectors

KINDS = {
    "odd": {"plus": 0.5, "minus": -0.5},
    "even": {"plus": 0.5, "minus": 0.5, "dark": -1.0},
}
_SUM = re.compile(r"[+-]?[xyz]{2}(?:[+-][xyz]{2})*")
_FACTOR = re.compile(r"([A-Za-z%]+)([+-][0-9]+)?")


@dataclass(frozen=True)
class Job:
    """One correlation function of a run, ready to be worked out.

    pair : the two `Vectors`, of any one trajectory; kinds : {kind: weight}; components : the two
    lists of 0, 1, 2 that are read; weights : (n, p, q) of those; stationary : whether every
    origin is as good as another; frames, interval, first_time : of the record [ps].
    """

    run: object
    starts: object
    pair: tuple
    species: str | None
    kinds: dict
    kind_name: str
    components: tuple
    weights: np.ndarray
    stationary: bool
    unit: str | None
    frames: int
    interval: float
    first_time: float
    notes: list = field(default_factory=list)

    @classmethod
    def of(cls, run, names, weights, frame, kinds, locked, species):
        """Check everything that can be checked before data are read.

        names : two; weights : (n, 3, 3). Raises InputError.
        """
        starts = complete_starts(run)
        kind_name, kinds = _kinds(kinds, starts, locked)
        if not starts.numbers:
            raise InputError(f"{run.path}: no start is complete yet, of {starts.wanted}")
        trajectory = run[starts.keys(next(iter(kinds)), starts.numbers[0])[0]]
        used = [np.flatnonzero(weights.any(axis=(0, axis))).tolist() for axis in (2, 1)]
        if names[0] == names[1]:  # read once
            used = [sorted({*used[0], *used[1]})] * 2
        pair = [find_vectors(trajectory, name, frame, species, use)
                for name, use in zip(names, used, strict=True)]
        stationary = not locked and set(kinds) == {"dark"} and _undisturbed(run, trajectory)
        if len(starts.numbers) < 2 and not stationary:
            raise InputError(_too_few(kind_name, locked))
        job = cls(run, starts, tuple(pair), species, kinds, kind_name, tuple(used),
                  weights[np.ix_(range(len(weights)), *used)], stationary,
                  product_unit(pair[0].unit, pair[1].unit), *_common_clock(*pair))
        job.notes.extend(job._remarks(locked))
        trajectory.close()
        return job

    @property
    def title(self):
        """What is correlated, in words."""
        return (" with ".join(dict.fromkeys(each.name for each in self.pair))
                + (f" of {self.species}" if self.species else "")
                + (", seen from the body" if self.pair[0].frame == "body" else ""))

    def sums(self, kind, make, stride=1):
        """For each start the list, over carrier phases, of `make(blocks)`."""
        return [[self._sums(key, make, stride) for key in self.starts.keys(kind, start)]
                for start in self.starts.numbers]

    def _sums(self, key, make, stride):
        trajectory = self.run[key]
        pair = [replace(each, trajectory=trajectory) for each in self.pair]
        try:
            return make(blocks(*pair, self.components, stride))
        except KeyError as error:  # a total that only lit kinds have
            raise InputError(error.args[0]) from None
        finally:
            trajectory.close()

    def lag_frames(self, longest_lag, default):
        """Longest lag in frames. Raises InputError when the record is too short for it."""
        if longest_lag is None:
            return default
        lag = time_of(longest_lag)
        frames = round(lag / self.interval)
        if not 0 <= frames < self.frames:
            raise InputError(f"longest lag {lag:g} ps: the record is "
                             f"{(self.frames - 1) * self.interval:g} ps long, a frame every "
                             f"{self.interval:g} ps")
        return frames

    def frame_at(self, instant):
        """The frame nearest to an instant, said in the notes when it is not that instant."""
        time = time_of(instant)
        frame = round((time - self.first_time) / self.interval)
        if not 0 <= frame < self.frames:
            last = self.first_time + (self.frames - 1) * self.interval
            raise InputError(f"locked to {time:g} ps: recorded from {self.first_time:g} to "
                             f"{last:g} ps of the stage")
        there = self.first_time + frame * self.interval
        if abs(there - time) > 1e-6 * self.interval:
            self.notes.append(f"Locked to the nearest frame, {there:g} ps.")
        return frame

    def _remarks(self, locked):
        species = self.pair[0].trajectory.species_names
        complete, wanted = len(self.starts.numbers), self.starts.wanted
        if complete < wanted:
            yield f"{complete} of {wanted} starts are complete and count."
        if not locked and not self.stationary:
            yield ("Not stationary data: the average is over all of the record, light included; "
                   "C(−t) tells something of its own." if self.kind_name != "dark" else
                   "Light or a switched field acts in the dark runs too: they are not stationary.")
        if complete == 1:
            yield "One start: errors from blocks of its own origins."
        if self.pair[0].bodies is not None and self.species is None and len(species) > 1:
            yield f"All species together: {', '.join(species)}."


def weights_of(components):
    """(n, 3, 3) weights of components as written. Raises InputError."""
    if isinstance(components, str) and components == "all":
        return np.eye(9).reshape(9, 3, 3)
    texts = [components] if isinstance(components, str) else list(components)
    if not texts:
        raise InputError('no components; expected for example "xy"')
    return np.stack([_weights(text) for text in texts])


def _weights(text):
    if not isinstance(text, str) or not _SUM.fullmatch(text):
        raise InputError(f'components {text!r}: expected two of x, y, z such as "xy", a sum such '
                         'as "xy-yx" or "xx+yy+zz", or "all"')
    found = np.zeros((3, 3))
    for sign, first, second in re.findall(r"([+-]?)([xyz])([xyz])", text):
        found["xyz".index(first), "xyz".index(second)] += -1.0 if sign == "-" else 1.0
    if not found.any():
        raise InputError(f"components {text!r} cancel")
    return found


def time_of(value):
    """A time given as text or as a number of ps. [ps]"""
    return units.parse_quantity(value, "time") if isinstance(value, str) else float(value)


def product_unit(first, second):
    """H5MD unit string of a product, None when it has none."""
    powers = {}
    for symbol, power in _FACTOR.findall(f"{first or ''} {second or ''}"):
        powers[symbol] = powers.get(symbol, 0) + int(power or 1)
    texts = [symbol + (f"{power:+d}" if power != 1 else "")
             for symbol, power in powers.items() if power]
    return " ".join(texts) or None


def _kinds(kinds, starts, locked):
    """(name, {kind: weight})"""
    if kinds is None:
        preferred = ("plus", "dark") if locked else ("dark", "plus")
        kinds = next((kind for kind in preferred if kind in starts.phases),
                     next(iter(starts.phases)))
    if isinstance(kinds, str):
        found, name = KINDS.get(kinds, {kinds: 1.0}), kinds
    else:
        found, name = {kind: 1.0 / len(kinds) for kind in kinds}, " and ".join(kinds)
    missing = [kind for kind in found if kind not in starts.phases]
    if missing or not found:
        raise InputError(f"kind {name or 'none'}: the run has {', '.join(starts.phases)}"
                         + "; odd needs plus and minus, even all three" * (name in KINDS))
    return name, found


def _undisturbed(run, trajectory):
    """Whether nothing changes with time in a dark trajectory: no probe, no switched field."""
    bias = run.config.bias_field
    return "light" not in trajectory.parameters and (bias is None or bias.from_ is None)


def _too_few(kind_name, locked):
    what = "pulse-locked correlations" if locked else \
        f"correlations over all origins of {kind_name}, which are not stationary,"
    return (f"{what} take their errors from independent starts, and one start has none: "
            "exposures.starts must be 2 at least; at 95 % the interval is 12.7 standard errors "
            "wide each way with 2 starts, 2.4 with 8, 2.1 with 16")


def _common_clock(first, second):
    """(frames, interval [ps], first time [ps]) of two vectors. Raises InputError."""
    if (first.bodies is None) != (second.bodies is None):
        raise InputError(f"{first.name} and {second.name}: one belongs to each body, the other to "
                         "the box; take two of one sort (total_ sums a vector over bodies)")
    a, b = first.series, second.series
    if len(a) != len(b) or a.interval != b.interval:
        raise InputError(f"{first.name} is recorded every {a.interval:g} ps, {second.name} every "
                         f"{b.interval:g} ps: they have no common frames")
    return len(a), a.interval, float(a.times[0])
