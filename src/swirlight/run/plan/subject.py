"""What `swirlight check` looks at, gathered once for all its parts."""

from dataclasses import dataclass
from functools import cached_property

import numpy as np

from swirlight.light.regime import rotation_rate
from swirlight.units import BOLTZMANN


@dataclass(frozen=True)
class Subject:
    """A config and what follows from it without running anything.

    config : validated. system : System. box : (3,) [nm].
    pulses : as written, their coupling decided. bias : light.pulse.Bias or None.
    lit : the lit stage of the config, or None. lit_length : of it [ps], 0 without.
    exposures : every trajectory, run.exposures.Exposure.
    """

    config: object
    system: object
    box: np.ndarray
    pulses: tuple = ()
    bias: object = None
    lit: object = None
    lit_length: float = 0.0
    exposures: tuple = ()

    @cached_property
    def energy(self):
        """kT. [u nm²/ps²]"""
        return BOLTZMANN * self.system.temperature

    @cached_property
    def rotation_period(self):
        """T_rot of the fastest thermal rotation; inf with atoms only. [ps]"""
        rate = rotation_rate(self.system)
        return 2.0 * np.pi / rate if rate else np.inf

    @property
    def counted_species(self):
        """(species, count) pairs."""
        return tuple(zip(self.system.species, self.system.counts, strict=True))

    @property
    def last_stage(self):
        """The recorded stage."""
        return self.config.stages[-1]


