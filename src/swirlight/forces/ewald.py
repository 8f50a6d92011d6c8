"""Reciprocal part of the Ewald sum, term by term (Ewald 1921), conducting boundary.

Model   U = Σ g(k) |S(k)|² over one half of k space, S(k) = Σ q exp(ik·r),
        g(k) = (4π ke/V) exp(−k²/4α²)/k², all k ≠ 0 shorter than a radius.
        Virial when every place scales with the box: Σ g |S|² [3 − 2(1 + k²/4α²)].
Units   nm, ps, u, e; energy u nm²/ps².
Layout  wave vectors in columns: one (n_x, n_y) with all its n_z. A column, then a charge, is
        one thread's work from beginning to end: any number of threads gives the same bits.
"""

import numpy as np

from swirlight.compiled import kernel, numba
from swirlight.units import COULOMB


@kernel
def _phase_tables(place, box, top, along_x, along_y, along_z):
    """cos and sin of 2π n r/L, n = −top … top: x, y (2 top + 1, charges, 2), z (charges, 2, …)."""
    for m in range(place.shape[0]):
        turn = 2.0 * np.pi * (place[m] / box - np.floor(place[m] / box))
        for n in range(-top[0], top[0] + 1):
            along_x[n + top[0], m, 0] = np.cos(n * turn[0])
            along_x[n + top[0], m, 1] = np.sin(n * turn[0])
        for n in range(-top[1], top[1] + 1):
            along_y[n + top[1], m, 0] = np.cos(n * turn[1])
            along_y[n + top[1], m, 1] = np.sin(n * turn[1])
        for n in range(-top[2], top[2] + 1):
            along_z[m, 0, n + top[2]] = np.cos(n * turn[2])
            along_z[m, 1, n + top[2]] = np.sin(n * turn[2])


@kernel(parallel=True)
def _structure(along_x, along_y, along_z, charge, column, top, re, im):
    """S(k), as re and im (columns, n_z)."""
    for c in numba.prange(column.shape[0]):
        x, y = along_x[column[c, 0] + top[0]], along_y[column[c, 1] + top[1]]
        re[c, :] = 0.0
        im[c, :] = 0.0
        for m in range(charge.shape[0]):
            a = charge[m] * (x[m, 0] * y[m, 0] - x[m, 1] * y[m, 1])
            b = charge[m] * (x[m, 0] * y[m, 1] + x[m, 1] * y[m, 0])
            for n in range(re.shape[1]):
                re[c, n] += a * along_z[m, 0, n] - b * along_z[m, 1, n]
                im[c, n] += a * along_z[m, 1, n] + b * along_z[m, 0, n]


@kernel(parallel=True, fast=True)
def _push(along_x, along_y, along_z, charge, column, top, unit, coupling, re, im, force):
    """Force on every charge, 2 q Σ g k (Re S sin k·r − Im S cos k·r)."""
    for m in numba.prange(charge.shape[0]):
        fx, fy, fz = 0.0, 0.0, 0.0
        for c in range(column.shape[0]):
            x, y = along_x[column[c, 0] + top[0], m], along_y[column[c, 1] + top[1], m]
            a = x[0] * y[0] - x[1] * y[1]
            b = x[0] * y[1] + x[1] * y[0]
            whole, tilted = 0.0, 0.0
            for n in range(re.shape[1]):
                cosine = a * along_z[m, 0, n] - b * along_z[m, 1, n]
                sine = a * along_z[m, 1, n] + b * along_z[m, 0, n]
                pull = coupling[c, n] * (re[c, n] * sine - im[c, n] * cosine)
                whole += pull
                tilted += pull * (n - top[2])
            fx += column[c, 0] * whole
            fy += column[c, 1] * whole
            fz += tilted
        force[m, 0] = 2.0 * charge[m] * unit[0] * fx
        force[m, 1] = 2.0 * charge[m] * unit[1] * fy
        force[m, 2] = 2.0 * charge[m] * unit[2] * fz


def half_space(radius, unit):
    """Columns (c, 2) of (n_x, n_y), highest n (3,) and mask (c, 2 n_z + 1) of the k kept.

    Of each pair ±k one is kept: the first of k_x, k_y, k_z that is not 0 is positive.
    radius, unit : longest |k|, and 2π/edge of each axis. [1/nm]
    """
    top = np.floor(radius / unit).astype(np.int64)
    nx, ny, nz = np.meshgrid(np.arange(0, top[0] + 1), np.arange(-top[1], top[1] + 1),
                             np.arange(-top[2], top[2] + 1), indexing="ij")
    inside = (nx * unit[0]) ** 2 + (ny * unit[1]) ** 2 + (nz * unit[2]) ** 2 <= radius**2
    kept = inside & ((nx > 0) | (ny > 0) | ((ny == 0) & (nz > 0)))
    used = kept.any(axis=2)
    column = np.stack([nx[:, :, 0][used], ny[:, :, 0][used]], axis=1)
    return column, top, kept[used]


class DirectEwald:
    """Sum over wave vectors for a set of point charges.

    charge : (M,) [e]
    box : (3,) edges. [nm]
    alpha : splitting; radius : longest wave vector kept. [1/nm]
    The wave vectors stay those of the first box when the box is scaled, as a derivative by the
    volume needs it.
    """

    def __init__(self, charge, box, alpha, radius):
        self.charge = np.ascontiguousarray(charge, float)
        self.alpha = alpha
        self.column, self.top, self._kept = half_space(radius, 2.0 * np.pi / np.asarray(box))
        count, (tx, ty, tz) = len(self.charge), 2 * self.top + 1
        self._tables = (np.empty((tx, count, 2)), np.empty((ty, count, 2)),
                        np.empty((count, 2, tz)))
        self._re, self._im = np.empty((2, *self._kept.shape))
        self._prepare(np.array(box, float))

    def _prepare(self, box):
        self._box, self._unit = box, 2.0 * np.pi / box
        n_z = np.arange(-self.top[2], self.top[2] + 1)
        k2 = ((self.column * self._unit[:2]) ** 2).sum(axis=1)[:, None] + (n_z * self._unit[2]) ** 2
        spread = k2 / (4.0 * self.alpha**2)
        safe = np.where(self._kept, k2, 1.0)
        strength = 4.0 * np.pi * COULOMB / box.prod() * np.exp(-spread) / safe
        self._coupling = np.where(self._kept, strength, 0.0)
        self._stretch = 3.0 - 2.0 * (1.0 + spread)

    def evaluate(self, place, box, force, energies=True):
        """Overwrite `force` (M, 3); return (energy, virial with all places scaled) or None.

        place : (M, 3) anywhere in space. [nm]
        """
        if not np.array_equal(box, self._box):
            self._prepare(np.array(box, float))
        _phase_tables(place, self._box, self.top, *self._tables)
        _structure(*self._tables, self.charge, self.column, self.top, self._re, self._im)
        _push(*self._tables, self.charge, self.column, self.top, self._unit, self._coupling,
              self._re, self._im, force)
        if not energies:
            return None
        each = self._coupling * (self._re**2 + self._im**2)
        return float(each.sum()), float((each * self._stretch).sum())
