"""Langevin dynamics of velocities and angular momenta.

The Ornstein–Uhlenbeck part is solved exactly between two half drifts, as in Davidchack,
Ouldridge & Tretyakov, J. Chem. Phys. 142, 144114 (2015). The noise is drawn in the
laboratory frame and turned into the body, so that two runs of the same bodies under
different light, with copies of one generator, feel the same knocks.
"""

import math

from swirlight.motion.kernels import mix_with_bath
from swirlight.units import BOLTZMANN


class Langevin:
    """A thermostat: friction γ and the noise that belongs to it.

    friction : γ, one rate for translation and rotation. [1/ps]
    temperature : T. [K]
    acts_on : "all", "translation" or "rotation".
    """

    def __init__(self, friction, temperature, acts_on="all"):
        self.friction, self.temperature = friction, temperature
        self.acts_on_translation = acts_on in ("all", "translation")
        self.acts_on_rotation = acts_on in ("all", "rotation")

    @property
    def conserves_momentum(self):
        """Whether the total momentum of the box survives it."""
        return not self.acts_on_translation

    def act(self, state, system, timestep, work, ledger):
        """Thermalise for one step, in place, with one block of noise from the state."""
        turn = self.acts_on_rotation and bool(system.inertia.any())
        width = 3 * (self.acts_on_translation + turn)
        if width:
            keep = math.exp(-self.friction * timestep)
            heat = -BOLTZMANN * self.temperature * math.expm1(-2.0 * self.friction * timestep)
            noise = state.random.standard_normal((system.bodies, width))
            mix_with_bath(state, system, keep, heat, self.acts_on_translation, turn, noise, work,
                          ledger)
