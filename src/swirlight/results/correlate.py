"""Time correlation functions of a run, with errors: `sw.correlate(run, "torque", "xy")`.

C_xy(t) = ⟨x(t0) y(t0 + t)⟩ of one vector with itself or with another, body by body, over all
origins t0 of the stationary (dark) runs, or locked to one instant of the pulse. Errors come from
independent starts; with one start and stationary data from blocks of its origins.
"""

from dataclasses import dataclass, field, replace

import numpy as np

from swirlight.analysis.correlation import by_lag, lagged_sums, locked_sums
from swirlight.analysis.samples import over_pieces, over_starts
from swirlight.analysis.statistics import blocking_error, half_width, mean_and_error
from swirlight.errors import InputError
from swirlight.results.job import Job, time_of, weights_of
from swirlight.store.run import open_run

PIECES = 32  # blocks of origins for the error of a single start
LEAST_BLOCKS = 16  # for an error: what `blocking_error` asks for
MAP_ORIGINS = 200


@dataclass(frozen=True)
class Correlation:
    """A correlation function with its standard errors.

    lags (lags,) [ps], of both signs; values, errors (lags,), for components "all" (lags, 3, 3),
    for a list (lags, n); NaN where nothing is known. unit : H5MD unit string, None without.
    starts : independent starts that count. notes : sentences the reader must see.
    samples : (starts, lags, ...), what each start adds to the mean; None for one start.
    origin : the instant it is locked to [ps], None: all origins.
    """

    title: str
    components: str | tuple
    kinds: str
    lags: np.ndarray
    values: np.ndarray
    errors: np.ndarray
    starts: int
    unit: str | None
    notes: list = field(default_factory=list)
    samples: np.ndarray | None = None
    origin: float | None = None

    def half_width(self, level=0.95):
        """Half widths of the intervals at that level, by Student's t over starts.

        For one start by t of as many degrees as the fewest blocks have.
        """
        return half_width(self.errors, self.starts if self.starts > 1 else LEAST_BLOCKS, level)

    def to_xarray(self):
        """An `xarray.Dataset` of `value` and `error` with named axes and units (extra `data`)."""
        axes = {"lag": (self.lags, "ps")}
        if self.components == "all":
            axes |= {"first": (list("xyz"), None), "second": (list("xyz"), None)}
        elif not isinstance(self.components, str):
            axes["components"] = (list(self.components), None)
        return _labelled(self, axes)


@dataclass(frozen=True)
class CorrelationMap:
    """C(t0, lag): pulse-locked correlation functions of many origins.

    origins (o,), lags (l,) [ps]; values, errors (o, l), NaN where t0 + lag was not recorded.
    The rest as of `Correlation`.
    """

    title: str
    components: str
    kinds: str
    origins: np.ndarray
    lags: np.ndarray
    values: np.ndarray
    errors: np.ndarray
    starts: int
    unit: str | None
    notes: list = field(default_factory=list)

    def to_xarray(self):
        """An `xarray.Dataset` of `value` and `error` with named axes and units (extra `data`)."""
        return _labelled(self, {"origin": (self.origins, "ps"), "lag": (self.lags, "ps")})


def column_names(result):
    """Names of the functions of a `Correlation`, in the order of `values.reshape(lags, -1)`."""
    if result.components == "all":
        return [first + second for first in "xyz" for second in "xyz"]
    return [result.components] if isinstance(result.components, str) else list(result.components)


def _labelled(result, axes):
    from swirlight.store.labelled import dataset

    return dataset({"value": result.values, "error": result.errors}, axes, result.unit,
                   {"title": result.title, "kinds": result.kinds, "starts": result.starts,
                    "notes": " ".join(result.notes)})


def correlate(run, of, components="xy", longest_lag=None, frame="lab", with_vector=None,
              locked_to=None, normalised=False, subtract_mean=False, kinds=None, species=None):
    """Correlation function of a recorded vector with itself or another, of the same body.

    run : a Run, or the path of one.
    of : a recorded vector, axis_x, axis_y, axis_z (from the orientation), a total with three
        components ("total_dipole"), or "total_" and a vector's name for its sum over bodies.
    components : "xy" for ⟨x(t0) y(t0 + t)⟩; a signed sum such as "xy-yx" or "xx+yy+zz"; "all"
        for the 3×3 matrix; or a list of such texts.
    longest_lag : text or [ps]; None: half of the record, all of it when locked.
    frame : "lab", or "body": seen from the body, by its recorded orientation.
    with_vector : the second vector; None: the same.
    locked_to : the origin, text or [ps] from the start of the stage; None: all origins.
    normalised : divided by √(⟨a²⟩⟨b²⟩) of each pair of components (when locked: of the two
        instants), in a sum by the sum of these.
    subtract_mean : the mean over bodies, starts and, unless locked, time is taken off first.
    kinds : "dark", "plus", "minus", a list of them (their mean), "odd" for (plus − minus)/2 or
        "even" for (plus + minus)/2 − dark; None: dark, when locked plus.
    species : only bodies of that species.
    Returns a `Correlation`. Raises InputError for what is not there, carries no physics or has
    too few starts for an error.
    """
    found = _correlate(run, (of, with_vector or of), components, weights_of(components),
                       longest_lag, frame, locked_to, normalised, subtract_mean, kinds, species)
    if isinstance(components, str):
        found = _reshaped(found, (3, 3) if components == "all" else ())
    return found


def helicity_signature(run, locked_to=None, longest_lag=None, axis="axis_z", kinds=None,
                       species=None):
    """C_xy − C_yx about the beam, ⟨(a(t0) × b(t0 + t))·k̂⟩, of axis–axis, axis–L and L–L.

    A vector with itself is zero for gyration by time reversal and sees dissipative spinning
    (axis–axis: absorption, resolved fields); axis with L sees gyration; locked to the pulse all
    can see both. Returns {"axis-axis", "axis-L", "L-L": `Correlation`}; arguments and errors as
    of `correlate`.
    """
    run = _opened(run)
    beam = _beam(run)
    name = "xy-yx" if np.array_equal(beam, [0.0, 0.0, 1.0]) else "xy-yx about the beam"
    weights = np.einsum("ijk,k->ij", _LEVI_CIVITA, beam)[None]
    spin = "angular_momentum"
    return {
        pair: _reshaped(_correlate(run, names, name, weights, longest_lag, "lab", locked_to, False,
                                   False, kinds, species), ())
        for pair, names in {"axis-axis": (axis, axis), "axis-L": (axis, spin),
                            "L-L": (spin, spin)}.items()
    }


_LEVI_CIVITA = np.zeros((3, 3, 3))
_LEVI_CIVITA[[0, 1, 2], [1, 2, 0], [2, 0, 1]] = 1.0
_LEVI_CIVITA[[1, 0, 2], [0, 2, 1], [2, 1, 0]] = -1.0


def _beam(run):
    """k̂ of the first exposed pulse, z without light."""
    key = next(iter(run.exposures), None)
    beam = None if key is None else run[key].parameters.get("beam")
    return np.array([0.0, 0.0, 1.0] if beam is None else beam, float)


def correlation_map(run, of, components="xy", longest_lag=None, frame="lab", with_vector=None,
                    normalised=False, subtract_mean=False, kinds=None, species=None):
    """C(t0, lag) of pulse-locked data, at 200 origins at most; see `correlate`.

    components : one text but "all". Returns a `CorrelationMap`.
    """
    if not isinstance(components, str) or components == "all":
        raise InputError('a map shows one function: expected components such as "xy" or "xy-yx"')
    job = Job.of(_opened(run), (of, with_vector or of), weights_of(components), frame, kinds, True,
                 species)
    stride = -(-job.frames // MAP_ORIGINS)
    origins = np.arange(len(range(0, job.frames, stride)))
    samples = _locked(job, origins, normalised, subtract_mean, stride)
    step = job.interval * stride
    frames, samples = _by_lag(samples, origins)
    keep = np.abs(frames) * step <= (time_of(longest_lag) if longest_lag is not None else np.inf)
    value, error, _ = mean_and_error(samples[:, :, keep, 0])
    return CorrelationMap(job.title, components, job.kind_name, job.first_time + step * origins,
                          step * frames[keep], value, error, len(samples),
                          None if normalised else job.unit, job.notes)


def _opened(run):
    return run if hasattr(run, "exposures") else open_run(run)


def _correlate(run, names, components, weights, longest_lag, frame, locked_to, normalised,
               subtract_mean, kinds, species):
    """A Correlation with values (lags, n) for weights (n, 3, 3)."""
    job = Job.of(_opened(run), names, weights, frame, kinds, locked_to is not None, species)
    origin = None
    if locked_to is not None:
        at = job.frame_at(locked_to)
        longest = job.lag_frames(longest_lag, job.frames - 1)
        samples = _locked(job, np.array([at]), normalised, subtract_mean)[:, 0]
        lags = np.arange(job.frames) - at
        samples, lags = samples[:, np.abs(lags) <= longest], lags[np.abs(lags) <= longest]
        origin = job.first_time + at * job.interval
    else:
        longest = job.lag_frames(longest_lag, job.frames // 2)
        lags = np.arange(-longest, longest + 1)
        samples, values = _all_origins(job, longest, normalised, subtract_mean)
    starts = len(job.starts.numbers)
    if starts > 1:
        values, errors, _ = mean_and_error(samples)
    else:
        samples, errors = None, _blocked(samples)
        if np.isnan(errors).any():
            job.notes.append(f"No error where a lag has fewer than {LEAST_BLOCKS} blocks of "
                             "origins: record longer, or more starts.")
    if np.isnan(values).any():
        job.notes.append(f"Not a number where {' or '.join(dict.fromkeys(names))} is zero.")
    return Correlation(
        job.title, components if isinstance(components, str) else tuple(components),
        job.kind_name, np.round(job.interval * lags, 9), values, errors, starts,
        None if normalised else job.unit, job.notes, samples, origin)


def _all_origins(job, longest, normalised, subtract_mean):
    """(starts or pieces, lags, n) samples and the (lags, n) function of all origins."""
    single = len(job.starts.numbers) == 1
    # Fewer than that many frames make no blocks.
    pieces = PIECES if single and job.frames >= 2 * PIECES else 1
    samples = values = 0.0
    for kind, weight in job.kinds.items():
        sums = job.sums(kind, lambda parts: lagged_sums(parts, longest, pieces))
        found = over_pieces(sums[0][0], job.weights, normalised, subtract_mean) if single else \
            over_starts(sums, job.weights, normalised, subtract_mean)
        samples, values = samples + weight * found[0], values + weight * found[1]
    return samples[:, 0], values[0]


def _locked(job, origins, normalised, subtract_mean, stride=1):
    """(starts, o, frames, n) samples of C(t0, t)."""
    return sum(
        weight * over_starts(job.sums(kind, lambda parts: locked_sums(parts, origins), stride),
                             job.weights, normalised, subtract_mean)[0]
        for kind, weight in job.kinds.items())


def _by_lag(samples, origins):
    lags, parts = None, []
    for sample in samples:
        lags, part = by_lag(sample, origins)
        parts.append(part)
    return lags, np.stack(parts)


def _blocked(samples):
    """(lags, n) errors from (pieces, lags, n); a piece without an origin for a lag is NaN."""
    errors = np.full(samples.shape[1:], np.nan)
    there = ~np.isnan(samples).all(axis=2)  # of each lag: pieces next to one another
    first, count = there.argmax(axis=0), there.sum(axis=0)
    for begin, length in np.unique(np.stack([first, count], axis=1), axis=0):
        lags = np.flatnonzero((first == begin) & (count == length))
        errors[lags] = blocking_error(samples[begin : begin + length, lags])
    return errors


def _reshaped(result, shape):
    parts = {name: getattr(result, name) for name in ("values", "errors", "samples")}
    return replace(result, **{name: part if part is None else
                              part.reshape(*part.shape[:-1], *shape)
                              for name, part in parts.items()})
