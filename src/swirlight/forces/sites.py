"""Where the charges of rigid bodies are, and what forces on them do to the bodies.

Arrays  M charges of N bodies, body after body; everything in the laboratory frame. Kernels
        check nothing.
"""

import numpy as np

from swirlight.compiled import kernel
from swirlight.rotation_kernels import matrix_entries


@kernel
def place_charges(position, orientation, first_charge, row, type_position, place):
    """Absolute places (M, 3) of the charges.

    first_charge : (N + 1,), body i has charges first_charge[i] … first_charge[i + 1] − 1.
    row : (M,) where type_position has the place of each in its body's frame.
    """
    for i in range(position.shape[0]):
        xx, xy, xz, yx, yy, yz, zx, zy, zz = matrix_entries(
            orientation[i, 0], orientation[i, 1], orientation[i, 2], orientation[i, 3])
        for m in range(first_charge[i], first_charge[i + 1]):
            s = row[m]
            bx, by, bz = type_position[s, 0], type_position[s, 1], type_position[s, 2]
            place[m, 0] = position[i, 0] + (xx * bx + xy * by + xz * bz)
            place[m, 1] = position[i, 1] + (yx * bx + yy * by + yz * bz)
            place[m, 2] = position[i, 2] + (zx * bx + zy * by + zz * bz)


@kernel
def add_to_bodies(position, orientation, freedom, mass, drifts, place, push, first_charge, force,
                  torque):
    """Add forces on charges to their bodies; return Σ f·d, d the charge's place in its body.

    Then take out of the torques what a body cannot follow (all of an atom's, a linear body's
    axial part), and where `drifts` the mass-weighted mean force: the centre of mass is not
    pushed.
    """
    work = 0.0
    for i in range(position.shape[0]):
        for m in range(first_charge[i], first_charge[i + 1]):
            fx, fy, fz = push[m]
            dx, dy = place[m, 0] - position[i, 0], place[m, 1] - position[i, 1]
            dz = place[m, 2] - position[i, 2]
            force[i, 0] += fx
            force[i, 1] += fy
            force[i, 2] += fz
            torque[i, 0] += dy * fz - dz * fy
            torque[i, 1] += dz * fx - dx * fz
            torque[i, 2] += dx * fy - dy * fx
            work += fx * dx + fy * dy + fz * dz
        if freedom[i] == 0:
            torque[i, :] = 0.0
        elif freedom[i] == 2:
            w, x, y, z = orientation[i]
            ax, ay, az = 2 * (x * z + w * y), 2 * (y * z - w * x), 1 - 2 * (x * x + y * y)
            along = ax * torque[i, 0] + ay * torque[i, 1] + az * torque[i, 2]
            torque[i, 0] -= along * ax
            torque[i, 1] -= along * ay
            torque[i, 2] -= along * az
    if drifts:
        whole = np.sum(mass)
        for a in range(3):
            mean = np.sum(force[:, a]) / whole
            for i in range(force.shape[0]):
                force[i, a] -= mass[i] * mean
    return work
