"""Where the sites of rigid bodies are, and what forces on sites do to the bodies.

Arrays  S sites of N bodies, body after body; everything in the laboratory frame.
Layers  kernels check nothing; `place_sites` is their door.
"""

import numpy as np

from swirlight.compiled import kernel


@kernel
def _place_sites(orientation, species_of, type_start, type_position, site_start, lever):
    for i in range(orientation.shape[0]):
        # Written out: `w, x, y, z = orientation[i]` tests lengths, at three times the cost.
        w, x, y, z = (orientation[i, 0], orientation[i, 1], orientation[i, 2],
                      orientation[i, 3])
        first = type_start[species_of[i]]
        for s in range(site_start[i], site_start[i + 1]):
            k = first + s - site_start[i]
            bx, by, bz = type_position[k, 0], type_position[k, 1], type_position[k, 2]
            lever[s, 0] = ((1 - 2 * (y * y + z * z)) * bx + 2 * (x * y - w * z) * by
                           + 2 * (x * z + w * y) * bz)
            lever[s, 1] = (2 * (x * y + w * z) * bx + (1 - 2 * (x * x + z * z)) * by
                           + 2 * (y * z - w * x) * bz)
            lever[s, 2] = (2 * (x * z - w * y) * bx + 2 * (y * z + w * x) * by
                           + (1 - 2 * (x * x + y * y)) * bz)


def place_sites(system, position, orientation, out_lever):
    """Write the lever arm d = R x_body of every site; centre + d is where the site is. [nm]

    position : (N, 3), only its length is looked at. [nm]
    orientation : (N, 4) unit quaternions, scalar first, body to laboratory.
    out_lever : (S, 3) float64, overwritten and returned.
    Raises ValueError for arrays of another shape.
    """
    sites = int(system.site_start[-1])
    if (position.shape != (system.bodies, 3) or orientation.shape != (system.bodies, 4)
            or out_lever.shape != (sites, 3)):
        raise ValueError(
            f"expected shapes ({system.bodies}, 3), ({system.bodies}, 4) and ({sites}, 3), got"
            f" {position.shape}, {orientation.shape} and {out_lever.shape}"
        )
    _place_sites(orientation, system.species_of, system.type_start, system.type_position,
                 system.site_start, out_lever)
    return out_lever


@kernel
def place_charges(position, orientation, first_charge, row, type_position, place):
    """Absolute places (M, 3) of the charges.

    first_charge : (N + 1,), body i has charges first_charge[i] … first_charge[i + 1] − 1.
    row : (M,) where type_position has the place of each in its body's frame.
    """
    for i in range(position.shape[0]):
        w, x, y, z = (orientation[i, 0], orientation[i, 1], orientation[i, 2],
                      orientation[i, 3])
        xx, xy, xz = 1 - 2 * (y * y + z * z), 2 * (x * y - w * z), 2 * (x * z + w * y)
        yx, yy, yz = 2 * (x * y + w * z), 1 - 2 * (x * x + z * z), 2 * (y * z - w * x)
        zx, zy, zz = 2 * (x * z - w * y), 2 * (y * z + w * x), 1 - 2 * (x * x + y * y)
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
