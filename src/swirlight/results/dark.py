"""A run as linear response sees it: its light on the frames, and sums over the bodies."""

from dataclasses import dataclass
from functools import cached_property

import numpy as np

from swirlight.analysis import kubo
from swirlight.errors import InputError
from swirlight.light.build import pulses_from_config
from swirlight.light.exposure import exposed, mirrored, with_phase
from swirlight.light.regime import beating_groups
from swirlight.light.response import choose_response, colour_of, free_axes
from swirlight.light.schedule import make_block
from swirlight.results.starts import complete_starts
from swirlight.sample import build_system
from swirlight.species.symmetry import point_group
from swirlight.units import BOLTZMANN

NEEDED = ("orientation", "angular_momentum")
BLOCK = 200_000  # orientations held at once
FINE = 40  # points of the light in a duration, and in a cycle that is resolved


@dataclass(frozen=True)
class Bodies:
    """The bodies of one species in some frames; sums over them are (frames, ...).

    kind : which species. turn, spin : R (frames, n, 3, 3), and ω in the body frame.
    momentum : (frames, n, 3) L.
    """

    kind: int
    turn: np.ndarray
    spin: np.ndarray
    momentum: np.ndarray


class Subject:
    """What a run consists of: system, light, frames, starts that count.

    system, pulses (as written), k (3,) the beam, kt = kT [u nm²/ps²].
    times, steps (T,), interval : of the frames [ps]; the light is told on `instants`, `finer`
    times as many.
    Raises InputError where linear response about a dark equilibrium has no meaning, or where
    what it needs was not recorded.
    """

    def __init__(self, run):
        self.run, config = run, run.config
        self.system = build_system(config)
        self.pulses = pulses_from_config(config.light, self.system)
        self._refuse(config)
        self.k = np.array(exposed(self.pulses)[0].direction, float)
        self.kt = BOLTZMANN * self.system.temperature
        self.starts = complete_starts(run)
        if "dark" not in self.starts.phases:
            raise InputError(f"{run.path}: has no dark runs, from which linear response is told")
        if not self.starts.numbers:
            raise InputError(f"{run.path}: no start is complete yet")
        first = run["dark", self.starts.numbers[0]]
        missing = [name for name in NEEDED if name not in first]
        if missing:
            raise InputError(f"{run.path}: linear response needs {' and '.join(NEEDED)} among"
                             f" record.vectors; {' and '.join(missing)} was not recorded")
        series = first["orientation"]
        self.times, self.steps, self.interval = series.times, series.steps, series.interval
        first.close()
        averaged = tuple(p for p in self.pulses if p.coupling == "averaged")
        self.resolved = tuple(p for p in self.pulses if p.coupling == "resolved")
        self.groups = beating_groups(averaged, self.system)
        self.free = free_axes(self.system)
        shortest = min([p.envelope.duration for p in self.pulses]
                       + [2.0 * np.pi / p.carrier for p in self.resolved])
        self.finer = max(1, int(np.ceil(FINE * self.interval / shortest - 1e-9)))
        self.instants = (self.times[0] + self.interval / self.finer
                         * np.arange(self.finer * (len(self.times) - 1) + 1))

    def _refuse(self, config):
        path = self.run.path
        if not exposed(self.pulses):
            raise InputError(f"{path}: no light that exposures act on, so no response")
        if config.bias_field is not None:
            raise InputError(f"{path}: a bias field acts in the dark runs too; linear response"
                             " wants them isotropic")
        if any(p.in_kinds == "same" for p in self.pulses):
            raise InputError(f"{path}: a pulse with in_kinds: same acts in the dark runs too;"
                             " linear response wants them in equilibrium")

    def convolve(self, kernel, drive):
        """`kubo.convolve` of a kernel of the frames with a drive of the instants: the instants."""
        return kubo.convolve(kubo.refined(kernel, self.finer), drive, self.interval / self.finer)

    def integral(self, values):
        """`kubo.running_integral` over the instants."""
        return kubo.running_integral(values, self.interval / self.finer)

    @property
    def intensity(self):
        """Of the strongest exposed pulse, at its peak. [W/cm²]"""
        return max(p.intensity for p in exposed(self.pulses))

    def optics(self, pulses):
        """The OpticalResponse of every species to the colour of some pulses."""
        resolved = pulses[0].coupling == "resolved"
        return [choose_response(s, colour_of(pulses), resolved)[0] for s in self.system.species]

    @cached_property
    def _averaged(self):
        """(plus, minus) coherency rows, (instants, groups, 9) each."""
        # mirrored all together, since the mirror is that of the first exposed pulse
        seen = dict(zip(map(id, self.pulses), mirrored(self.pulses), strict=True))
        minus = [tuple(seen[id(p)] for p in group) for group in self.groups]
        return [make_block(self.instants, groups, [], None).coherency
                for groups in (self.groups, minus)]

    def coherency(self, part):
        """(instants, groups, 9) S and G of averaged light: what its odd or even part comes from."""
        plus, minus = self._averaged
        return 0.5 * (plus - minus if part == "odd" else plus + minus)

    def carriers(self, part):
        """[(weight, E, Ė, [(pulses, Ė/ω)])] of resolved light, (instants, 3) each.

        Sums over them of weight times a quantity that is bilinear in E are its odd or even part,
        averaged over the carrier phases of the run.
        """
        phases = self.starts.phases.get("plus", 1)
        sign = {"odd": -1.0, "even": 1.0}[part]
        found = []
        for weight, light in ((0.5, self.pulses), (0.5 * sign, mirrored(self.pulses))):
            for phase in range(phases):
                shifted = with_phase(light, 2.0 * np.pi * phase / phases)
                colours = [(p,) for p in shifted if p.coupling == "resolved"]
                wave = make_block(self.instants, [], colours, None).wave
                omega = np.array([c[0].carrier for c in colours])
                rate = (wave[:, :, 3:] * omega[:, None]).sum(axis=1)
                quadratures = [(c, wave[:, n, 3:]) for n, c in enumerate(colours)]
                found.append((weight / phases, wave[:, :, :3].sum(axis=1), rate, quadratures))
        return found

    def gyration_may_spin(self, optics):
        """Whether symmetry leaves ⟨ΣL(s)·Σġ(0)⟩ anything but 0.

        An operation Q of the bodies takes L to det(Q) QL and R g to that of Qg = ±g: with
        Qg = −det(Q) g the correlation is its own negative. A reflection must be one of the
        whole liquid, so of every species in it.
        """
        groups = [point_group(s.sites, s.freedom, s.mass, s.charge, s.sigma, s.epsilon).operations
                  for s in self.system.species]
        mirrored = all((np.linalg.det(group) < 0).any() for group in groups)

        def forbids(q, g):
            sign = np.linalg.det(q)
            return (mirrored or sign > 0) and np.allclose(q @ g, -sign * g,
                                                          atol=1e-3 * np.abs(g).max())

        return any(o.gyration.any() and not any(forbids(q, o.gyration) for q in group)
                   for o, group in zip(optics, groups, strict=True))

    def sums(self, trajectory, wanted):
        """{name: (T, ...)} sums over all bodies of a trajectory.

        wanted : {name: function of Bodies -> (frames, ...)}.
        """
        found = {name: 0.0 for name in wanted}
        first = 0
        for kind, (species, count) in enumerate(
                zip(self.system.species, self.system.counts, strict=True)):
            rows, first = slice(first, first + count), first + count
            if species.freedom == 0 or count == 0:
                continue
            inverse = np.divide(1.0, species.inertia, out=np.zeros(3), where=species.inertia > 0)
            blocks = []
            some = max(1, BLOCK // count)
            for begin in range(0, len(self.times), some):
                frames = slice(begin, begin + some)
                momentum = np.asarray(trajectory["angular_momentum"][frames, rows], float)
                turn, spin = kubo.rotation_and_spin(
                    np.asarray(trajectory["orientation"][frames, rows], float), momentum, inverse)
                bodies = Bodies(kind, turn, spin, momentum)
                blocks.append({name: read(bodies) for name, read in wanted.items()})
            for name in wanted:
                found[name] = found[name] + np.concatenate([b[name] for b in blocks])
        trajectory.close()
        return found

    def per_species(self, value):
        """Σ over bodies of a number of each species."""
        return float(sum(n * v for n, v in zip(self.system.counts, value, strict=True)))
