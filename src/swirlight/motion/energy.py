"""Kinetic energies, angular velocities and kinetic temperatures."""

import numpy as np

from swirlight.compiled import kernel
from swirlight.rotation_kernels import matrix_entries
from swirlight.units import BOLTZMANN


@kernel
def _kinetic(velocity, spin, orientation, mass, inverse_inertia):
    translation, rotation = 0.0, 0.0
    for i in range(velocity.shape[0]):
        x, y, z = velocity[i, 0], velocity[i, 1], velocity[i, 2]
        translation += mass[i] * (x * x + y * y + z * z)
        r00, r01, r02, r10, r11, r12, r20, r21, r22 = matrix_entries(
            orientation[i, 0], orientation[i, 1], orientation[i, 2], orientation[i, 3])
        x, y, z = spin[i, 0], spin[i, 1], spin[i, 2]
        rotation += (r00 * x + r10 * y + r20 * z) ** 2 * inverse_inertia[i, 0]
        rotation += (r01 * x + r11 * y + r21 * z) ** 2 * inverse_inertia[i, 1]
        rotation += (r02 * x + r12 * y + r22 * z) ** 2 * inverse_inertia[i, 2]
    return 0.5 * translation, 0.5 * rotation


@kernel
def _angular_velocity(spin, orientation, inverse_inertia, out):
    for i in range(spin.shape[0]):
        r00, r01, r02, r10, r11, r12, r20, r21, r22 = matrix_entries(
            orientation[i, 0], orientation[i, 1], orientation[i, 2], orientation[i, 3])
        x, y, z = spin[i, 0], spin[i, 1], spin[i, 2]
        a = (r00 * x + r10 * y + r20 * z) * inverse_inertia[i, 0]
        b = (r01 * x + r11 * y + r21 * z) * inverse_inertia[i, 1]
        c = (r02 * x + r12 * y + r22 * z) * inverse_inertia[i, 2]
        out[i, 0] = r00 * a + r01 * b + r02 * c
        out[i, 1] = r10 * a + r11 * b + r12 * c
        out[i, 2] = r20 * a + r21 * b + r22 * c


def kinetic_energies(system, state):
    """Σ ½ m v² and Σ ½ L·I⁻¹L. [u nm²/ps²]"""
    return _kinetic(state.velocity, state.angular_momentum, state.orientation, system.mass,
                    system.inverse_inertia)


def angular_velocity(system, state):
    """(N, 3) ω = R I⁻¹ Rᵀ L, laboratory frame; none about the axis of a linear body. [rad/ps]"""
    out = np.empty((system.bodies, 3))
    _angular_velocity(state.angular_momentum, state.orientation, system.inverse_inertia, out)
    return out


def kinetic_temperature(energy, freedom):
    """2K/(f k) of f degrees of freedom; NaN where there is none. [K]"""
    return 2.0 * energy / (freedom * BOLTZMANN) if freedom > 0 else np.nan
