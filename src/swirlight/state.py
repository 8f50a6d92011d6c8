"""What changes during a run: where the bodies are, how they move, and the noise to come."""

import copy
import json
from dataclasses import dataclass, field

import numpy as np


@dataclass
class State:
    """Positions, orientations and momenta of N bodies, all float64, C order.

    position : (N, 3) centres of mass, unwrapped. [nm]
    orientation : (N, 4) unit quaternions, scalar first, body frame to laboratory. [1]
    velocity : (N, 3) [nm/ps]
    angular_momentum : (N, 3) about the centre of mass, laboratory frame. [u nm²/ps]
    box : (3,) edges. [nm]
    step : steps taken since the run began.
    random : the only source of randomness in a run.
    """

    position: np.ndarray
    orientation: np.ndarray
    velocity: np.ndarray
    angular_momentum: np.ndarray
    box: np.ndarray
    step: int = 0
    random: np.random.Generator = field(default_factory=lambda: np.random.default_rng(0))

    ARRAYS = ("position", "orientation", "velocity", "angular_momentum", "box")

    def __post_init__(self):
        for name in self.ARRAYS:
            setattr(self, name, np.ascontiguousarray(getattr(self, name), dtype=np.float64))

    def copy(self):
        """An independent copy, generator included: two copies draw the same noise."""
        return copy.deepcopy(self)

    def generator_text(self):
        """The generator's whole state as JSON text."""
        return json.dumps(self.random.bit_generator.state)

    def set_generator(self, text):
        """Continue the noise from where `generator_text` was taken."""
        recorded = json.loads(text)
        bits = getattr(np.random, recorded["bit_generator"])()
        bits.state = recorded
        self.random = np.random.Generator(bits)
