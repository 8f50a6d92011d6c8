"""Discrete Fourier transforms of many lines side by side.

Model   X_k = Σ_j x_j exp(−2πi jk/n), n a product of 2, 3, 4 and 5: one pass a factor, in the
        order of Stockham's method, which needs no sorting (from memory; Van Loan, Computational
        Frameworks for the Fast Fourier Transform, 1992).
Layout  `lines` = (start, step, imaginary) names lines in a flat array: the j-th number of the
        first line at start + j step, of the next line one place further, imaginary parts
        `imaginary` places after the real ones. With the parts exchanged the same passes are
        the inverse transform, without its 1/n.
"""

import functools

import numpy as np

from swirlight.compiled import kernel, numba
from swirlight.forces.kernels.calls import INNER, array_at, call_address, callback
from swirlight.forces.kernels.rows import widest
from swirlight.forces.kernels.waves import SIDE, clockwise, complex_at, put_complex, turn_block

FACTORS = (5, 4, 3, 2)
HALF_ROOT_3 = 0.5 * np.sqrt(3.0)
COS_72, SIN_72 = np.cos(0.4 * np.pi), np.sin(0.4 * np.pi)
COS_144, SIN_144 = np.cos(0.8 * np.pi), np.sin(0.8 * np.pi)


def transform_turns(points, dtype):
    """exp(−2πi k/n), k = 0 … n − 1, complex of the precision of dtype."""
    turns = np.exp(-2j * np.pi * np.arange(points) / points)
    return turns.astype(np.result_type(dtype, np.complex64))


def transform_plan(points, dtype):
    """Passes and turns of a transform; ValueError for primes other than 2, 3 and 5."""
    found, left = [], int(points)
    for factor in FACTORS:
        while left % factor == 0:
            found.append(factor)
            left //= factor
    if left != 1:
        raise ValueError(f"{points} points: prime factors other than 2, 3 and 5")
    return np.array(found, np.int64), transform_turns(points, dtype)


@kernel(fast=True, **INNER)
def _pass_2(source, at, target, to, turns, parts, stride, width, lanes):
    widest()
    ahead, apart = parts * stride * at[1], stride * to[1]
    for p in range(parts):
        turn = turns[p * stride]
        for q in range(stride):
            i, o = at[0] + (p * stride + q) * at[1], to[0] + (2 * p * stride + q) * to[1]
            for n in range(0, width, lanes):
                a = complex_at(source, i + n, at[2])
                b = complex_at(source, i + n + ahead, at[2])
                put_complex(target, o + n, to[2], a + b)
                put_complex(target, o + n + apart, to[2], (a - b) * turn)


@kernel(fast=True, **INNER)
def _pass_3(source, at, target, to, turns, parts, stride, width, lanes):
    widest()
    ahead, apart = parts * stride * at[1], stride * to[1]
    for p in range(parts):
        turn_1, turn_2 = turns[p * stride], turns[2 * p * stride]
        for q in range(stride):
            i, o = at[0] + (p * stride + q) * at[1], to[0] + (3 * p * stride + q) * to[1]
            for n in range(0, width, lanes):
                a = complex_at(source, i + n, at[2])
                b = complex_at(source, i + n + ahead, at[2])
                c = complex_at(source, i + n + 2 * ahead, at[2])
                both, aside = b + c, clockwise(b - c) * HALF_ROOT_3
                middle = a - both * 0.5
                put_complex(target, o + n, to[2], a + both)
                put_complex(target, o + n + apart, to[2], (middle + aside) * turn_1)
                put_complex(target, o + n + 2 * apart, to[2], (middle - aside) * turn_2)


@kernel(fast=True, **INNER)
def _pass_4(source, at, target, to, turns, parts, stride, width, lanes):
    widest()
    ahead, apart = parts * stride * at[1], stride * to[1]
    for p in range(parts):
        turn_1, turn_2, turn_3 = turns[p * stride], turns[2 * p * stride], turns[3 * p * stride]
        for q in range(stride):
            i, o = at[0] + (p * stride + q) * at[1], to[0] + (4 * p * stride + q) * to[1]
            for n in range(0, width, lanes):
                a = complex_at(source, i + n, at[2])
                b = complex_at(source, i + n + ahead, at[2])
                c = complex_at(source, i + n + 2 * ahead, at[2])
                d = complex_at(source, i + n + 3 * ahead, at[2])
                even, odd, across, aside = a + c, b + d, a - c, clockwise(b - d)
                put_complex(target, o + n, to[2], even + odd)
                put_complex(target, o + n + apart, to[2], (across + aside) * turn_1)
                put_complex(target, o + n + 2 * apart, to[2], (even - odd) * turn_2)
                put_complex(target, o + n + 3 * apart, to[2], (across - aside) * turn_3)


@kernel(fast=True, **INNER)
def _pass_5(source, at, target, to, turns, parts, stride, width, lanes):
    widest()
    ahead, apart = parts * stride * at[1], stride * to[1]
    for p in range(parts):
        turn_1, turn_2, turn_3, turn_4 = (turns[p * stride], turns[2 * p * stride],
                                          turns[3 * p * stride], turns[4 * p * stride])
        for q in range(stride):
            i, o = at[0] + (p * stride + q) * at[1], to[0] + (5 * p * stride + q) * to[1]
            for n in range(0, width, lanes):
                a = complex_at(source, i + n, at[2])
                b = complex_at(source, i + n + ahead, at[2])
                c = complex_at(source, i + n + 2 * ahead, at[2])
                d = complex_at(source, i + n + 3 * ahead, at[2])
                e = complex_at(source, i + n + 4 * ahead, at[2])
                near, far, across, aside = b + e, c + d, clockwise(b - e), clockwise(c - d)
                put_complex(target, o + n, to[2], a + near + far)
                middle = a + near * COS_72 + far * COS_144
                tilt = across * SIN_72 + aside * SIN_144
                put_complex(target, o + n + apart, to[2], (middle + tilt) * turn_1)
                put_complex(target, o + n + 4 * apart, to[2], (middle - tilt) * turn_4)
                middle = a + near * COS_144 + far * COS_72
                tilt = across * SIN_144 - aside * SIN_72
                put_complex(target, o + n + 2 * apart, to[2], (middle + tilt) * turn_2)
                put_complex(target, o + n + 3 * apart, to[2], (middle - tilt) * turn_3)


def _transform(source, target, spare, factors, turns, passes, count, inverse, start, step,
               imaginary, to_start, to_step, to_imaginary, room, other, width, lanes):
    """`transform` with every number by itself, as one compiled function is called by another."""
    # Rows are read and written without a look at the sizes of the first three.
    source, target, spare = array_at(source, 1), array_at(target, 1), array_at(spare, 1)
    factors, turns = array_at(factors, passes), array_at(turns, count)
    if inverse:
        start, imaginary = start + imaginary, -imaginary
        to_start, to_imaginary = to_start + to_imaginary, -to_imaginary
    at, goal = (start, step, imaginary), (to_start, to_step, to_imaginary)
    stride, size = 1, count * width
    for n in range(passes):
        factor = factors[n]
        count //= factor
        into, to = spare, (room, width, size)
        if n == passes - 1:
            into, to = target, goal
        if factor == 2:
            _pass_2(source, at, into, to, turns, count, stride, width, lanes)
        elif factor == 3:
            _pass_3(source, at, into, to, turns, count, stride, width, lanes)
        elif factor == 4:
            _pass_4(source, at, into, to, turns, count, stride, width, lanes)
        else:
            _pass_5(source, at, into, to, turns, count, stride, width, lanes)
        source, at = into, to
        room, other = other, room
        stride *= factor


@functools.cache
def transformer(dtype):
    """The compiled transform of a precision, as an address.

    Called that way it is compiled once, and not again into every kernel that uses it.
    """
    real, whole = numba.from_dtype(np.dtype(dtype)), numba.int64
    turn = numba.from_dtype(transform_turns(1, dtype).dtype)
    pointers = [numba.types.CPointer(kind) for kind in (real, real, real, whole, turn)]
    signature = numba.void(*pointers, *[whole] * 13)
    return callback(signature, _transform)


@kernel(**INNER)
def transform(machine, inverse, source, at, target, to, spare, room, other, plan, width, lanes):
    """Transform `width` lines of `source` into `target`, or back where `inverse`.

    machine : of `transformer`.
    at, to : lines of source and target.
    spare, room, other : array and the starts of two rooms for what lies between, neither of them
        the source nor the target; lines in them are `width` numbers apart, real and imaginary
        parts as far as fits.
    plan : of `transform_plan`.
    width : a multiple of lanes.
    """
    factors, turns = plan
    call_address(machine, (source, target, spare, factors, turns, len(factors), len(turns),
                           inverse, at[0], at[1], at[2], to[0], to[1], to[2], room, other, width,
                           lanes))


@kernel(**INNER)
def turn(array, at, to, numbers, wide_numbers, lines):
    """Write lines as numbers and numbers as lines, with zeros for those past the last number.

    wide_numbers, lines : multiples of SIDE.
    """
    for part in range(2):
        source, target = at[0] + part * at[2], to[0] + part * to[2]
        array[source + numbers * at[1]:source + wide_numbers * at[1]] = 0.0
        for k in range(0, wide_numbers, SIDE):
            for n in range(0, lines, SIDE):
                turn_block(array, source + k * at[1] + n, at[1],
                           array, target + n * to[1] + k, to[1])
