"""One sample of a correlation function for every start: their mean is the function.

Means that are taken off and norms belong to all starts together. They enter each sample to first
order (the delta method), so that the mean over samples is exactly the function with the common
mean and norm, and the spread of the samples is its error. The mean over repeats of a start
(carrier phases) comes before anything else.
"""

import numpy as np


def over_starts(sums, weights, normalised=False, subtract_mean=False):
    """Samples and mean.

    sums : for each start a list, over its repeats, of `LaggedSums` in one piece or `LockedSums`.
    weights : (n, p, q), the n sums of components that are wanted.
    normalised : divide by Σ|w|√(⟨a²⟩⟨b²⟩); subtract_mean : that of all starts.
    Returns (starts, lead, lags, n) and (lead, lags, n), lead 1 or the number of origins; NaN
    where the norm is zero.
    """
    repeats = [[one.moments() for one in start] for start in sums]
    moments = [np.stack([np.mean([one[k] for one in start], axis=0) for start in repeats])
               for k in range(4)]
    centre = [moment.mean(axis=0) for moment in moments]
    means = centre[:2] if subtract_mean else ()
    c = np.stack([np.mean([one.correlation(*means) for one in start], axis=0) for start in sums])
    return _weighted(c, c.mean(axis=0), moments, centre, weights, normalised, subtract_mean)


def over_pieces(sums, weights, normalised=False, subtract_mean=False):
    """The same for one start and stationary data, with a sample for every piece of its origins.

    sums : `LaggedSums`. Returns (pieces, 1, lags, n), NaN where a piece has no origin, and
    (1, lags, n), the function of all origins.
    """
    whole = sums.joined()
    centre = whole.moments()
    means = centre[:2] if subtract_mean else ()
    moments = [moment[:, None] for moment in sums.moments()]
    c = sums.correlation(*means)[:, None]
    return _weighted(c, whole.correlation(*means), moments, centre, weights, normalised,
                     subtract_mean)


def _weighted(c, mean, moments, centre, weights, normalised, subtract_mean):
    c, mean = (np.einsum("...pq,npq->...n", each, weights, optimize=True) for each in (c, mean))
    if not normalised:
        return c, mean
    a, b = (_mean_square(centre, centre, k, subtract_mean) for k in (0, 1))
    a_s, b_s = (_mean_square(moments, centre, k, subtract_mean) for k in (0, 1))
    scale = np.sqrt(a[..., :, None] * b[..., None, :])
    change = 0.5 * scale * (_relative(a_s, a)[..., :, None] + _relative(b_s, b)[..., None, :])
    norm, change = (np.einsum("...pq,npq->...n", each, np.abs(weights), optimize=True)
                    for each in (scale, change))
    norm = np.where(norm > 0, norm, np.nan)
    return c / norm - mean / norm**2 * change, mean / norm


def _mean_square(moments, centre, k, subtract_mean):
    """⟨a²⟩ (k = 0) or ⟨b²⟩ (k = 1), of a sample about the common mean when that is taken off."""
    if not subtract_mean:
        return moments[2 + k]
    return moments[2 + k] - 2.0 * centre[k] * moments[k] + centre[k] ** 2


def _relative(sample, mean):
    return np.where(mean > 0, sample / np.where(mean > 0, mean, 1.0) - 1.0, 0.0)
