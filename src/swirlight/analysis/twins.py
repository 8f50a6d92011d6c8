"""What twins under opposite helicity say: even and odd parts, and what the pairing gains."""

import numpy as np


def even_odd(plus, minus, dark=None):
    """Even part (A₊ + A₋)/2 − A₀ and odd part (A₊ − A₋)/2, start by start.

    plus, minus : (starts, ...) of a signal in the two lit kinds; dark : the same, or None.
    Returns (even, odd); even is None without dark runs.
    """
    plus, minus = np.asarray(plus, float), np.asarray(minus, float)
    even = None if dark is None else 0.5 * (plus + minus) - np.asarray(dark, float)
    return even, 0.5 * (plus - minus)


def pairing_gain(first, second):
    """[Var A + Var B]/Var(A − B): how many times fewer starts the pairs need; 1 if independent.

    first, second : (starts, ...), the same start in the same row. Infinite where every pair
    differs by the same, NaN where nothing varies and for fewer than two starts.
    Ciccotti, Jacucci & McDonald, J. Stat. Phys. 21, 1 (1979).
    """
    first, second = np.asarray(first, float), np.asarray(second, float)
    if len(first) < 2:
        return np.full(first.shape[1:], np.nan)
    apart = first.var(axis=0, ddof=1) + second.var(axis=0, ddof=1)
    with np.errstate(divide="ignore", invalid="ignore"):
        return apart / (first - second).var(axis=0, ddof=1)
