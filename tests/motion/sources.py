"""Plain sources of force for the tests of motion, one formula each, in numpy."""

from types import SimpleNamespace

import numpy as np

from swirlight.rotation import rotation_matrix, to_laboratory


class Springs:
    """Every centre on a spring, every dipole in a fixed, uneven field: conservative.

    U = Σ ½ k x² − Σ μ·E − ½ Σ c (u·ẑ)⁴ with body z axis u.
    """

    def __init__(self, system, stiffness=40.0, field=(3.0, -2.0, 5.0), depth=4.0):
        self.system, self.stiffness, self.depth = system, stiffness, depth
        self.field = np.array(field)
        self.dipole = np.array([s.dipole for s in system.species])[system.species_of]

    def evaluate(self, position, orientation, box, energies=True):
        dipole = to_laboratory(orientation, self.dipole)
        axis = rotation_matrix(orientation)[:, :, 2]
        height = axis[:, 2]
        # torque u × (−∂U/∂u)
        torque = np.cross(dipole, self.field) + np.cross(
            axis, 2 * self.depth * height[:, None] ** 3 * np.array([0, 0, 1.0]))
        torque[self.system.freedom == 0] = 0
        linear = self.system.freedom == 2
        torque[linear] -= (torque * axis).sum(1)[linear, None] * axis[linear]
        energy = 0.5 * self.stiffness * (position**2).sum() - (dipole @ self.field).sum()
        energy -= 0.5 * self.depth * (height[self.system.freedom > 0] ** 4).sum()
        return SimpleNamespace(force=-self.stiffness * position, torque=torque, energy=energy,
                               terms={}, virial=0.0)


class Broken:
    """No forces, until one turns into NaN at a given call."""

    def __init__(self, system, call, body, what="force"):
        self.shape, self.call, self.body, self.what = (system.bodies, 3), call, body, what

    def evaluate(self, position, orientation, box, energies=True):
        arrays = {"force": np.zeros(self.shape), "torque": np.zeros(self.shape)}
        self.call -= 1
        if self.call == 0:
            arrays[self.what][self.body, 1] = np.nan
        return SimpleNamespace(**arrays, energy=0.0, terms={}, virial=0.0)
