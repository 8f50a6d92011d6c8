"""Thermal momenta and random orientations, drawn from the generator in the state.

Bodies at temperature T have each Cartesian velocity and each angular momentum about a
principal axis normally distributed, with variances kT/m and kT I (Maxwell 1860; textbook
equipartition). Linear bodies have none about their axis, atoms none at all.
"""

import numpy as np

from swirlight.motion.freedom import remove_total_momentum
from swirlight.rotation import normalised, to_laboratory
from swirlight.units import BOLTZMANN


def draw_orientations(count, random):
    """(count, 4) unit quaternions, uniform over rotations (normalised normal vectors)."""
    return normalised(random.standard_normal((count, 4)))


def draw_velocities(system, random):
    """(N, 3) Maxwell velocities at the system's temperature. [nm/ps]"""
    width = np.sqrt(BOLTZMANN * system.temperature / system.mass)
    return width[:, None] * random.standard_normal((system.bodies, 3))


def draw_angular_momenta(system, orientation, random):
    """(N, 3) thermal angular momenta at the system's temperature, laboratory. [u nm²/ps]"""
    width = np.sqrt(BOLTZMANN * system.temperature * system.inertia)
    return to_laboratory(orientation, width * random.standard_normal((system.bodies, 3)))


def draw_motion(system, state, without_total_momentum=True):
    """Replace the velocities and angular momenta of a state by drawn ones."""
    state.velocity[:] = draw_velocities(system, state.random)
    state.angular_momentum[:] = draw_angular_momenta(system, state.orientation, state.random)
    if without_total_momentum:
        remove_total_momentum(system, state)
