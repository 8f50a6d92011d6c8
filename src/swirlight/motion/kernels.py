"""The moves of a step as compiled loops: kick, drift and the bath of Langevin dynamics.

Every loop runs over a fixed number of chunks of bodies, serially or on threads, and adds the
sums of the chunks in order: the same bits for any number of threads. Threads pay only for
many bodies (`PARALLEL_FROM`); the two forms of a loop share its body and give the same bits.
numba numbers the turns of a loop on threads in unsigned integers, with which the body would be
compiled once more: hence `np.int64(c)`.

Sums go into rows laid out as a Ledger. Forces and torques are laboratory vectors; an array
without rows stands for a source that is not there.
"""

import math

import numpy as np

from swirlight.compiled import CHUNKS, INNER, kernel, numba
from swirlight.motion.ledger import (
    BATH,
    BATH_WORK,
    BIAS,
    BIAS_WORK,
    ENTRIES,
    LIGHT,
    LIGHT_WORK,
    PAIR,
)
from swirlight.motion.rotor import turn_freely
from swirlight.rotation_kernels import matrix_entries

PARALLEL_FROM = 500  # bodies; below, threads save less than 2 % of a step
NONE = np.zeros((0, 3))  # a source that is not there


class Workspace:
    """Rows of partial sums, one a chunk, reused at every step."""

    def __init__(self, bodies):
        self.sums = np.zeros((CHUNKS, ENTRIES))
        self.broken = np.zeros(CHUNKS, np.int64)
        self.parallel = bodies >= PARALLEL_FROM


@kernel(**INNER)
def _limits(chunk, chunks, n):
    return chunk * n // chunks, (chunk + 1) * n // chunks


@kernel(**INNER)
def _add_in_order(sums, ledger):
    for chunk in range(sums.shape[0]):
        for k in range(sums.shape[1]):
            ledger[k] += sums[chunk, k]


@kernel(**INNER)
def _first(broken):
    for chunk in range(broken.shape[0]):
        if broken[chunk] >= 0:
            return broken[chunk]
    return -1


# --- kick ---------------------------------------------------------------------------------


@kernel(**INNER)
def _kick_chunk(chunk, velocity, spin, orientation, mass, inverse_inertia, pair_force,
                pair_torque, light_force, light_torque, bias_force, bias_torque, h, sums, broken):
    start, end = _limits(chunk, sums.shape[0], velocity.shape[0])
    has_pair, has_light = pair_torque.shape[0] > 0, light_torque.shape[0] > 0
    has_light_force = light_force.shape[0] > 0
    has_bias, has_bias_force = bias_torque.shape[0] > 0, bias_force.shape[0] > 0
    row = sums[chunk]
    row[:] = 0.0
    broken[chunk] = -1
    for i in range(start, end):
        fx, fy, fz = 0.0, 0.0, 0.0
        tx, ty, tz = 0.0, 0.0, 0.0
        ax, ay, az, ux, uy, uz = 0.0, 0.0, 0.0, 0.0, 0.0, 0.0  # light: torque, force
        bx, by, bz, sx, sy, sz = 0.0, 0.0, 0.0, 0.0, 0.0, 0.0  # bias field: torque, force
        if has_pair:
            fx, fy, fz = pair_force[i, 0], pair_force[i, 1], pair_force[i, 2]
            tx, ty, tz = pair_torque[i, 0], pair_torque[i, 1], pair_torque[i, 2]
            row[PAIR] += tx * h
            row[PAIR + 1] += ty * h
            row[PAIR + 2] += tz * h
        if has_light:
            ax, ay, az = light_torque[i, 0], light_torque[i, 1], light_torque[i, 2]
            row[LIGHT] += ax * h
            row[LIGHT + 1] += ay * h
            row[LIGHT + 2] += az * h
        if has_light_force:
            ux, uy, uz = light_force[i, 0], light_force[i, 1], light_force[i, 2]
        if has_bias:
            bx, by, bz = bias_torque[i, 0], bias_torque[i, 1], bias_torque[i, 2]
            row[BIAS] += bx * h
            row[BIAS + 1] += by * h
            row[BIAS + 2] += bz * h
        if has_bias_force:
            sx, sy, sz = bias_force[i, 0], bias_force[i, 1], bias_force[i, 2]

        # half of the change before and half after: in between stand the mean momenta
        qx, qy, qz = 0.5 * h * (tx + ax + bx), 0.5 * h * (ty + ay + by), 0.5 * h * (tz + az + bz)
        f = 0.5 * h / mass[i]
        px, py, pz = f * (fx + ux + sx), f * (fy + uy + sy), f * (fz + uz + sz)
        lx, ly, lz = spin[i, 0] + qx, spin[i, 1] + qy, spin[i, 2] + qz
        vx, vy, vz = velocity[i, 0] + px, velocity[i, 1] + py, velocity[i, 2] + pz
        if has_light or has_bias:
            r00, r01, r02, r10, r11, r12, r20, r21, r22 = matrix_entries(
                orientation[i, 0], orientation[i, 1], orientation[i, 2], orientation[i, 3])
            wx = (r00 * lx + r10 * ly + r20 * lz) * inverse_inertia[i, 0]
            wy = (r01 * lx + r11 * ly + r21 * lz) * inverse_inertia[i, 1]
            wz = (r02 * lx + r12 * ly + r22 * lz) * inverse_inertia[i, 2]
            ox = r00 * wx + r01 * wy + r02 * wz
            oy = r10 * wx + r11 * wy + r12 * wz
            oz = r20 * wx + r21 * wy + r22 * wz
            row[LIGHT_WORK] += h * (ax * ox + ay * oy + az * oz + ux * vx + uy * vy + uz * vz)
            row[BIAS_WORK] += h * (bx * ox + by * oy + bz * oz + sx * vx + sy * vy + sz * vz)
        lx, ly, lz, vx, vy, vz = lx + qx, ly + qy, lz + qz, vx + px, vy + py, vz + pz
        spin[i, 0], spin[i, 1], spin[i, 2] = lx, ly, lz
        velocity[i, 0], velocity[i, 1], velocity[i, 2] = vx, vy, vz
        if broken[chunk] < 0 and not math.isfinite(lx + ly + lz + vx + vy + vz):
            broken[chunk] = i


@kernel
def _kick_serial(velocity, spin, orientation, mass, inverse_inertia, pair_force, pair_torque,
                 light_force, light_torque, bias_force, bias_torque, h, sums, broken, ledger):
    for c in range(sums.shape[0]):
        _kick_chunk(c, velocity, spin, orientation, mass, inverse_inertia, pair_force, pair_torque,
                    light_force, light_torque, bias_force, bias_torque, h, sums, broken)
    _add_in_order(sums, ledger)
    return _first(broken)


@kernel(parallel=True)
def _kick_parallel(velocity, spin, orientation, mass, inverse_inertia, pair_force, pair_torque,
                   light_force, light_torque, bias_force, bias_torque, h, sums, broken, ledger):
    for c in numba.prange(sums.shape[0]):
        _kick_chunk(np.int64(c), velocity, spin, orientation, mass, inverse_inertia, pair_force,
                    pair_torque, light_force, light_torque, bias_force, bias_torque, h, sums,
                    broken)
    _add_in_order(sums, ledger)
    return _first(broken)


def kick(state, system, pair, light, bias, interval, work, ledger):
    """Give the bodies the momenta that forces and torques bring in an interval, in place.

    pair, light, bias : (force, torque) of each source, each (N, 3) or `NONE`.
    interval : half a step. [ps]
    ledger : Ledger; takes the works of light and bias and the impulses of all three.
    Returns the first body whose momenta are no longer finite, or -1.
    """
    run = _kick_parallel if work.parallel else _kick_serial
    return run(
        state.velocity, state.angular_momentum, state.orientation, system.mass,
        system.inverse_inertia, pair[0], pair[1], light[0], light[1], bias[0], bias[1],
        interval, work.sums, work.broken, ledger.values,
    )


# --- drift --------------------------------------------------------------------------------


@kernel(**INNER)
def _drift_chunk(chunk, chunks, position, velocity, orientation, spin, kinds, inverse_inertia, t):
    start, end = _limits(chunk, chunks, position.shape[0])
    for i in range(start, end):
        for k in range(3):
            position[i, k] += t * velocity[i, k]
        w, x, y, z = turn_freely(
            kinds[i],
            orientation[i, 0], orientation[i, 1], orientation[i, 2], orientation[i, 3],
            spin[i, 0], spin[i, 1], spin[i, 2],
            inverse_inertia[i, 0], inverse_inertia[i, 1], inverse_inertia[i, 2], t)
        orientation[i, 0], orientation[i, 1], orientation[i, 2], orientation[i, 3] = w, x, y, z


@kernel
def _drift_serial(position, velocity, orientation, spin, kinds, inverse_inertia, t, chunks):
    for c in range(chunks):
        _drift_chunk(c, chunks, position, velocity, orientation, spin, kinds, inverse_inertia, t)


@kernel(parallel=True)
def _drift_parallel(position, velocity, orientation, spin, kinds, inverse_inertia, t, chunks):
    for c in numba.prange(chunks):
        _drift_chunk(np.int64(c), chunks, position, velocity, orientation, spin, kinds,
                     inverse_inertia, t)


def drift(state, system, kinds, interval, parallel=False):
    """Move the bodies freely for an interval [ps], in place; kinds : of `rotor.rotor_kinds`."""
    run = _drift_parallel if parallel else _drift_serial
    run(state.position, state.velocity, state.orientation, state.angular_momentum, kinds,
        system.inverse_inertia, interval, CHUNKS)


# --- the bath of Langevin dynamics -----------------------------------------------------------


@kernel(**INNER)
def _bath_chunk(chunk, velocity, spin, orientation, mass, inertia, inverse_inertia, keep, heat,
                move, turn, noise, sums):
    start, end = _limits(chunk, sums.shape[0], velocity.shape[0])
    row = sums[chunk]
    row[:] = 0.0
    first = 3 if move else 0
    for i in range(start, end):
        if move:
            width, gain = math.sqrt(heat / mass[i]), 0.0
            for k in range(3):
                old = velocity[i, k]
                new = keep * old + width * noise[i, k]
                velocity[i, k] = new
                gain += (new - old) * (new + old)
            row[BATH_WORK] += 0.5 * mass[i] * gain
        if turn and inertia[i, 0] > 0.0:
            r00, r01, r02, r10, r11, r12, r20, r21, r22 = matrix_entries(
                orientation[i, 0], orientation[i, 1], orientation[i, 2], orientation[i, 3])
            x, y, z = noise[i, first], noise[i, first + 1], noise[i, first + 2]
            bx = math.sqrt(heat * inertia[i, 0]) * (r00 * x + r10 * y + r20 * z)
            by = math.sqrt(heat * inertia[i, 1]) * (r01 * x + r11 * y + r21 * z)
            bz = math.sqrt(heat * inertia[i, 2]) * (r02 * x + r12 * y + r22 * z)
            x, y, z = spin[i, 0], spin[i, 1], spin[i, 2]
            nx = keep * x + (r00 * bx + r01 * by + r02 * bz)
            ny = keep * y + (r10 * bx + r11 * by + r12 * bz)
            nz = keep * z + (r20 * bx + r21 * by + r22 * bz)
            spin[i, 0], spin[i, 1], spin[i, 2] = nx, ny, nz
            row[BATH] += nx - x
            row[BATH + 1] += ny - y
            row[BATH + 2] += nz - z
            # ½ (L'·ω' − L·ω) = ½ Σ_k (L'_k − L_k)(L'_k + L_k)/I_k over the body's axes
            dx, dy, dz, x, y, z = nx - x, ny - y, nz - z, nx + x, ny + y, nz + z
            gain = (r00 * dx + r10 * dy + r20 * dz) * (r00 * x + r10 * y + r20 * z)
            row[BATH_WORK] += 0.5 * gain * inverse_inertia[i, 0]
            gain = (r01 * dx + r11 * dy + r21 * dz) * (r01 * x + r11 * y + r21 * z)
            row[BATH_WORK] += 0.5 * gain * inverse_inertia[i, 1]
            gain = (r02 * dx + r12 * dy + r22 * dz) * (r02 * x + r12 * y + r22 * z)
            row[BATH_WORK] += 0.5 * gain * inverse_inertia[i, 2]


@kernel
def _bath_serial(velocity, spin, orientation, mass, inertia, inverse_inertia, keep, heat, move,
                 turn, noise, sums, ledger):
    for c in range(sums.shape[0]):
        _bath_chunk(c, velocity, spin, orientation, mass, inertia, inverse_inertia, keep, heat,
                    move, turn, noise, sums)
    _add_in_order(sums, ledger)


@kernel(parallel=True)
def _bath_parallel(velocity, spin, orientation, mass, inertia, inverse_inertia, keep, heat, move,
                   turn, noise, sums, ledger):
    for c in numba.prange(sums.shape[0]):
        _bath_chunk(np.int64(c), velocity, spin, orientation, mass, inertia, inverse_inertia, keep,
                    heat, move, turn, noise, sums)
    _add_in_order(sums, ledger)


def mix_with_bath(state, system, keep, heat, move, turn, noise, work, ledger):
    """One Ornstein–Uhlenbeck move of the momenta, in place.

    v → keep v + √(heat/m) ξ,   L → keep L + R √(heat I) Rᵀ ξ   with the laboratory noise ξ.

    keep : exp(−γ t);  heat : kT (1 − keep²). [u nm²/ps²]
    move, turn : whether it acts on velocities, on angular momenta.
    noise : (N, 3) or, when both, (N, 6) standard normal numbers, velocities first.
    ledger : Ledger; takes the kinetic energy and the angular momentum that came in.
    """
    run = _bath_parallel if work.parallel else _bath_serial
    run(state.velocity, state.angular_momentum, state.orientation, system.mass, system.inertia,
        system.inverse_inertia, keep, heat, move, turn, noise, work.sums, ledger.values)
