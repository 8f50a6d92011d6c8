"""Exponent of a response over a sweep, and from where on it is seen.

A weighted straight line through log |mean over starts| against log x. Weights (mean/error)² of
each point would follow its own noise, point by point, and make the interval too narrow (at 8
starts a nominal 95 % covered 91); here they follow the ratio of two smooth lines, through
log |mean| and log error. They are a function of means and mean squares, so that the bootstrap
sees their scatter too.
"""

from dataclasses import dataclass

import numpy as np
from scipy import stats

from swirlight.analysis.statistics import function_of_means, mean_and_error, studentised_interval


@dataclass(frozen=True)
class PowerLaw:
    """|response| = factor · x^exponent.

    exponent, error (jackknife), interval (low, high) at 95 %, NaN below 8 starts; factor.
    threshold : x at which so many starts find p < level every second time, if signal and scatter
    both go on as their power laws; NaN where the signal does not grow out of the scatter.
    starts, level : those the threshold holds for.
    """

    exponent: float
    error: float
    interval: tuple
    factor: float
    threshold: float
    starts: int
    level: float


def power_law(x, values, random, level=0.001):
    """The `PowerLaw` of a response over a sweep.

    x : (k,) > 0, at least two different ones; values : (starts, k), at least two starts, the
    response at each x; random : np.random.Generator; level : p of the threshold.
    Where a mean is not told from zero its logarithm is biased: leave such points out.
    Raises ValueError where a mean or an error is 0, which has no logarithm.
    """
    values, log_x = np.asarray(values, float), np.log(np.asarray(x, float))
    mean, error, _ = mean_and_error(values)
    if np.any(mean == 0.0) or not np.all(error > 0.0):
        raise ValueError("power_law: a mean or an error over starts of 0 has no logarithm")
    scaled = values / np.abs(mean)  # squares of numbers near 1
    moments = np.concatenate([scaled, scaled**2], axis=1)
    offset = np.log(np.abs(mean))

    def slope(moments):
        return _line_of_moments(moments, log_x, offset)[0]

    exponent, spread = function_of_means(moments, slope)
    interval = studentised_interval(moments, slope, random)
    intercept = _line_of_moments(moments.mean(axis=0), log_x, offset)[1]
    threshold = _threshold(log_x, exponent, intercept, error, len(values), level)
    return PowerLaw(float(exponent), float(spread), tuple(map(float, interval)),
                    float(np.exp(intercept)), threshold, len(values), level)


def line(x, y, weights):
    """(slope, intercept) of the weighted straight line through (x, y).

    x : (k,); y, weights : (..., k).
    """
    weights = weights / weights.sum(axis=-1, keepdims=True)
    centre, middle = (weights * x).sum(axis=-1), (weights * y).sum(axis=-1)
    away = x - centre[..., None]
    slope = (weights * away * y).sum(axis=-1) / (weights * away**2).sum(axis=-1)
    return slope, middle - slope * centre


def _line_of_moments(moments, log_x, offset):
    """Line through log |mean|, of means and mean squares (..., 2k) in units of exp(offset)."""
    mean, square = np.split(moments, 2, axis=-1)
    variance = np.maximum(square - mean**2, np.finfo(float).tiny)
    logarithm = np.log(np.abs(mean)) + offset
    same = np.ones_like(log_x)
    growth = line(log_x, logarithm, same)[0]
    noise_growth = line(log_x, 0.5 * np.log(variance) + offset, same)[0]
    away = log_x - log_x.mean()
    return line(log_x, logarithm, np.exp(2 * (growth - noise_growth)[..., None] * away))


def _threshold(log_x, exponent, intercept, error, starts, level):
    """x at which signal/error is the critical t; the error has a power law of its own:
    proportional to the intensity while twins stay close, constant once they have parted."""
    growth, log_error = line(log_x, np.log(error), np.ones_like(log_x))
    if exponent <= growth:
        return float("nan")
    critical = stats.t.isf(level / 2, starts - 1)
    return float(np.exp((np.log(critical) + log_error - intercept) / (exponent - growth)))
