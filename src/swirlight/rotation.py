"""Rotations by unit quaternions, in two forms: scalars inside kernels, arrays outside.

A quaternion is (w, x, y, z), scalar first, and maps body to laboratory: v_lab = q v_body q*.
The kernel forms take and return plain scalars, so that they vanish into the loop around them.
"""

import math

import numpy as np

from swirlight.compiled import kernel

# --- arrays -----------------------------------------------------------------------------


def multiply(a, b):
    """Quaternion product a b, of arrays (..., 4)."""
    aw, ax, ay, az = np.moveaxis(np.asarray(a, float), -1, 0)
    bw, bx, by, bz = np.moveaxis(np.asarray(b, float), -1, 0)
    return np.stack([
        aw * bw - ax * bx - ay * by - az * bz,
        aw * bx + ax * bw + ay * bz - az * by,
        aw * by - ax * bz + ay * bw + az * bx,
        aw * bz + ax * by - ay * bx + az * bw,
    ], axis=-1)


def rotation_matrix(q):
    """(..., 3, 3) matrices R of unit quaternions (..., 4): v_lab = R v_body."""
    w, x, y, z = np.moveaxis(np.asarray(q, float), -1, 0)
    rows = [
        [w * w + x * x - y * y - z * z, 2 * (x * y - w * z), 2 * (x * z + w * y)],
        [2 * (x * y + w * z), w * w - x * x + y * y - z * z, 2 * (y * z - w * x)],
        [2 * (x * z - w * y), 2 * (y * z + w * x), w * w - x * x - y * y + z * z],
    ]
    return np.stack([np.stack(row, axis=-1) for row in rows], axis=-2)


def to_laboratory(q, v):
    """Body-frame vectors v (..., 3) seen from the laboratory."""
    return np.einsum("...ij,...j->...i", rotation_matrix(q), v)


def to_body(q, v):
    """Laboratory vectors v (..., 3) seen from the body."""
    return np.einsum("...ji,...j->...i", rotation_matrix(q), v)


def from_vector(turn):
    """(..., 4) quaternions of rotation vectors (..., 3): axis times angle. [rad]"""
    turn = np.asarray(turn, float)
    half = 0.5 * np.linalg.norm(turn, axis=-1, keepdims=True)
    return np.concatenate([np.cos(half), 0.5 * turn * np.sinc(half / np.pi)], axis=-1)


def normalised(q):
    """Quaternions (..., 4) divided by their length."""
    return q / np.linalg.norm(q, axis=-1, keepdims=True)


# --- scalars, inside kernels ------------------------------------------------------------


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
