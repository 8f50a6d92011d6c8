"""From charge density on a mesh to potential: transform, couple, transform back.

Model   φ = Σ_k g(k) ρ̂(k) exp(ik·r) for a real density ρ. Two neighbouring planes of constant
        x are the real and imaginary part of one complex plane, which makes half as many:
            c(x) = ρ(2x) + iρ(2x + 1),   ĉ(k) = ρ̂_even(k) + i ρ̂_odd(k),
            ρ̂(k) = ρ̂_even + w ρ̂_odd,     ρ̂(k + n/2) = ρ̂_even − w ρ̂_odd,
        k along x with n points, w = exp(−iθ), θ = 2πk/n. ĉ*(−k) tells the two parts from each
        other, and with g₊ = g(k) + g(k + n/2), g₋ = g(k) − g(k + n/2) the potential has
            ĉ′(k) = (g₊ − g₋ sin θ) ĉ(k) + i g₋ cos θ ĉ*(−k).
Layout  density and potential (n_x, n_y + more, pitch), whose pairs of planes are c; waves
        (n_x/2, 2, n_z, pitch): real parts, imaginary parts, y along the rows. Lanes past the
        end of a row of waves hold zeros. A thread has five rooms for what lies between, which
        hold lines along y, z or x.
"""

import numpy as np

from swirlight.compiled import kernel
from swirlight.forces.kernels.calls import INNER
from swirlight.forces.kernels.fourier import (
    transform,
    transform_plan,
    transform_turns,
    transformer,
    turn,
)
from swirlight.forces.kernels.rows import aligned_zeros, distinct
from swirlight.forces.kernels.waves import lanes_of

ROOMS = 5


class WaveSpace:
    """Arrays and plans for transforms of a mesh.

    mesh : (3,) points along each axis, products of 2, 3 and 5, even along x.
    margin : further points along y and z that the field has room for.
    dtype : np.float32 or np.float64.
    threads : that may work at the same time.
    Raises ValueError for another mesh.

    field : (n_x, n_y + margin, pitch), the density and then the potential.
    waves : (n_x/2, 2, n_z, pitch).
    settings : what the kernels below take under that name.
    """

    def __init__(self, mesh, margin, dtype, threads):
        if mesh[0] % 2:
            raise ValueError(f"mesh {tuple(mesh)}: the number of points along x is not even")
        nx, ny, nz = (int(n) for n in mesh)
        width = lanes_of(dtype)
        wide_y, wide_z, pitch = (-(-n // width) * width for n in (ny, nz, nz + margin))
        size = wide_y * max(wide_z, nx // 2)
        self.field = aligned_zeros((nx, ny + margin, pitch), dtype)
        self.waves = aligned_zeros((nx // 2, 2, nz, wide_y), dtype)
        self.rooms = aligned_zeros((threads, ROOMS * 2 * size), dtype)
        self.settings = (transformer(self.field.dtype), width, (ny + margin) * pitch, pitch,
                         nz * wide_y, wide_y, wide_z, size,
                         *(part for n in (nx // 2, ny, nz) for part in transform_plan(n, dtype)),
                         transform_turns(nx, dtype)[: nx // 2])


@kernel(**INNER)
def density_to_waves(x, mesh, settings, field, waves, rooms):
    """Transform the complex plane x along y and z."""
    (machine, lanes, plane, pitch, row, wide_y, wide_z, size, _, _, factors_y, turns_y, factors_z,
     turns_z, _) = settings
    in_field, in_waves = (2 * x * plane, pitch, plane), (2 * x * row, wide_y, row)
    along_y, along_z = (0, wide_z, size), (2 * size, wide_y, size)
    transform(machine, False, field, in_field, rooms, along_y, rooms, 2 * size, 4 * size,
              (factors_y, turns_y), wide_z, lanes)
    turn(rooms, along_y, along_z, mesh[1], wide_y, wide_z)
    transform(machine, False, rooms, along_z, waves, in_waves, rooms, 0, 4 * size,
              (factors_z, turns_z), wide_y, lanes)


@kernel(**INNER)
def waves_to_potential(x, mesh, settings, field, waves, rooms):
    """Transform the complex plane x back."""
    (machine, lanes, plane, pitch, row, wide_y, wide_z, size, _, _, factors_y, turns_y, factors_z,
     turns_z, _) = settings
    in_field, in_waves = (2 * x * plane, pitch, plane), (2 * x * row, wide_y, row)
    along_z, along_y = (0, wide_y, size), (2 * size, wide_z, size)
    transform(machine, True, waves, in_waves, rooms, along_z, rooms, 2 * size, 4 * size,
              (factors_z, turns_z), wide_y, lanes)
    turn(rooms, along_z, along_y, mesh[2], wide_z, wide_y)
    transform(machine, True, rooms, along_y, field, in_field, rooms, 0, 4 * size,
              (factors_y, turns_y), wide_z, lanes)


@kernel(**INNER)
def couple(z, mesh, settings, coupling, spreads, energies, waves, rooms, sums):
    """Multiply the waves ±k_z by the coupling (n_x, n_z, n_y); their sums if energies are wanted.

    sums : (n_z/2 + 1, 2), of row z Σ U_k and Σ U_k [3 − 2(1 + k²/4α²)], U_k = ½ g |ρ̂|².
    """
    (machine, lanes, _, _, row, wide, _, size, factors, turns_x, _, _, _, _, turns) = settings
    half, twin = turns.shape[0], (mesh[2] - z) % mesh[2]
    rows, product, spare, other = (1 if twin == z else 2), 4 * size, 6 * size, 8 * size
    for n in range(rows):
        lines = (z if n == 0 else twin) * wide, 2 * row, row
        transform(machine, False, waves, lines, rooms, (2 * n * size, wide, size), rooms, spare,
                  other, (factors, turns_x), wide, lanes)
    if energies:
        sums[z, 0], sums[z, 1] = _sum_modes(z, rows, mesh, wide, size, coupling, turns, spreads,
                                            rooms)
    for n in range(rows):
        k = z if n == 0 else twin
        here, there = 2 * n * size, 2 * (rows - 1 - n) * size
        for x in range(half):
            own, mirrored, goal = (here + x * wide, there + (half - x) % half * wide,
                                   product + x * wide)
            _couple_row(mesh[1], wide, coupling[x, k], coupling[x + half, k],
                        turns[x].real, -turns[x].imag, rooms[own:], rooms[own + size:],
                        rooms[mirrored:], rooms[mirrored + size:], rooms[goal:],
                        rooms[goal + size:])
        transform(machine, True, rooms, (product, wide, size), waves, (k * wide, 2 * row, row),
                  rooms, spare, other, (factors, turns_x), wide, lanes)


@kernel(fast=True, **INNER)
def _couple_row(count, wide, g, g_beyond, cosine, sine, re, im, mirror_re, mirror_im, out_re,
                out_im):
    distinct()
    for n in range(count):
        difference = g[n] - g_beyond[n]
        own, mirrored = g[n] + g_beyond[n] - difference * sine, difference * cosine
        k = count - n if n > 0 else 0
        out_re[n] = own * re[n] + mirrored * mirror_im[k]
        out_im[n] = own * im[n] + mirrored * mirror_re[k]
    for n in range(count, wide):
        out_re[n] = out_im[n] = 0.0


@kernel(**INNER)
def _sum_modes(z, rows, mesh, wide, size, coupling, turns, spreads, rooms):
    half, there = turns.shape[0], 2 * (rows - 1) * size
    spread_x, spread_y, spread_z = spreads
    energy, virial = 0.0, 0.0
    for x in range(half):
        own, opposite = x * wide, there + (half - x) % half * wide
        cosine, sine = np.float64(turns[x].real), -np.float64(turns[x].imag)
        for y in range(mesh[1]):
            n, k = own + y, opposite + (mesh[1] - y if y > 0 else 0)
            re, im, mirror_re, mirror_im = rooms[n], rooms[n + size], rooms[k], rooms[k + size]
            even_re, even_im = 0.5 * (re + mirror_re), 0.5 * (im - mirror_im)
            odd_re, odd_im = 0.5 * (im + mirror_im), 0.5 * (mirror_re - re)
            shift_re, shift_im = cosine * odd_re + sine * odd_im, cosine * odd_im - sine * odd_re
            for beyond, sign in ((0, 1.0), (half, -1.0)):
                re, im = even_re + sign * shift_re, even_im + sign * shift_im
                spread = spread_x[x + beyond] + spread_y[y] + spread_z[z]
                one = 0.5 * rows * coupling[x + beyond, z, y] * (re * re + im * im)
                energy += one
                virial += one * (3.0 - 2.0 * (1.0 + spread))
    return energy, virial
