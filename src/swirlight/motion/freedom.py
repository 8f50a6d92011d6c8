"""Degrees of freedom: how many there are, and the total momentum that takes three away."""

from dataclasses import dataclass

import numpy as np

NEUTRAL = 1e-9  # e; a box with less net charge feels no net force in a uniform field
ROUNDING = 1e-10  # of Σ m|v|; a total momentum below this share is left as it is


@dataclass(frozen=True)
class Freedom:
    """Degrees of freedom of the whole box."""

    translation: int
    rotation: int

    @property
    def total(self):
        """Translation and rotation together."""
        return self.translation + self.rotation


def degrees_of_freedom(system, momentum_conserved):
    """Count them: 3 a body less 3 for a conserved total momentum, and 0, 2 or 3 rotational."""
    translation = 3 * system.bodies - (3 if momentum_conserved else 0)
    return Freedom(translation, int(system.freedom.sum()))


def spares_momentum(thermostat):
    """Whether a thermostat (or None) leaves the total momentum of the box alone."""
    return thermostat is None or thermostat.conserves_momentum


def conserves_momentum(system, thermostat, light):
    """Whether a stage keeps the total momentum of the box.

    thermostat : None or a thermostat with `conserves_momentum`.
    light : None, or something with `pulses` and `bias`. Only carrier-resolved pulses and a
        static field push a net charge; averaged light pushes nothing.
    """
    charged = abs(float(system.charge.sum())) > NEUTRAL
    pushed = charged and light is not None and (
        light.bias is not None or any(p.coupling == "resolved" for p in light.pulses))
    return not pushed and bool(spares_momentum(thermostat))


def remove_total_momentum(system, state):
    """Take the velocity of the common centre of mass from every body, in place.

    A total momentum of rounding size is left alone, so that doing it twice changes nothing.
    """
    momentum = system.mass @ state.velocity
    scale = system.mass @ np.abs(state.velocity)
    if np.any(np.abs(momentum) > ROUNDING * scale):
        state.velocity -= momentum / system.mass.sum()
