"""What acts on the bodies at one instant, source by source."""

from collections.abc import Callable
from dataclasses import dataclass
from functools import cached_property
from typing import Any

import numpy as np

from swirlight.motion.kernels import NONE


@dataclass
class Load:
    """Forces and torques at the current positions; buffers are reused by the next step.

    bodies : N.
    time : since the stage began. [ps]
    field : Forces of the interactions, or None.
    light : LightLoad of light and bias field, or None.
    sum_light : gives the LightEnergies of this instant, or None without light.
    """

    bodies: int
    time: float = 0.0
    field: Any = None
    light: Any = None
    sum_light: Callable = lambda: None

    def of_pairs(self):
        """(force, torque) of the interactions; without rows where there is none."""
        return _force_and_torque(self.field, "force", "torque")

    def of_light(self):
        """(force, torque) of the light; likewise."""
        return _force_and_torque(self.light, "force", "torque")

    def of_bias(self):
        """(force, torque) of the static bias field; likewise."""
        return _force_and_torque(self.light, "bias_force", "bias_torque")

    @property
    def force(self):
        """(N, 3) force of all causes. [u nm/ps²]"""
        return self._sum(0)

    @property
    def torque(self):
        """(N, 3) torque of all causes, laboratory frame. [u nm²/ps²]"""
        return self._sum(1)

    @property
    def light_torque(self):
        """(N, 3) torque of the light alone. [u nm²/ps²]"""
        return self._filled(self.of_light()[1])

    @property
    def energy(self):
        """Energy of the interactions, 0 without any, None if it was not asked for."""
        return 0.0 if self.field is None else self.field.energy

    @property
    def virial(self):
        """Molecular virial of the interactions, likewise. [u nm²/ps²]"""
        return 0.0 if self.field is None else self.field.virial

    @cached_property
    def light_sums(self):
        """LightEnergies at this instant, None without light; to be read before the next step."""
        return self.sum_light()

    @property
    def light_force(self):
        """(N, 3) force of the light on net charges. [u nm/ps²]"""
        return self._filled(self.of_light()[0])

    @property
    def light_energy(self):
        """−¼Σ(e*·αS e + g·G) or −M·E − ½ΣE·αS·E; reported, never part of H0. [u nm²/ps²]"""
        return self.light_sums.light_energy if self.light_sums else 0.0

    @property
    def bias_energy(self):
        """−M·F of the static field; never part of H0. [u nm²/ps²]"""
        return self.light_sums.bias_energy if self.light_sums else 0.0

    @property
    def absorbed_power(self):
        """Σ ½ω e*·αD e over the bodies. [u nm²/ps³]"""
        return self.light.absorbed_power if self.light else 0.0

    def _sum(self, which):
        total = np.zeros((self.bodies, 3))
        for source in (self.of_pairs(), self.of_light(), self.of_bias()):
            if len(source[which]):
                total += source[which]
        return total

    def _filled(self, rows):
        return rows.copy() if len(rows) else np.zeros((self.bodies, 3))


def _force_and_torque(source, force, torque):
    if source is None:
        return NONE, NONE
    parts = getattr(source, force, None), getattr(source, torque, None)
    return tuple(NONE if part is None else part for part in parts)
