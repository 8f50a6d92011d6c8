"""Rotations by unit quaternions inside compiled loops.

They take and return plain scalars, so that they vanish into the loop around them. Conventions
are those of `rotation`.
"""

import math

from swirlight.compiled import kernel


@kernel
def matrix_entries(w, x, y, z):
    """The nine entries of R, row by row."""
    ww, xx, yy, zz = w * w, x * x, y * y, z * z
    return (
        ww + xx - yy - zz, 2.0 * (x * y - w * z), 2.0 * (x * z + w * y),
        2.0 * (x * y + w * z), ww - xx + yy - zz, 2.0 * (y * z - w * x),
        2.0 * (x * z - w * y), 2.0 * (y * z + w * x), ww - xx - yy + zz,
    )  # fmt: skip


@kernel
def cosine_and_sinc(h2):
    """cos h and sin h / h of h = √h2; Taylor sums to rounding below h = 1/4.

    In a liquid a body turns by a few hundredths of a radian a step, and a sum of a dozen
    terms costs a fraction of the two library calls.
    """
    if h2 < 0.0625:
        c = 1.0 + h2 * (-1 / 2 + h2 * (1 / 24 + h2 * (-1 / 720 + h2 * (1 / 40320 + h2 * (
            -1 / 3628800 + h2 / 479001600)))))
        s = 1.0 + h2 * (-1 / 6 + h2 * (1 / 120 + h2 * (-1 / 5040 + h2 * (1 / 362880 + h2 * (
            -1 / 39916800)))))
        return c, s
    h = math.sqrt(h2)
    return math.cos(h), math.sin(h) / h
