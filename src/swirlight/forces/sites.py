"""Where the sites of rigid bodies are, and what forces on sites do to the bodies.

Arrays  S sites of N bodies, body after body; everything in the laboratory frame.
Layers  kernels check nothing; `place_sites` is their door.
"""

import numpy as np

from swirlight.compiled import kernel


@kernel
def _place_sites(orientation, species_of, type_start, type_position, site_start, lever):
    for i in range(orientation.shape[0]):
        w, x, y, z = orientation[i]
        first = type_start[species_of[i]]
        for s in range(site_start[i], site_start[i + 1]):
            bx, by, bz = type_position[first + s - site_start[i]]
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
def choose_places(position, lever, site, body, place):
    """Absolute places of some sites: rows `site` of the levers, on bodies `body`."""
    for m in range(site.shape[0]):
        for a in range(3):
            place[m, a] = position[body[m], a] + lever[site[m], a]


@kernel
def add_to_bodies(site_force, lever, site, body, force, torque):
    """Add forces on some sites to their bodies, and d × f to the torques; return Σ f·d."""
    work = 0.0
    for m in range(site.shape[0]):
        i = body[m]
        s = site[m]
        fx, fy, fz = site_force[m, 0], site_force[m, 1], site_force[m, 2]
        dx, dy, dz = lever[s, 0], lever[s, 1], lever[s, 2]
        force[i, 0] += fx
        force[i, 1] += fy
        force[i, 2] += fz
        torque[i, 0] += dy * fz - dz * fy
        torque[i, 1] += dz * fx - dx * fz
        torque[i, 2] += dx * fy - dy * fx
        work += fx * dx + fy * dy + fz * dz
    return work


@kernel
def restrict_torques(orientation, freedom, torque):
    """Take out what a body cannot follow: all of an atom's torque, a linear body's axial part."""
    for i in range(orientation.shape[0]):
        if freedom[i] == 0:
            torque[i, :] = 0.0
        elif freedom[i] == 2:
            w, x, y, z = orientation[i]
            ax, ay, az = 2 * (x * z + w * y), 2 * (y * z - w * x), 1 - 2 * (x * x + y * y)
            along = ax * torque[i, 0] + ay * torque[i, 1] + az * torque[i, 2]
            torque[i, 0] -= along * ax
            torque[i, 1] -= along * ay
            torque[i, 2] -= along * az


@kernel
def remove_mean_force(mass, force):
    """Take the mass-weighted mean force off every body: the centre of mass is not pushed."""
    whole = np.sum(mass)
    for a in range(3):
        mean = np.sum(force[:, a]) / whole
        for i in range(force.shape[0]):
            force[i, a] -= mass[i] * mean
