"""Slow pair forces for force fields in tests: each pair of sites once, nearest image of each.

The laws are those of the plain twin of the pair forces, which visits every image instead.
"""

from dataclasses import dataclass

import numpy as np

from swirlight.units import COULOMB
from tests.forces.plain_pairs import coulomb, lennard_jones
from tests.reference.plain import levers, owners, to_bodies


@dataclass
class PlainSums:
    lennard_jones: float
    coulomb: float
    virial: np.ndarray


class PlainPairs:
    """Same calls as swirlight.forces.pairs.PairForces."""

    def __init__(self, system, coulomb, box):
        self.system, self.law = system, coulomb
        owner = owners(system)
        self.a, self.b = np.nonzero(owner[:, None] < owner[None, :])

    def evaluate(self, position, orientation, box, force, torque, energies=False):
        system, rc = self.system, self.law.cutoff
        lever, owner, kind = levers(system, orientation), owners(system), system.type_of_site
        place = position[owner] + lever
        apart = place[self.a] - place[self.b]
        apart -= np.round(apart / box) * box
        r = np.sqrt((apart**2).sum(axis=1))
        near = r < rc
        a, b, apart, r = self.a[near], self.b[near], apart[near], r[near]
        sigma, epsilon = (t[kind[a], kind[b]] for t in system.lennard_jones)
        u_lj, f_lj = lennard_jones(r, sigma, epsilon, system.interactions.cutoff_form, rc)
        kqq = COULOMB * system.site_charge[a] * system.site_charge[b]
        u_c, f_c = coulomb(r, self.law)
        pull = ((f_lj + kqq * f_c) / r)[:, None] * apart
        on_sites = np.zeros((len(owner), 3))
        np.add.at(on_sites, a, pull)
        np.add.at(on_sites, b, -pull)
        force[:], torque[:] = to_bodies(system, lever, on_sites)
        if not energies:
            return None
        centres = apart - lever[a] + lever[b]
        return PlainSums(float(u_lj.sum()), float((kqq * u_c).sum()), (centres * pull).sum(axis=0))

    def memory(self):
        return {}

    def restore(self, memory):
        pass
