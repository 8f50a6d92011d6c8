"""What a run folder asks for, as trajectories that can be travelled."""

import contextlib
import traceback
from functools import cache, cached_property

import numpy as np

from swirlight.errors import RunError, StopRequested, SwirlightError
from swirlight.light.build import bias_from_config, pulses_from_config
from swirlight.results.trajectories import beam
from swirlight.run.build import first_state
from swirlight.run.exposures import list_exposures
from swirlight.run.folder import RunFolder
from swirlight.run.header import file_header
from swirlight.run.record import Recorder, watched_bodies
from swirlight.run.spacing import SAFETY, correlation_times
from swirlight.run.trajectory import Clock, Leg, Trajectory
from swirlight.sample import build_system
from swirlight.store.durable import make_folder, remove, remove_folder, write_json
from swirlight.store.run import open_run
from swirlight.store.start import load_state, save_state


class Work:
    """Everything that is to be calculated in one run folder.

    folder : RunFolder; config, system, pulses, bias : as the folder's config says.
    """

    def __init__(self, folder):
        self.folder = folder
        self.config = folder.config()
        self.system = build_system(self.config)
        self.pulses = pulses_from_config(
            self.config.light, self.system, self.config.stages[-1]
        )
        self.bias = bias_from_config(self.config.bias_field)
        self.beam = beam(self.pulses)
        self.exposures = list_exposures(self.config, self.pulses)

    @property
    def exposure_steps(self):
        """Steps of one exposure."""
        return self.config.stages[-1].steps

    @property
    def starts(self):
        """How many starts there are."""
        return 1 + max(e.start for e in self.exposures)

    def preparations(self):
        """Yield (name, Trajectory, begin) of what must be done before the exposures."""
        unlit = self.config.stages[:-1]
        if not unlit:
            if not self.folder.start(0).is_file():
                self._save_start(0, first_state(self.config, self.system))
            return
        chain_lost = not (self._chain_file.is_file() or self.folder.continuation.is_file())
        if not self.folder.equilibrium.is_file() or (self.starts > 1 and chain_lost):
            begin = lambda: first_state(self.config, self.system)  # noqa: E731
            yield "equilibrate", self._equilibrium(unlit), begin
        if self.starts > 1 and not self.folder.continuation.is_file():
            yield "collect starts", self._continuation(unlit[-1]), self._chain_state

    def exposure(self, name):
        """(Trajectory, begin) of the exposure called `name`."""
        exposure = next(e for e in self.exposures if e.name == name)
        leg = self._leg(self.config.stages[-1], exposure.light(self.pulses), self.bias)
        begin = lambda: load_state(self.folder.start(exposure.start), self.system)  # noqa: E731
        about = {"kind": exposure.kind, "start": exposure.start, "phase": exposure.phase}
        return self._trajectory(name, (leg,), True, about), begin

    @cached_property
    def spacing(self):
        """Time from one start to the next, as asked for or as found; {value, found}. [ps]

        Raises RunError when equilibration was too short to see how long memory lasts.
        """
        if self.config.exposures is None or self.starts == 1:
            return {"value": 0.0, "found": {}}
        asked = self.config.exposures.spacing
        if asked is not None:
            return {"value": asked, "found": {}}
        return self._find_spacing()

    def _find_spacing(self):
        record = open_run(self.folder.root).equilibrium
        last = self.config.stages[-2]
        momentum, axis = record["watched/angular_momentum"], record["watched/axis_z"]
        # only the last unlit stage, and of it the second half: the first still settles
        keep = slice(np.searchsorted(momentum.times, momentum.times[-1] - 0.5 * last.length), None)
        bodies, found = watched_bodies(self.system), {}
        for k, species in enumerate(self.system.species):
            rows = np.flatnonzero(self.system.species_of[bodies] == k)
            if len(rows):
                times = correlation_times(
                    momentum[keep, rows], axis[keep, rows], momentum.interval,
                )
                found[species.name] = times
        if not found:
            raise RunError("exposures.spacing: left out, but atoms alone have no rotation to take"
                           " it from; give it in the config")
        slowest = max(tau for times in found.values() for tau, _ in times.values())
        block = self.config.forces.mesh_every
        steps = block * max(1, round(SAFETY * slowest / (block * last.timestep)))
        return {
            "value": steps * last.timestep,
            "found": {
                name: {what: {"value": tau, "unit": "ps", "settled": settled}
                       for what, (tau, settled) in times.items()}
                for name, times in found.items()
            },
        }

    def _equilibrium(self, unlit):
        last = len(unlit) - 1

        def leg_done(index, state):
            if index == last:
                save_state(self._chain_file, state, self.system)
                self._save_start(0, state)

        legs = tuple(self._leg(stage, (), self._steady_bias) for stage in unlit)
        watch = self.starts > 1 and self.config.exposures.spacing is None
        return self._trajectory("equilibrium", legs, False, {"kind": "equilibrium"}, leg_done,
                                watch)

    def _continuation(self, stage):
        def leg_done(index, state):
            self._save_start(index + 1, state)

        steps = round(self.spacing["value"] / stage.timestep)
        leg = self._leg(stage, (), self._steady_bias, steps)
        legs = (leg,) * (self.starts - 1)
        return self._trajectory("continuation", legs, False, {"kind": "equilibrium"}, leg_done)

    @property
    def _chain_file(self):
        return self.folder.work / "chain.h5"

    def _chain_state(self):
        return load_state(self._chain_file, self.system)

    def _save_start(self, index, state):
        """Save a start with noise of its own, which depends on (seed, start) alone.

        A spawn key, as SeedSequence takes (seed, 0) and seed, which drew the lattice, for one.
        """
        start = state.copy()
        seeds = np.random.SeedSequence(self.config.seed, spawn_key=(index,))
        start.random = np.random.Generator(np.random.PCG64(seeds))
        save_state(self.folder.start(index), start, self.system)

    @property
    def _steady_bias(self):
        return self.bias if self.bias is not None and self.bias.always else None

    def _leg(self, stage, pulses, bias, steps=None):
        thermostat = stage.thermostat
        settings = {"method": thermostat.method}
        if thermostat.method != "none":
            settings |= {"friction": thermostat.friction, "acts_on": thermostat.acts_on}
        return Leg(stage.name, steps or stage.steps, stage.timestep, settings, pulses, bias)

    def _trajectory(self, name, legs, with_vectors, about, leg_done=lambda i, s: None,
                    watch=False):
        clock = Clock.of(legs)
        lit = any(leg.pulses or leg.bias is not None for leg in legs)
        recorder = Recorder(self.system, self.beam, self.config.record, clock, with_vectors, lit,
                            watch)
        return Trajectory(
            system=self.system, legs=legs, clock=clock, recorder=recorder,
            header=lambda box: file_header(self, legs, clock, box, recorder.elements, about),
            workdir=self.folder.working(name), final=self.folder.final(name), leg_done=leg_done,
        )


@contextlib.contextmanager
def noting_failure(folder, name):
    """Leave in the run folder why trajectory `name` failed inside; an earlier failure is over."""
    remove(folder.failure(name))
    try:
        yield
    except StopRequested:
        raise
    except Exception as error:
        note_failure(folder, name, error)
        raise


def note_failure(folder, name, error):
    """Leave in the run folder why trajectory `name` cannot be finished, if it can be written."""
    path = folder.failure(name)
    with contextlib.suppress(OSError):  # it may be the disk that failed
        make_folder(path.parent)
        write_json(path, {"name": name, "reason": reason_of(error),
                          "traceback": traceback.format_exception(error)})


def reason_of(error):
    """Why something failed, in words; what was not raised on purpose names its type."""
    return str(error) if isinstance(error, SwirlightError) else f"{type(error).__name__}: {error}"


def expose(work, name, report=lambda facts: None):
    """Carry one exposure to its end.

    name : of the exposure; report : as of `Trajectory.travel`.
    Returns its steps per second, None if there was nothing to do or to measure. Raises
    StopRequested, and whatever keeps it from being finished, once that is noted in the folder.
    """
    folder = work.folder
    if folder.final(name).is_file():
        remove_folder(folder.working(name))
        return None
    if number := folder.stop.look():
        raise StopRequested(0, number)
    with noting_failure(folder, name):
        trajectory, begin = work.exposure(name)
        trajectory.travel(begin, folder.stop, report)
    return trajectory.pace


def expose_in_worker(root, name):
    """The same as the task of a worker process, which serves one run folder all its life."""
    return expose(_work_in(root), name)


@cache
def _work_in(root):
    return Work(RunFolder(root))
