"""Which trajectories of a run count: those of starts all of whose exposures are complete."""

from dataclasses import dataclass


@dataclass(frozen=True)
class Starts:
    """The starts that count.

    numbers : of the complete starts; wanted : how many the config asks for.
    phases : {kind: number of carrier phases}.
    """

    numbers: tuple
    wanted: int
    phases: dict

    def keys(self, kind, start):
        """Keys of the trajectories of one kind and start, one for each carrier phase."""
        return [(kind, start, phase) for phase in range(self.phases[kind])]


def complete_starts(run):
    """`Starts` of a run. Raises InputError when its config cannot be read."""
    there = {(e.kind, e.start, e.phase) for e in run.exposures
             if (run.path / f"{e.name}.h5").is_file()}
    config = run.config
    if config.exposures is None:
        kinds, wanted, carriers = ["plus" if config.light else "dark"], 1, 1
    else:
        kinds, wanted = config.exposures.kinds, config.exposures.starts
        carriers = config.exposures.carrier_phases
    phases = {kind: carriers if carriers > 1 and _sees_a_carrier(run, kind, there) else 1
              for kind in kinds}
    numbers = tuple(
        start for start in range(wanted)
        if all((kind, start, phase) in there for kind in kinds for phase in range(phases[kind])))
    return Starts(numbers, wanted, phases)


def _sees_a_carrier(run, kind, there):
    """Whether resolved light acts in a kind: then it has been run with several carrier phases."""
    first = next((key for key in sorted(there) if key[0] == kind), None)
    if first is None:
        return False
    trajectory = run[first]
    light = trajectory.parameters.get("light", {})
    trajectory.close()
    return any(pulse["coupling"] == "resolved" for pulse in light.values())
