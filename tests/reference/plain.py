"""Slow twins of the forces, written apart from the package: plain loops, complex numbers.

Nothing of swirlight.forces is used here; only the tables of the system and the constants.
"""

import cmath
import math
from itertools import product

import numpy as np

from swirlight.units import COULOMB


def rotation(q):
    """(3, 3) matrix of a unit quaternion, as the product q x q*."""
    w, v = q[0], np.asarray(q[1:])
    cross = np.array([[0, -v[2], v[1]], [v[2], 0, -v[0]], [-v[1], v[0], 0]])
    return np.eye(3) + 2 * w * cross + 2 * cross @ cross


def levers(system, orientation):
    """(S, 3) lever arms, body after body."""
    rows = []
    for i, k in enumerate(system.species_of):
        rows += [rotation(orientation[i]) @ x for x in system.species[k].sites]
    return np.array(rows)


def owners(system):
    """(S,) the body of each site."""
    return np.repeat(np.arange(system.bodies), np.diff(system.site_start))


def to_bodies(system, lever, site_force):
    """Forces on sites -> (N, 3) forces and torques."""
    force, torque = np.zeros((2, system.bodies, 3))
    np.add.at(force, owners(system), site_force)
    np.add.at(torque, owners(system), np.cross(lever, site_force))
    return force, torque


def ewald_sum(system, position, orientation, box, alpha, digits=12.5):
    """Charges only -> dict energy, force, torque, virial (centres scaled), whole Ewald sum.

    Real space over as many cells, and waves as long, as `digits` decimal digits need.
    """
    lever, owner, q = levers(system, orientation), owners(system), system.site_charge
    place = position[owner] + lever
    reach = math.sqrt(digits * math.log(10.0))
    cells = [range(-n, n + 1) for n in (int(math.ceil(reach / alpha / e)) + 1 for e in box)]
    energy, virial = 0.0, 0.0
    force = np.zeros((len(q), 3))
    for a in range(len(q)):
        for b in range(len(q)):
            for cell in product(*cells):
                apart = (place[a] - place[b]
                         - np.round((place[a] - place[b]) / box) * box + np.array(cell) * box)
                r = math.sqrt(apart @ apart)
                centres = apart - lever[a] + lever[b]
                inside = owner[a] == owner[b] and np.abs(centres).max() < 1e-9
                if r > (reach + 0.5) / alpha and not inside:
                    continue
                if a == b and inside:
                    energy -= 0.5 * COULOMB * q[a] ** 2 * 2 * alpha / math.sqrt(math.pi)
                    continue
                kqq = COULOMB * q[a] * q[b]
                bell = 2 * alpha / math.sqrt(math.pi) * math.exp(-((alpha * r) ** 2))
                if inside:
                    energy -= 0.5 * kqq * math.erf(alpha * r) / r
                    continue  # a force along a rigid body: nothing comes of it
                energy += 0.5 * kqq * math.erfc(alpha * r) / r
                pull = kqq * (math.erfc(alpha * r) / r + bell) / r**2 * apart
                force[a] += pull
                virial += 0.5 * float(pull @ centres)
    longest = 2 * alpha * reach
    tops = [range(-n, n + 1) for n in (int(longest * e / 2 / math.pi) + 1 for e in box)]
    volume = float(np.prod(box))
    for n in product(*tops):
        k = 2 * math.pi * np.array(n) / box
        k2 = float(k @ k)
        if k2 == 0.0 or k2 > longest**2:
            continue
        waves = [cmath.exp(1j * float(k @ x)) for x in place]
        total = sum(qa * w for qa, w in zip(q, waves, strict=True))
        strength = 2 * math.pi * COULOMB / volume * math.exp(-k2 / 4 / alpha**2) / k2
        energy += strength * abs(total) ** 2
        # dU/dlnλ: the prefactor, and S through k·d with k ~ 1/λ and the levers kept.
        turning = sum(qa * -1j * float(k @ d) * w
                      for qa, d, w in zip(q, lever, waves, strict=True))
        virial -= (strength * abs(total) ** 2 * (-3 + 2 + k2 / 2 / alpha**2)
                   + 2 * strength * (total.conjugate() * turning).real)
        for a in range(len(q)):
            force[a] += -2 * strength * q[a] * k * (total.conjugate() * 1j * waves[a]).real
    on_bodies = to_bodies(system, lever, force)
    return {"energy": energy, "force": on_bodies[0], "torque": on_bodies[1], "virial": virial}
