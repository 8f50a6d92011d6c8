"""Even and odd response over independent starts, with plain errors.

even = (A₊ + A₋)/2 − A₀ and odd = (A₊ − A₋)/2, formed start by start (the twins share their
noise), after the mean over carrier phases. Errors come from the spread over starts only:
Student's t ("The probable error of a mean", Biometrika 6, 1 (1908)).
"""

import numpy as np
from scipy import stats


def even_odd(plus, minus, dark=None):
    """Per-start even and odd parts.

    plus, minus : (starts, ...) of a signal in the two lit kinds; dark : the same, or None.
    Returns (even, odd); even is None without dark runs.
    """
    plus, minus = np.asarray(plus, float), np.asarray(minus, float)
    even = None if dark is None else 0.5 * (plus + minus) - np.asarray(dark, float)
    return even, 0.5 * (plus - minus)


def mean_and_error(values):
    """Mean over starts, its standard error, and the two-sided p of "the mean is zero".

    values : (starts, ...). One start has no error and no p (NaN); starts that agree to the
    last bit have error 0, and p is 0 where the mean is not 0 and 1 where it is.
    """
    values = np.asarray(values, float)
    n, mean = len(values), values.mean(axis=0)
    if n < 2:
        nothing = np.full_like(mean, np.nan)
        return mean, nothing, nothing.copy()
    error = values.std(axis=0, ddof=1) / np.sqrt(n)
    with np.errstate(divide="ignore", invalid="ignore"):
        t = np.abs(mean) / error
    p = 2 * stats.t.sf(np.where(error > 0, t, np.inf), n - 1)
    return mean, error, np.where((error == 0) & (mean == 0), 1.0, p)


def half_width(error, starts, level=0.95):
    """Half width of the Student-t interval at `level`, from the standard error."""
    if starts < 2:
        return np.full_like(np.asarray(error, float), np.nan)
    return stats.t.ppf(0.5 + level / 2, starts - 1) * np.asarray(error)
