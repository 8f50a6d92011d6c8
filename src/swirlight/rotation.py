"""Rotations of arrays by unit quaternions.

A quaternion is (w, x, y, z), scalar first, and maps body to laboratory: v_lab = q v_body q*.
Nothing is compiled here: whatever reads files needs it too. `rotation_kernels` holds the
forms for compiled loops.
"""

import numpy as np


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
    rows = (
        (w * w + x * x - y * y - z * z, 2 * (x * y - w * z), 2 * (x * z + w * y)),
        (2 * (x * y + w * z), w * w - x * x + y * y - z * z, 2 * (y * z - w * x)),
        (2 * (x * z - w * y), 2 * (y * z + w * x), w * w - x * x - y * y + z * z),
    )
    matrix = np.empty((*w.shape, 3, 3))
    for i, row in enumerate(rows):
        for j, entry in enumerate(row):
            matrix[..., i, j] = entry
    return matrix


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


def body_axes(q):
    """(..., 3, 3) body axes in the laboratory, row k = axis k: the columns of R."""
    return rotation_matrix(q).swapaxes(-1, -2)
