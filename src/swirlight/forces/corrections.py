"""Parts of the energy that need no pair list: tails of the Lennard-Jones cut-off, and the
constants that belong to each treatment of charges.

Model   beyond the cut-off the fluid is uniform: each site sees every type at its mean density.
        Rigid bodies have no interaction of their own, so a treatment of charges that acts on
        all pairs is given back inside a body, and what a charge does to itself is taken out.
        Both are constants of a body: they exert no force and no pressure.
Units   nm, ps, u, e; energy u nm²/ps².
"""

import numpy as np
from scipy.special import erfc

from swirlight.forces.laws import SWITCH_START
from swirlight.units import COULOMB


def switch(r, cutoff):
    """S(r) of the switched form: 1 − 10x³ + 15x⁴ − 6x⁵ from 0.9 to 1.0 cut-offs. [1]"""
    x = np.clip((r / cutoff - SWITCH_START) / (1.0 - SWITCH_START), 0.0, 1.0)
    return 1.0 - x**3 * (10.0 - x * (15.0 - 6.0 * x))


def _pair_energy(sigma, epsilon, r):
    s6 = (sigma / r) ** 6
    return 4.0 * epsilon * s6 * (s6 - 1.0)


def _per_type(system):
    """Number of sites of each type, (types,)."""
    return np.bincount(system.type_of_site, minlength=len(system.type_charge)).astype(float)


def tail_integrals(system):
    """(types, types) of ∫ (u − u_used) r² dr from where they differ to infinity. [u nm⁵/ps²]

    u_used is 0 for "tail-corrected" beyond the cut-off, S u for "switched" from 0.9 cut-offs;
    for "plain" and "force-shifted" no tail is added and the integrals are 0.
    """
    form, rc = system.interactions.cutoff_form, system.interactions.cutoff
    sigma, epsilon = system.lennard_jones
    if form not in ("switched", "tail-corrected"):
        return np.zeros_like(sigma)
    beyond = 4.0 * epsilon * sigma**3 * ((sigma / rc) ** 9 / 9.0 - (sigma / rc) ** 3 / 3.0)
    if form == "tail-corrected":
        return beyond
    start = SWITCH_START * rc
    node, weight = np.polynomial.legendre.leggauss(48)  # smooth on this stretch: exact to rounding
    r = start + 0.5 * (rc - start) * (node + 1.0)
    missing = (1.0 - switch(r, rc)) * r**2 * weight * 0.5 * (rc - start)
    return beyond + _pair_energy(sigma[..., None], epsilon[..., None], r) @ missing


def tail_energy(system, box):
    """Energy of the Lennard-Jones tails, (2π/V) Σ n_a n_b I_ab over ordered pairs of types."""
    count = _per_type(system)
    return float(2.0 * np.pi / np.prod(box) * (count @ tail_integrals(system) @ count))


def impulsive_pressure(system, box):
    """(2π/3) ρ² rc³ u(rc): pressure of the step that a plain cut leaves at rc. [u/nm/ps²]

    Summed over ordered pairs of types. No force carries it, so the virial of the pair forces
    has no part of it.
    """
    rc, count = system.interactions.cutoff, _per_type(system)
    step = _pair_energy(*system.lennard_jones, rc)
    return float(2.0 * np.pi / 3.0 * rc**3 * (count @ step @ count) / np.prod(box) ** 2)


def tail_virial(system, box):
    """Virial W of the tails, 3 V p_tail. [u nm²/ps²]

    "switched": p_tail = ρ U_tail/N exactly, as the energy goes as 1/V.
    "tail-corrected": −(2π/3) ρ² ∫ r³ u′ dr from rc, which is the same plus the impulsive
    pressure of the cut (standard; Allen & Tildesley, Computer Simulation of Liquids, from memory).
    """
    energy = tail_energy(system, box)
    if system.interactions.cutoff_form == "tail-corrected":
        return 3.0 * (energy + np.prod(box) * impulsive_pressure(system, box))
    return 3.0 * energy


# What a law of the charges adds to 1/r where r = 0: the field of a charge on itself. [1/nm]
# Ewald (1921): the smooth part. Reaction field: the continuum that the charge polarises;
# with the pairs inside it a neutral body of dipole μ gets −k μ². Damped shifted: the self term
# of Wolf et al. (1999), which Fennell & Gezelter (2006) keep (both from memory).
OWN_FIELD = {
    "ewald": lambda law: -2.0 * law.alpha / np.sqrt(np.pi),
    "reaction-field": lambda law: -float(law.smooth_energy(0.0)),
    "damped-shifted": lambda law: (-2.0 * law.alpha / np.sqrt(np.pi)
                                   - erfc(law.alpha * law.cutoff) / law.cutoff),
}


def self_energy(system, law):
    """½ Σ q² times what the law adds to 1/r at r = 0. [u nm²/ps²]"""
    if law.kind == "none":
        return 0.0
    return float(0.5 * COULOMB * OWN_FIELD[law.kind](law) * (system.site_charge**2).sum())


def intramolecular_energy(system, law):
    """Σ q q′ times what the law adds to 1/r, over the pairs inside each body. [u nm²/ps²]"""
    total = 0.0
    for species, count in zip(system.species, system.counts, strict=True):
        a, b = np.triu_indices(len(species.charge), 1)
        products = species.charge[a] * species.charge[b]
        used = products != 0.0
        if law.kind == "none" or not used.any():
            continue
        r = np.linalg.norm(species.sites[a] - species.sites[b], axis=1)[used]
        added = law.force_shift * r - law.smooth_energy(r**2)
        total += count * float(products[used] @ added)
    return COULOMB * total
