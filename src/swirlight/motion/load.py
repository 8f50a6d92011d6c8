"""What acts on the bodies at one instant, source by source."""

from dataclasses import dataclass
from typing import Any

import numpy as np

from swirlight.motion.kernels import NONE


@dataclass
class Load:
    """Forces and torques at the current positions; buffers are reused by the next step.

    bodies : N.
    time : since the stage began. [ps]
    pair : Forces of the interactions, or None.
    light : LightLoad of light and bias field, or None.
    light_sums : LightEnergies at this instant; None without light, or when not asked for.
    """

    bodies: int
    time: float = 0.0
    pair: Any = None
    light: Any = None
    light_sums: Any = None

    def of_pairs(self):
        """(force, torque) of the interactions; without rows where there is none."""
        return _pair(self.pair, "force", "torque")

    def of_light(self):
        """(force, torque) of the light; likewise."""
        return _pair(self.light, "force", "torque")

    def of_bias(self):
        """(force, torque) of the static bias field; likewise."""
        return _pair(self.light, "bias_force", "bias_torque")

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
        return 0.0 if self.pair is None else self.pair.energy

    def _sum(self, which):
        total = np.zeros((self.bodies, 3))
        for source in (self.of_pairs(), self.of_light(), self.of_bias()):
            if len(source[which]):
                total += source[which]
        return total

    def _filled(self, rows):
        return rows.copy() if len(rows) else np.zeros((self.bodies, 3))


def _pair(source, force, torque):
    if source is None:
        return NONE, NONE
    parts = getattr(source, force, None), getattr(source, torque, None)
    return tuple(NONE if part is None else part for part in parts)
