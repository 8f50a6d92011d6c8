"""Reciprocal part of the Ewald sum on a mesh.

Model   Smooth particle-mesh Ewald: Essmann, Perera, Berkowitz, Darden, Lee & Pedersen,
        J. Chem. Phys. 103 (1995) 8577. Cardinal B-splines of order p, forces from the
        gradient of the interpolated energy.
Units   nm, ps, u, e; energy u nm²/ps².
Layout  a spline takes a row of WIDTH numbers, zeros behind its p weights, and the mesh has WIDTH
        further points along z: one row is one vector operation and never wraps. The weights
        are polynomials in the place inside a cell, all of a row evaluated together.
        Charges are sorted by planes of constant x, and a plane (when spreading) or a charge
        (when gathering) is written by one thread in fixed order: any number of threads gives
        the same bits.
"""

import numpy as np
import scipy.fft

from swirlight.compiled import CHUNKS, kernel, numba
from swirlight.forces.kernels.rows import eight_lanes, unaliased
from swirlight.forces.splines import ORDERS, WIDTH, spline_moduli, spline_table
from swirlight.units import COULOMB


@kernel
def _sort(place, box, mesh, cell, inside, start, rank):
    """Mesh cell and place inside it of every charge; rank lists them by x, start[x] is the first.

    The lists are stable: charges of one plane keep their order.
    """
    start[:] = 0
    for m in range(place.shape[0]):
        for a in range(3):
            u = place[m, a] / box[a]
            u = (u - np.floor(u)) * mesh[a]
            n = int(u)
            inside[m, a] = u - n
            # u − floor(u) may round to 1, and a place that is no number has no cell.
            cell[m, a] = n if 0 <= n < mesh[a] else 0
        start[cell[m, 0]] += 1
    for x in range(mesh[0]):
        start[x + 1] += start[x]
    for m in range(place.shape[0] - 1, -1, -1):
        x = cell[m, 0]
        start[x] -= 1
        rank[start[x]] = m


@kernel(fast=True)
def _fill_splines(first, last, charge, mesh, cell, inside, rank, order, taylor, base, weight,
                  slope):
    unaliased()
    c = taylor
    for r in range(first, last):
        m = rank[r]
        for a in range(3):
            lowest = cell[m, a] - order + 1
            base[r, a] = lowest if lowest >= 0 else lowest + mesh[a]
            factor = charge[m] if a == 0 else 1.0
            t = inside[m, a] - 0.5
            for n in range(WIDTH):
                weight[r, a, n] = factor * (
                    c[0, n] + t * (c[1, n] + t * (c[2, n] + t * (c[3, n] + t * (
                        c[4, n] + t * (c[5, n] + t * (c[6, n] + t * c[7, n])))))))
                slope[r, a, n] = factor * (
                    c[8, n] + t * (c[9, n] + t * (c[10, n] + t * (c[11, n] + t * (
                        c[12, n] + t * (c[13, n] + t * c[14, n]))))))


@kernel(parallel=True)
def _splines(charge, mesh, cell, inside, rank, order, taylor, base, weight, slope):
    """Splines of the charges in sorted order, lowest point first; along x times the charge."""
    count = rank.shape[0]
    for chunk in numba.prange(CHUNKS):
        _fill_splines(count * chunk // CHUNKS, count * (chunk + 1) // CHUNKS, charge, mesh, cell,
                      inside, rank, order, taylor, base, weight, slope)


@kernel(fast=True)
def _fill_plane(x, mesh, start, order, base, weight, plane):
    unaliased()
    plane[:] = 0.0
    for j in range(order):
        c = (x - j + order - 1) % mesh[0]
        for r in range(start[c], start[c + 1]):
            z = base[r, 2]
            profile = weight[r, 2]
            for k in range(order):
                factor = weight[r, 0, j] * weight[r, 1, k]
                y = base[r, 1] + k
                row = plane[y if y < mesh[1] else y - mesh[1], z:z + WIDTH]
                eight_lanes()
                for n in range(WIDTH):
                    row[n] += factor * profile[n]
    for y in range(mesh[1]):  # what reached past the end belongs to the beginning
        for n in range(WIDTH):
            plane[y, n] += plane[y, mesh[2] + n]


@kernel(parallel=True)
def _spread(mesh, start, order, base, weight, density):
    """Charge density on the mesh, one plane of constant x at a time."""
    for x in numba.prange(mesh[0]):
        _fill_plane(x, mesh, start, order, base, weight, density[x])


@kernel(fast=True)
def _read_field(first, last, mesh, scale, rank, order, base, weight, slope, potential, value,
                slant, x_sum, y_sum, z_sum, force):
    unaliased()
    for r in range(first, last):
        for n in range(WIDTH):
            x_sum[n] = y_sum[n] = z_sum[n] = 0.0
        z = base[r, 2]
        for j in range(order):
            x = base[r, 0] + j
            plane = potential[x if x < mesh[0] else x - mesh[0]]
            for n in range(WIDTH):
                value[n] = slant[n] = 0.0
            for k in range(order):
                y = base[r, 1] + k
                row = plane[y if y < mesh[1] else y - mesh[1], z:z + WIDTH]
                flat, steep = weight[r, 1, k], slope[r, 1, k]
                eight_lanes()
                for n in range(WIDTH):
                    value[n] += flat * row[n]
                    slant[n] += steep * row[n]
            flat, steep = weight[r, 0, j], slope[r, 0, j]
            eight_lanes()
            for n in range(WIDTH):
                x_sum[n] += steep * value[n]
                y_sum[n] += flat * slant[n]
                z_sum[n] += flat * value[n]
        fx, fy, fz = 0.0, 0.0, 0.0
        eight_lanes()
        for n in range(WIDTH):
            fx += weight[r, 2, n] * x_sum[n]
            fy += weight[r, 2, n] * y_sum[n]
            fz += slope[r, 2, n] * z_sum[n]
        m = rank[r]
        force[m, 0] = -scale[0] * fx
        force[m, 1] = -scale[1] * fy
        force[m, 2] = -scale[2] * fz


@kernel(parallel=True)
def _gather(mesh, scale, rank, order, base, weight, slope, potential, force):
    """Force on every charge: minus its charge times the slope of the interpolated potential."""
    count = rank.shape[0]
    for chunk in numba.prange(CHUNKS):
        work = np.empty((5, WIDTH), potential.dtype)
        _read_field(count * chunk // CHUNKS, count * (chunk + 1) // CHUNKS, mesh, scale, rank,
                    order, base, weight, slope, potential, work[0], work[1], work[2],
                    work[3], work[4], force)


@kernel(parallel=True)
def _mode_sums(spectrum, coupling, spread_x, spread_y, spread_z, share, sums):
    """Per plane of k_x: Σ U_k and Σ U_k [3 − 2(1 + k²/4α²)], U_k = ½ g |Q|²; share: how many k."""
    for x in numba.prange(spectrum.shape[0]):
        energy, virial = 0.0, 0.0
        for y in range(spectrum.shape[1]):
            for z in range(spectrum.shape[2]):
                re, im = np.float64(spectrum[x, y, z].real), np.float64(spectrum[x, y, z].imag)
                one = 0.5 * share[z] * coupling[x, y, z] * (re * re + im * im)
                spread = spread_x[x] + spread_y[y] + spread_z[z]
                energy += one
                virial += one * (3.0 - 2.0 * (1.0 + spread))
        sums[x, 0] = energy
        sums[x, 1] = virial


class MeshEwald:
    """Smooth particle-mesh sum over wave vectors for a set of point charges.

    charge : (M,) [e]
    box : (3,) edges. [nm]
    alpha : splitting. [1/nm]
    order : points per axis that a charge is spread over, one of ORDERS.
    mesh : (3,) points along each axis, each at least WIDTH.
    dtype : of the mesh, np.float32 or np.float64.
    Raises ValueError for another order or a coarser mesh.
    """

    def __init__(self, charge, box, alpha, order, mesh, dtype=np.float64):
        if order not in ORDERS or min(mesh) < WIDTH:
            raise ValueError(f"order {order} is not one of {ORDERS}, or mesh {tuple(mesh)} has"
                             f" fewer than {WIDTH} points along an axis")
        self.charge = np.ascontiguousarray(charge, float)
        self.alpha, self.order, self.dtype = alpha, order, np.dtype(dtype)
        self.mesh = np.array(mesh, np.int64)
        self._taylor = spline_table(order)
        count, (nx, ny, nz) = len(self.charge), self.mesh
        self._cell, self._base = np.empty((2, count, 3), np.int64)
        self._inside = np.empty((count, 3))
        self._start, self._rank = np.empty(nx + 1, np.int64), np.empty(count, np.int64)
        self._weight, self._slope = np.empty((2, count, 3, WIDTH), self.dtype)
        self._field = np.zeros((nx, ny, nz + WIDTH), self.dtype)
        self._share = np.full(nz // 2 + 1, 2.0)
        self._share[0] = 1.0
        if nz % 2 == 0:
            self._share[-1] = 1.0
        self._prepare(np.array(box, float))

    def _prepare(self, box):
        self._box = box
        nx, ny, nz = self.mesh
        waves = [scipy.fft.fftfreq(nx, 1 / nx), scipy.fft.fftfreq(ny, 1 / ny),
                 scipy.fft.rfftfreq(nz, 1 / nz)]
        self._spreads = [(2 * np.pi * n / edge) ** 2 / (4 * self.alpha**2)
                         for n, edge in zip(waves, box, strict=True)]
        bx, by, bz = (spline_moduli(int(n), self.order) for n in self.mesh)
        sx, sy, sz = np.ix_(*self._spreads)
        spread = sx + sy + sz
        spread[0, 0, 0] = np.inf  # no k = 0: conducting boundary
        coupling = np.pi * COULOMB / (box.prod() * self.alpha**2) * np.exp(-spread) / spread
        coupling *= np.multiply.outer(np.outer(bx, by), bz[: nz // 2 + 1])
        self._coupling = coupling.astype(self.dtype)

    def evaluate(self, place, box, force, energies=True):
        """Overwrite `force` (M, 3); return (energy, virial with all places scaled) or None.

        place : (M, 3) anywhere in space. [nm]
        """
        if not np.array_equal(box, self._box):
            self._prepare(np.array(box, float))
        mesh, field, nz = self.mesh, self._field, self.mesh[2]
        _sort(place, self._box, mesh, self._cell, self._inside, self._start, self._rank)
        _splines(self.charge, mesh, self._cell, self._inside, self._rank, self.order,
                 self._taylor, self._base, self._weight, self._slope)
        _spread(mesh, self._start, self.order, self._base, self._weight, field)
        spectrum = scipy.fft.rfftn(field[:, :, :nz], workers=1)
        sums = self._sums(spectrum) if energies else None
        spectrum *= self._coupling
        field[:, :, :nz] = scipy.fft.irfftn(spectrum, tuple(mesh), norm="forward",
                                            overwrite_x=True, workers=1)
        field[:, :, nz:] = field[:, :, :WIDTH]
        _gather(mesh, mesh / self._box, self._rank, self.order, self._base, self._weight,
                self._slope, field, force)
        return sums

    def _sums(self, spectrum):
        sums = np.empty((self.mesh[0], 2))
        _mode_sums(spectrum, self._coupling, *self._spreads, self._share, sums)
        energy, virial = sums.sum(axis=0)
        return float(energy), float(virial)
