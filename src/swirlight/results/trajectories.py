"""The complete starts of a run and the light they saw: where every result begins."""

from functools import cached_property

import numpy as np

from swirlight.errors import InputError
from swirlight.light.build import pulses_from_config
from swirlight.light.exposure import exposed
from swirlight.results.starts import complete_starts
from swirlight.sample import build_system
from swirlight.store.run import KINDS


class Experiment:
    """A run as an experiment: only starts of which every exposure is complete count, so that
    twins stay paired.

    run : of `open_run`; system, pulses : as the run's config says, made from it if not given.
    found : {(kind, start, phase): Trajectory} of all there are, each looked through once and
        closed again, as there may be thousands; reading opens them.
    kinds : those of the config; complete : numbers of the starts that count; wanted : how many
        the config asks for; phases : {kind: number of carrier phases}.
    """

    def __init__(self, run, system=None, pulses=None):
        self.run, self._system, self._pulses = run, system, pulses
        self.found = {}
        for e in run.exposures:
            trajectory = self.found[e.kind, e.start, e.phase] = run[e]
            trajectory.close()
        starts = complete_starts(run)
        self.complete, self.wanted, self.phases = starts.numbers, starts.wanted, starts.phases
        self.kinds = tuple(k for k in KINDS if k in self.phases)

    def __len__(self):
        return len(self.complete)

    @cached_property
    def config(self):
        """The run's config."""
        return self.run.config

    @cached_property
    def system(self):
        """The System of the run."""
        return self._system or build_system(self.config)

    @cached_property
    def pulses(self):
        """The pulses as written, a tuple of Pulse."""
        if self._pulses is not None:
            return self._pulses
        return pulses_from_config(self.config.light, self.system, self.config.stages[-1])

    @property
    def seen(self):
        """The pulses that exposures act on; all of them where there is no such."""
        return exposed(self.pulses) or self.pulses

    @property
    def beam(self):
        """(3,) k̂ that projections refer to."""
        return beam(self.pulses)

    @property
    def span(self):
        """(begin, end) of the light: intensity above 1e-4 of a peak. [ps]"""
        begins, ends = zip(*(pulse.span() for pulse in self.seen), strict=True)
        return min(begins), max(ends)

    @property
    def resolved(self):
        """Whether the carrier of an exposed pulse is resolved."""
        return any(pulse.coupling == "resolved" for pulse in self.seen)

    def first(self, kind):
        """A trajectory of that kind. Raises InputError where no start is complete."""
        self.require(kind)
        return self.found[kind, self.complete[0], 0]

    def require(self, *kinds):
        """Raises InputError unless these kinds are there and a start is complete."""
        missing = [kind for kind in kinds if kind not in self.kinds]
        if missing:
            raise InputError(f"{self.run.path}: has no {' and no '.join(missing)} trajectories")
        if not self.complete:
            raise InputError(f"{self.run.path}: no start is complete yet;"
                             f" `swirlight status {self.run.path}`")

    def by_phase(self, read, kinds=None):
        """{kind: (starts, carrier phases, ...)} of `read(trajectory)`."""
        return {
            kind: np.array([[self._read(read, kind, start, phase)
                             for phase in range(self.phases[kind])] for start in self.complete])
            for kind in (self.kinds if kinds is None else kinds)
        }

    def collect(self, read, kinds=None):
        """{kind: (starts, ...)} of `read(trajectory)` after the mean over carrier phases."""
        return {kind: values.mean(axis=1) if len(values) else values
                for kind, values in self.by_phase(read, kinds).items()}

    def _read(self, read, kind, start, phase):
        trajectory = self.found[kind, start, phase]
        value = read(trajectory)
        trajectory.close()
        return value


def beam(pulses):
    """(3,) k̂ of the first exposed pulse, of the first pulse if none is exposed; z without."""
    seen = exposed(pulses) or pulses
    return np.array(seen[0].direction if seen else (0.0, 0.0, 1.0), float)
