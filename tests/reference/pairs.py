"""Slow twin of the pair forces: every pair of sites, images one by one, double precision."""

from dataclasses import dataclass

import numpy as np
from scipy.special import erfc

from swirlight.units import COULOMB
from tests.reference.plain import levers, owners, to_bodies


@dataclass
class PlainSums:
    lennard_jones: float
    coulomb: float
    virial: np.ndarray


def coulomb_pair(law, r):
    """u and −u′ of two unit charges without the constant ke."""
    rc = law.cutoff
    if law.kind == "none":
        return np.zeros_like(r), np.zeros_like(r)
    if law.kind == "reaction-field":
        eps = law.epsilon_rf
        k = 0.5 / rc**3 if np.isinf(eps) else (eps - 1) / (2 * eps + 1) / rc**3
        return 1 / r + k * r**2 - 1 / rc - k * rc**2, 1 / r**2 - 2 * k * r

    def screened(x):
        return (erfc(law.alpha * x) / x, erfc(law.alpha * x) / x**2
                + 2 * law.alpha / np.sqrt(np.pi) * np.exp(-((law.alpha * x) ** 2)) / x)

    u, f = screened(r)
    if law.kind == "damped-shifted":
        u_edge, f_edge = screened(rc)
        return u - u_edge + f_edge * (r - rc), f - f_edge
    return u, f


def lennard_jones_pair(form, cutoff, sigma, epsilon, r):
    """u and −u′ in one of the four cut-off forms."""
    def full(x):
        s = (sigma / x) ** 6
        return 4 * epsilon * s * (s - 1), 24 * epsilon * s * (2 * s - 1) / x

    u, f = full(r)
    if form == "force-shifted":
        u_edge, f_edge = full(cutoff)
        return u - u_edge + (r - cutoff) * f_edge, f - f_edge
    if form == "switched":
        x = np.clip((r - 0.9 * cutoff) / (0.1 * cutoff), 0, 1)
        s = 1 - 10 * x**3 + 15 * x**4 - 6 * x**5
        slope = (-30 * x**2 + 60 * x**3 - 30 * x**4) / (0.1 * cutoff)
        return u * s, f * s - u * slope
    return u, f


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
        u_lj, f_lj = lennard_jones_pair(system.interactions.cutoff_form, rc, sigma, epsilon, r)
        kqq = COULOMB * system.site_charge[a] * system.site_charge[b]
        u_c, f_c = coulomb_pair(self.law, r)
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
