"""Figures of `swirlight check` that belong to no other room, on numbers in internal units.

What one pulse is to one body (wells, impulses, photons) stands in `swirlight.light.limits`.
Derived here, except where a source is named.
"""

import numpy as np

from swirlight.species.body import ATOM, LINEAR
from swirlight.units import BOLTZMANN, HBAR


def rotation_periods(inertia, temperature):
    """(3,) T_rot = 2π√(I/kT) about each principal axis, 0 where there is no moment. [ps]

    inertia : (3,) principal moments [u nm²]; temperature : [K].
    """
    return 2.0 * np.pi * np.sqrt(np.asarray(inertia, float) / (BOLTZMANN * temperature))


def quantum_rotation(inertia, temperature):
    """(3,) ħ²/(2 I kT) about each principal axis, 0 where there is no moment."""
    action = 2.0 * np.asarray(inertia, float) * BOLTZMANN * temperature
    return np.divide(HBAR**2, action, out=np.zeros(3), where=action > 0.0)


def photon_over_kt(carrier, temperature):
    """ħω/kT. carrier : ω [rad/ps]; temperature : [K]."""
    return HBAR * carrier / (BOLTZMANN * temperature)


def kinetic_heat_capacity(freedom):
    """C_V of the classical kinetic energy alone, (3 + f) k/2 per body. [u nm²/ps²/K]

    freedom : rotational degrees of freedom of the body, 0, 2 or 3.
    """
    return 0.5 * (3 + freedom) * BOLTZMANN


def absorbed_spin(absorptive, freedom, s3, dose):
    """Light impulse along k̂ per body by absorption, at random orientations. [u nm²/ps]

    (Tr αD/6)∫G dt, which is s3 ħ per photon; (α∥ + α⊥)/6 for a linear body, nothing for an atom.
    absorptive : (3, 3) αD, body frame, z along a linear body. [e² ps²/u]
    dose : ∫|𝓔|² dt at the body. [(u nm/ps²/e)² ps]
    """
    if freedom == ATOM:
        return 0.0
    a = np.asarray(absorptive, float)
    share = a[2, 2] + 0.5 * (a[0, 0] + a[1, 1]) if freedom == LINEAR else np.trace(a)
    return float(share / 6.0 * s3 * dose)
