"""Means, intervals and tests over independent starts.

Model   starts are independent and alike; nothing is assumed of the times within one. Means carry
        Student's t ("The probable error of a mean", Biometrika 6, 1 (1908)); smooth functions of
        means (ratios, exponents) the studentised bootstrap with jackknife errors (Efron &
        Tibshirani, An Introduction to the Bootstrap, 1993, ch. 12; from memory); a look at many
        times the largest |t| under sign flips of whole starts (Westfall & Young,
        Resampling-Based Multiple Testing, 1993; from memory).
"""

import itertools

import numpy as np
from scipy import stats

LEAST_STARTS = 8  # for a bootstrap; fewer tell nothing of a distribution's tail
RESAMPLES = 2000
FLIPS = 4096  # sign patterns tried; all of them where there are no more
MANY = 1000  # starts: a number above it is no advice
_BLOCK = 1_000_000  # numbers held at once


def mean_and_error(values):
    """Mean over starts, its standard error, and the two-sided p of "the mean is zero".

    values : (starts, ...). Returns three arrays (...). One start has no error and no p (NaN);
    starts that agree to the last bit have error 0, and p is 0 where the mean is not 0 and 1
    where it is. What is not a number has neither.
    """
    values = np.asarray(values, float)
    n, mean = len(values), values.mean(axis=0)
    if n < 2:
        nothing = np.full_like(mean, np.nan)
        return mean, nothing, nothing.copy()
    error = values.std(axis=0, ddof=1) / np.sqrt(n)
    with np.errstate(divide="ignore", invalid="ignore"):
        t = np.abs(mean) / error
    p = 2 * stats.t.sf(np.where(error == 0, np.inf, t), n - 1)
    return mean, error, np.where((error == 0) & (mean == 0), 1.0, p)


def half_width(error, starts, level=0.95):
    """Half width of the Student-t interval at `level`, from the standard error."""
    if starts < 2:
        return np.full_like(np.asarray(error, float), np.nan)
    return stats.t.ppf(0.5 + level / 2, starts - 1) * np.asarray(error)


def function_of_means(values, function):
    """A smooth function of means over starts, and its jackknife standard error.

    values : (starts, k), at least two starts; function : (..., k) -> (...), e.g. a ratio
    `lambda m: m[..., 0] / m[..., 1]`.
    """
    values = np.asarray(values, float)
    n, mean = len(values), values.mean(axis=0)
    without = function((n * mean - values) / (n - 1))
    spread = ((without - without.mean(axis=0)) ** 2).sum(axis=0)
    return function(mean), np.sqrt((n - 1) / n * spread)


def studentised_interval(values, function, random, level=0.95, resamples=RESAMPLES):
    """Interval of a smooth function of means over starts, by the studentised bootstrap.

    values : (starts, k); function : as of `function_of_means`; random : np.random.Generator;
    level : a number, or several.
    Returns (low, high), each of the shape of `level`; NaN below LEAST_STARTS starts.
    """
    values, level = np.asarray(values, float), np.asarray(level)
    n, k = values.shape
    if n < LEAST_STARTS:
        return np.full_like(level, np.nan, float), np.full_like(level, np.nan, float)
    value, error = function_of_means(values, function)
    t = []
    for counts in _resampled(n, k, random, resamples):
        mean = counts @ values / n
        without = function((n * mean[:, None] - values) / (n - 1))
        centre = (counts * without).sum(axis=1, keepdims=True) / n
        spread = (counts * (without - centre) ** 2).sum(axis=1)
        with np.errstate(divide="ignore", invalid="ignore"):
            t.append((function(mean) - value) / np.sqrt((n - 1) / n * spread))
    t = np.concatenate(t)
    low, high = np.quantile(t[np.isfinite(t)], [0.5 - level / 2, 0.5 + level / 2])
    return value - high * error, value - low * error


def _resampled(n, k, random, resamples):
    """How often each start is drawn, (some, n) at a time."""
    some = max(1, _BLOCK // (n * k))
    for first in range(0, resamples, some):
        size = min(some, resamples - first)
        yield random.multinomial(n, np.full(n, 1 / n), size).astype(float)


def largest_t(values, random):
    """Whether the mean over starts is zero at all times, looked at together.

    values : (starts, times). Under the hypothesis the sign of a whole start is arbitrary, which
    holds exactly for half the difference of twins that could be exchanged.
    Returns (p, the largest |t|, index of its time, the smallest p so many starts can give);
    of one start, and of values that are not numbers, p and |t| are NaN.
    """
    values = np.asarray(values, float)
    n = len(values)
    if n < 2 or np.isnan(values).any():
        return np.nan, np.nan, 0, smallest_p(n)
    t = np.abs(_t_of(np.ones((1, n)), values)[0])
    index = int(np.argmax(t))
    signs = _signs(n, random)
    some = max(1, _BLOCK // values[0].size)
    most = np.concatenate([np.abs(_t_of(signs[k : k + some], values)).max(axis=1)
                           for k in range(0, len(signs), some)])
    # Rounding must not make the pattern seen smaller than itself.
    p = float(np.mean(most >= t[index] * (1 - 1e-9)))
    return p, float(t[index]), index, smallest_p(n)


def smallest_p(starts):
    """The smallest p that `largest_t` can give with so many starts."""
    return 1.0 / min(2 ** max(starts - 1, 0), FLIPS)


def _signs(n, random):
    """(patterns, n) of ±1: all that differ (a pattern and its opposite give the same |t|), or
    FLIPS of them, the one seen among them so that p is never 0."""
    if 2 ** (n - 1) > FLIPS:
        return np.vstack([np.ones(n), random.choice([-1.0, 1.0], (FLIPS - 1, n))])
    return np.array([(1.0, *rest) for rest in itertools.product((1.0, -1.0), repeat=n - 1)])


def _t_of(signs, values):
    """(patterns, times) Student's t after each pattern of signs."""
    n = len(values)
    mean = signs @ values / n
    square = (values**2).mean(axis=0)
    variance = np.maximum(square - mean**2, 0.0) * n / (n - 1)
    with np.errstate(divide="ignore", invalid="ignore"):
        t = mean / np.sqrt(variance / n)
    return np.where(square == 0.0, 0.0, t)


def blocking_error(series):
    """Standard error of a correlated series' mean.

    Flyvbjerg & Petersen, J. Chem. Phys. 91, 461 (1989). Blocks are paired until there are fewer
    than 16; the largest estimate counts, which is never too small by more than its own
    scatter. NaN for fewer than 16 numbers.

    series : (n,), or (n, ...) for several side by side.
    """
    series = np.asarray(series, float)
    best = np.full(series.shape[1:], np.nan)
    while len(series) >= 16:
        best = np.fmax(best, series.std(axis=0, ddof=1) / np.sqrt(len(series)))
        series = 0.5 * (series[0 : 2 * (len(series) // 2) : 2] + series[1::2][: len(series) // 2])
    return best if best.ndim else float(best)


def starts_needed(mean, scatter, level=0.001, power=0.5, most=MANY):
    """The least number of starts that reach p < level with probability `power`, or most + 1.

    mean, scatter : true mean and standard deviation of one start; known only roughly where they
    were themselves measured with few. From the noncentral t distribution of two-sided tests.
    """
    if mean == 0.0 or not np.isfinite(mean) or not np.isfinite(scatter):
        return most + 1
    if scatter == 0.0:
        return 2

    def reached(n):
        critical = stats.t.isf(level / 2, n - 1)
        return stats.nct.sf(critical, n - 1, abs(mean) / scatter * np.sqrt(n)) >= power

    low, high = 1, most + 1  # not reached with `low`; with `high` it is, or we do not ask
    while high - low > 1:
        middle = (low + high) // 2
        low, high = (low, middle) if reached(middle) else (middle, high)
    return high
