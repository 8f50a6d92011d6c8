"""Reciprocal part of the Ewald sum on a mesh.

Model   Smooth particle-mesh Ewald: Essmann, Perera, Berkowitz, Darden, Lee & Pedersen,
        J. Chem. Phys. 103 (1995) 8577. Cardinal B-splines of order p, forces from the
        gradient of the interpolated energy.
Units   nm, ps, u, e; energy u nm²/ps².
Layout  a spline takes a row of WIDTH numbers, zeros behind its p weights, and the mesh has WIDTH
        further points along y and z: one row is one vector operation and never wraps. The
        weights are polynomials in the place inside a cell, all of a row evaluated together.
        The transforms are scipy's, on one thread: they gain nothing from more.
Bits    charges are sorted by planes of constant x, and a plane (when spreading) or a charge
        (when gathering) is written by one thread in fixed order: any number of threads gives
        the same bits.
"""

import numpy as np
import scipy.fft

from swirlight.compiled import CHUNKS, INNER, kernel, numba
from swirlight.forces.kernels.rows import distinct, filled, fused, put_row, row_at, total
from swirlight.forces.splines import ORDERS, WIDTH, spline_moduli, spline_table
from swirlight.units import COULOMB


@kernel(**INNER)
def _cell(place, edge, points):
    """Mesh cell along one axis, and the place inside it, 0 to 1."""
    u = place / edge
    u = (u - np.floor(u)) * points
    n = int(u)
    # u − floor(u) may round to 1, and a place that is no number has no cell.
    return (n if 0 <= n < points else 0), u - n


@kernel(**INNER)
def _count(first, last, place, box, mesh, count):
    """How many of some charges each plane of constant x has."""
    count[:] = 0
    for m in range(first, last):
        count[_cell(place[m, 0], box[0], mesh[0])[0]] += 1


@kernel(**INNER)
def _number(count, start):
    """Turn counts (chunks, planes) into the first number of each chunk in each plane."""
    number = 0
    for x in range(count.shape[1]):
        start[x] = number
        for chunk in range(count.shape[0]):
            here = count[chunk, x]
            count[chunk, x] = number
            number += here
    start[count.shape[1]] = number


@kernel(fast=True, **INNER)
def _fill_splines(first, last, place, box, charge, mesh, taps, taylor, following, rank, base,
                  inside, weight):
    distinct()
    zero = filled(taylor.dtype.type(0.0))
    for m in range(first, last):
        x, _ = _cell(place[m, 0], box[0], mesh[0])
        r = following[x]
        following[x] += 1
        rank[r] = m
        for a in range(3):
            cell, u = _cell(place[m, a], box[a], mesh[a])
            lowest = cell - len(taps) + 1
            base[r, a] = lowest if lowest >= 0 else lowest + mesh[a]
            t = taylor.dtype.type(u - 0.5)
            inside[r, a] = t
            row = row_at(taylor, (len(taps) - 1, 0))
            for n in range(len(taps) - 2, -1, -1):
                row = fused(row, filled(t), row_at(taylor, (n, 0)))
            if a == 0:
                row = fused(row, filled(taylor.dtype.type(charge[m])), zero)
            put_row(weight, (r, a, 0), row)


@kernel(fast=True, **INNER)
def _fill_plane(x, mesh, start, taps, base, weight, plane):
    distinct()
    plane[:] = 0.0
    zero, one = filled(plane.dtype.type(0.0)), filled(plane.dtype.type(1.0))
    order = len(taps)
    for j in range(order):
        c = (x - j + order - 1) % mesh[0]
        # Charges of one body follow one another and overlap. Reading what was just written
        # costs time: every eighth is taken, and so on.
        for turn in range(8):
            for r in range(start[c] + turn, start[c + 1], 8):
                y, z = base[r, 1], base[r, 2]
                profile = fused(row_at(weight, (r, 2, 0)), filled(weight[r, 0, j]), zero)
                for k in range(order):
                    here = (y + k, z)
                    put_row(plane, here,
                            fused(profile, filled(weight[r, 1, k]), row_at(plane, here)))
    for y in range(WIDTH):  # what reached past the end belongs to the beginning
        for z in range(plane.shape[1]):
            plane[y, z] += plane[mesh[1] + y, z]
    for y in range(mesh[1]):
        put_row(plane, (y, 0), fused(one, row_at(plane, (y, 0)), row_at(plane, (y, mesh[2]))))


@kernel(fast=True, **INNER)
def _read_field(first, last, mesh, scale, taps, taylor, charge, rank, base, inside, weight,
                potential, slope, force):
    distinct()
    zero = filled(potential.dtype.type(0.0))
    for r in range(first, last):
        for a in range(3):
            row, t = row_at(taylor, (WIDTH + len(taps) - 2, 0)), filled(inside[r, a])
            for n in range(len(taps) - 3, -1, -1):
                row = fused(row, t, row_at(taylor, (WIDTH + n, 0)))
            put_row(slope, (a, 0), row)
        x_sum = y_sum = z_sum = zero
        z = base[r, 2]
        for j in range(len(taps)):
            x = base[r, 0] + j
            x = x if x < mesh[0] else x - mesh[0]
            value = slant = zero
            for k in range(len(taps)):
                y = base[r, 1] + k
                row = row_at(potential, (x, y if y < mesh[1] else y - mesh[1], z))
                value = fused(row, filled(weight[r, 1, k]), value)
                slant = fused(row, filled(slope[1, k]), slant)
            flat = filled(weight[r, 0, j])
            x_sum = fused(value, filled(slope[0, j]), x_sum)
            y_sum = fused(slant, flat, y_sum)
            z_sum = fused(value, flat, z_sum)
        m, flat = rank[r], row_at(weight, (r, 2, 0))
        force[m, 0] = -scale[0] * charge[m] * total(fused(flat, x_sum, zero))
        force[m, 1] = -scale[1] * total(fused(flat, y_sum, zero))
        force[m, 2] = -scale[2] * total(fused(row_at(slope, (2, 0)), z_sum, zero))


@kernel(parallel=True)
def _spread(place, box, charge, mesh, taps, taylor, count, start, rank, base, inside, weight,
            field):
    """Charge density on the mesh."""
    charges = charge.shape[0]
    for n in range(CHUNKS):  # not worth the threads, nor another loop on threads to compile
        _count(charges * n // CHUNKS, charges * (n + 1) // CHUNKS, place, box, mesh, count[n])
    _number(count, start)
    for n in numba.prange(CHUNKS):
        _fill_splines(charges * n // CHUNKS, charges * (n + 1) // CHUNKS, place, box, charge,
                      mesh, taps, taylor, count[n], rank, base, inside, weight)
    for x in numba.prange(mesh[0]):
        # An unsigned x, as numba has it here, would be one more form of the kernel to compile.
        _fill_plane(np.int64(x), mesh, start, taps, base, weight, field[x])


@kernel(parallel=True)
def _gather(mesh, scale, taps, taylor, charge, rank, base, inside, weight, field, force):
    """Force on every charge: minus its charge times the slope of the interpolated potential."""
    charges = charge.shape[0]
    for n in numba.prange(CHUNKS):
        _read_field(charges * n // CHUNKS, charges * (n + 1) // CHUNKS, mesh, scale, taps, taylor,
                    charge, rank, base, inside, weight, field, np.empty((3, WIDTH), field.dtype),
                    force)


@kernel
def _mode_sums(spectrum, coupling, spread_x, spread_y, spread_z, share):
    """Σ U_k and Σ U_k [3 − 2(1 + k²/4α²)], U_k = ½ g |Q|²; share: how many k."""
    energy, virial = 0.0, 0.0
    for x in range(spectrum.shape[0]):
        for y in range(spectrum.shape[1]):
            for z in range(spectrum.shape[2]):
                re, im = np.float64(spectrum[x, y, z].real), np.float64(spectrum[x, y, z].imag)
                one = 0.5 * share[z] * coupling[x, y, z] * (re * re + im * im)
                spread = spread_x[x] + spread_y[y] + spread_z[z]
                energy += one
                virial += one * (3.0 - 2.0 * (1.0 + spread))
    return energy, virial


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
        count, (nx, ny, nz) = len(self.charge), (int(n) for n in mesh)
        self._shape = nx, ny, nz
        self._taps = tuple(range(order))  # a tuple, for the compiler to know how many
        self._taylor = spline_table(order).astype(dtype)
        self._planes = np.empty((CHUNKS, nx), np.int32), np.empty(nx + 1, np.int32)
        self._splines = (np.empty(count, np.int32), np.empty((count, 3), np.int32),
                         np.empty((count, 3), dtype), np.empty((count, 3, WIDTH), dtype))
        self._field = np.zeros((nx, ny + WIDTH, nz + WIDTH), dtype)
        self._density, self._margin = self._field[:, :ny, :nz], self._field[:, :ny, nz:]
        self._share = np.full(nz // 2 + 1, 2.0)
        self._share[0] = 1.0
        if nz % 2 == 0:
            self._share[-1] = 1.0
        self._prepare(np.array(box, float))

    def _prepare(self, box):
        self._box, self._scale = box, self.mesh / box
        nx, ny, nz = self._shape
        waves = [scipy.fft.fftfreq(nx, 1 / nx), scipy.fft.fftfreq(ny, 1 / ny),
                 scipy.fft.rfftfreq(nz, 1 / nz)]
        self._spreads = [(2 * np.pi * n / edge) ** 2 / (4 * self.alpha**2)
                         for n, edge in zip(waves, box, strict=True)]
        bx, by, bz = (spline_moduli(n, self.order) for n in self._shape)
        self._coupling = np.empty((nx, ny, nz // 2 + 1), self.dtype)
        strength = np.pi * COULOMB / (box.prod() * self.alpha**2)
        for x in range(nx):  # plane by plane: the whole in double would be the peak of memory
            spread = self._spreads[0][x] + np.add.outer(*self._spreads[1:])
            if x == 0:
                spread[0, 0] = np.inf  # no k = 0: conducting boundary
            self._coupling[x] = (strength * bx[x] * np.exp(-spread) / spread
                                 * np.outer(by, bz[: nz // 2 + 1]))
        # What rounding hides is left out: numbers near the smallest that floats hold are slow.
        self._coupling[self._coupling < 1e-6 * np.finfo(self.dtype).eps * self._coupling.max()] = 0

    def evaluate(self, place, box, force, energies=True):
        """Overwrite `force` (M, 3); return (energy, virial with all places scaled) or None.

        place : (M, 3) anywhere in space. [nm]
        """
        if not np.array_equal(box, self._box):
            self._prepare(np.array(box, float))
        _spread(place, self._box, self.charge, self.mesh, self._taps, self._taylor, *self._planes,
                *self._splines, self._field)
        spectrum = scipy.fft.rfftn(self._density)
        sums = (_mode_sums(spectrum, self._coupling, *self._spreads, self._share)
                if energies else None)
        spectrum *= self._coupling
        self._density[:] = scipy.fft.irfftn(spectrum, self._shape, norm="forward",
                                            overwrite_x=True)
        self._margin[:] = self._density[:, :, :WIDTH]  # past the end a row begins again
        _gather(self.mesh, self._scale, self._taps, self._taylor, self.charge,
                *self._splines, self._field, force)
        return sums
