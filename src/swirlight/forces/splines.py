"""Cardinal B-splines on a mesh, as smooth particle-mesh Ewald uses them (plain numpy).

Source  Essmann et al., J. Chem. Phys. 103 (1995) 8577, section II and eqs. 4.1, 4.4.
"""

import numpy as np

WIDTH = 8  # numbers kept for a spline, zeros behind its order: one row for vector arithmetic
ORDERS = (4, 5, 6, 7, 8)


def cardinal_spline(order, u):
    """M_p(u), zero outside 0 < u < p."""
    u = np.asarray(u, float)
    if order == 2:
        return np.maximum(1.0 - np.abs(u - 1.0), 0.0)
    lower, shifted = cardinal_spline(order - 1, u), cardinal_spline(order - 1, u - 1.0)
    return (u * lower + (order - u) * shifted) / (order - 1)


def spline_moduli(points, order):
    """|b(m)|² of one axis, m = 0 … points − 1.

    At half the points an odd spline has no amplitude at all and b is infinite; the mean of the
    neighbours is taken there (common practice; the wave is of no weight in a fine mesh).
    """
    n = np.arange(order - 1)
    phase = np.exp(2j * np.pi * np.outer(np.arange(points), n) / points)
    power = np.abs(phase @ cardinal_spline(order, n + 1.0)) ** 2
    if order % 2 and points % 2 == 0:
        half = points // 2
        power[half] = 1.0  # any finite number: replaced in a moment
        moduli = 1.0 / power
        moduli[half] = 0.5 * (moduli[half - 1] + moduli[half + 1])
        return moduli
    return 1.0 / power


def spline_table(order):
    """Weights of a charge's points as polynomials in t = w − ½, w its place inside the cell.

    (15, WIDTH): rows 0 … 7 are the coefficients of M_p(w + p − 1 − j), j = 0 … p − 1 the points
    from the lowest on, the constant first; rows 8 … 14 those of the derivatives by w.
    """
    t = 0.5 * np.cos(np.linspace(0.0, np.pi, order))
    values = cardinal_spline(order, t[:, None] + 0.5 + order - 1 - np.arange(order))
    table = np.zeros((2 * WIDTH - 1, WIDTH))
    table[:order, :order] = np.polynomial.polynomial.polyfit(t, values, order - 1)
    table[WIDTH:] = table[1:WIDTH] * np.arange(1, WIDTH)[:, None]
    return table
