"""Which trajectories a run consists of, and the light that each of them sees.

    plus   the light as written             minus  mirrored in one plane
    dark   exposed pulses off               each from every start, twins sharing their noise

A kind in which a carrier-resolved pulse acts is run with several carrier phases, equally
spaced; the mean over them comes before anything else.
"""

import math
from dataclasses import dataclass

from swirlight.light.exposure import dark, mirrored, with_phase

KINDS = {"plus": lambda pulses: pulses, "minus": mirrored, "dark": dark}


@dataclass(frozen=True)
class Exposure:
    """One trajectory: a kind of light, from one start, at one carrier phase of `phases`."""

    kind: str
    start: int
    phase: int = 0
    phases: int = 1

    @property
    def name(self):
        """Its file's name without the ending."""
        return f"{self.kind}-{self.start:03d}" + (f"-p{self.phase}" if self.phase else "")

    def light(self, pulses):
        """The pulses as this exposure sees them."""
        return with_phase(KINDS[self.kind](pulses), 2 * math.pi * self.phase / self.phases)


def list_exposures(config, pulses):
    """All exposures of a run, start by start, so that early starts are whole early.

    config : validated; without exposures a run is one dark trajectory.
    pulses : as written.
    """
    if config.exposures is None:
        kinds = ["plus"] if pulses else ["dark"]
        starts, wanted = 1, 1
    else:
        kinds, starts = config.exposures.kinds, config.exposures.starts
        wanted = config.exposures.carrier_phases
    phases = {
        kind: wanted if any(p.coupling == "resolved" for p in KINDS[kind](pulses)) else 1
        for kind in kinds
    }
    return [
        Exposure(kind, start, phase, phases[kind])
        for start in range(starts) for kind in kinds for phase in range(phases[kind])
    ]
