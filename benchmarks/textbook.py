"""The plain twin: the loop over pairs of rigid bodies as a textbook writes it.

Double precision, one thread, a half list of bodies, each pair of sites tested against the
cutoff, math.erfc, Newton's third law. Lennard-Jones plain, f = 24ε[2(σ/r)¹² − (σ/r)⁶] r⃗/r²;
real-space Ewald, f = k q q' [erfc(αr)/r + 2α/√π exp(−α²r²)] r⃗/r² (Allen & Tildesley, Computer
Simulation of Liquids, 2nd ed. 2017, chapters 5 and 6; from memory). numba compiles it with its
default settings, except that divisions by zero are not looked for.
"""

import math

import numpy as np
from scipy.spatial import cKDTree
from systems import site_places

from swirlight.compiled import numba
from swirlight.units import COULOMB


@numba.njit(error_model="numpy")
def _place(orientation, body_sites, lever):
    for i in range(orientation.shape[0]):
        w, x, y, z = orientation[i]
        for a in range(body_sites.shape[0]):
            bx, by, bz = body_sites[a]
            lever[i, a, 0] = ((1 - 2 * (y * y + z * z)) * bx + 2 * (x * y - w * z) * by
                              + 2 * (x * z + w * y) * bz)
            lever[i, a, 1] = (2 * (x * y + w * z) * bx + (1 - 2 * (x * x + z * z)) * by
                              + 2 * (y * z - w * x) * bz)
            lever[i, a, 2] = (2 * (x * z - w * y) * bx + 2 * (y * z + w * x) * by
                              + (1 - 2 * (x * x + y * y)) * bz)


@numba.njit(error_model="numpy")
def _pair_forces(position, box, lever, start, neighbour, sigma, epsilon, product, cutoff, alpha,
                 force, torque):
    sites = lever.shape[1]
    force[:] = 0.0
    torque[:] = 0.0
    for i in range(position.shape[0]):
        for n in range(start[i], start[i + 1]):
            j = neighbour[n]
            dx = position[i, 0] - position[j, 0]
            dy = position[i, 1] - position[j, 1]
            dz = position[i, 2] - position[j, 2]
            dx -= box[0] * np.rint(dx / box[0])
            dy -= box[1] * np.rint(dy / box[1])
            dz -= box[2] * np.rint(dz / box[2])
            for a in range(sites):
                for b in range(sites):
                    rx = dx + lever[i, a, 0] - lever[j, b, 0]
                    ry = dy + lever[i, a, 1] - lever[j, b, 1]
                    rz = dz + lever[i, a, 2] - lever[j, b, 2]
                    r2 = rx * rx + ry * ry + rz * rz
                    if r2 >= cutoff * cutoff:
                        continue
                    f = 0.0
                    if epsilon[a, b] > 0.0:
                        six = (sigma[a, b] * sigma[a, b] / r2) ** 3
                        f += 24.0 * epsilon[a, b] * (2.0 * six * six - six) / r2
                    if product[a, b] != 0.0:
                        r = math.sqrt(r2)
                        screened = math.erfc(alpha * r) / r
                        bell = 2.0 * alpha / math.sqrt(math.pi) * math.exp(-alpha * alpha * r2)
                        f += product[a, b] * (screened + bell) / r2
                    fx, fy, fz = f * rx, f * ry, f * rz
                    force[i, 0] += fx
                    force[i, 1] += fy
                    force[i, 2] += fz
                    force[j, 0] -= fx
                    force[j, 1] -= fy
                    force[j, 2] -= fz
                    torque[i, 0] += lever[i, a, 1] * fz - lever[i, a, 2] * fy
                    torque[i, 1] += lever[i, a, 2] * fx - lever[i, a, 0] * fz
                    torque[i, 2] += lever[i, a, 0] * fy - lever[i, a, 1] * fx
                    torque[j, 0] -= lever[j, b, 1] * fz - lever[j, b, 2] * fy
                    torque[j, 1] -= lever[j, b, 2] * fx - lever[j, b, 0] * fz
                    torque[j, 2] -= lever[j, b, 0] * fy - lever[j, b, 1] * fx


def half_list(system, state, reach):
    """Pairs of bodies with any two sites within reach, each once: row starts and neighbours."""
    place, owner = site_places(system, state)
    pairs = owner[cKDTree(place, boxsize=state.box).query_pairs(reach, output_type="ndarray")]
    pairs = np.sort(pairs[pairs[:, 0] != pairs[:, 1]], axis=1)
    first, second = np.divmod(np.unique(pairs[:, 0] * system.bodies + pairs[:, 1]), system.bodies)
    return np.searchsorted(first, np.arange(system.bodies + 1)), second


class Textbook:
    """The twin for a system of one species, its list ready: call it for force and torque.

    alpha : Ewald splitting. [1/nm]
    skin : of the list, beyond the cutoff. [nm]
    Raises ValueError for a box that needs more than one image of a body.
    """

    def __init__(self, system, state, alpha, skin):
        (species,), self.state = system.species, state
        cutoff = system.interactions.cutoff
        if np.min(state.box) < 2 * (cutoff + skin + 2 * species.radius):
            raise ValueError("the box is too small for one image of each body")
        sigma, epsilon = system.lennard_jones
        product = COULOMB * np.outer(species.charge, species.charge)
        self.sites = np.ascontiguousarray(species.sites)
        self.lever = np.empty((system.bodies, len(self.sites), 3))
        self.fixed = (*half_list(system, state, cutoff + skin), sigma, epsilon, product, cutoff,
                      alpha)
        self.force, self.torque = np.empty((2, system.bodies, 3))

    def __call__(self):
        _place(self.state.orientation, self.sites, self.lever)
        _pair_forces(self.state.position, self.state.box, self.lever, *self.fixed, self.force,
                     self.torque)
        return self.force, self.torque
