"""Whole steps: how many a second, what they are spent on, and how they grow with the box."""

import time

import numpy as np
from starts import liquid
from systems import CUTOFF, TIMESTEP, as_in_a_run
from timing import Contender, in_turns, nothing_compiled, ratio

from swirlight.compiled import numba
from swirlight.forces.field import ForceField
from swirlight.motion.step import Mover

TABLE = (("acetonitrile", 256), ("water", 500), ("water", 4000))
METHODS = {"mesh Ewald": {}, "reaction field": {"electrostatics": "reaction-field"},
           "mesh, every 2nd step": {"mesh_every": 2}}
SETTLE, BLOCK = 60, 50  # steps before any is timed, and least steps between two readings


class Trajectory:
    """A state on its way: call it for one step without energies."""

    def __init__(self, system, state):
        self.state = state.copy()
        self.field = ForceField(system, state.box)
        self.mover = Mover(system, self.field, None, TIMESTEP)
        self.mover.begin(self.state, energies=False)

    def __call__(self):
        self.mover.advance(self.state, energies=False)

    def settled(self):
        """Itself, after steps in which the skins of the lists find their widths."""
        for _ in range(SETTLE):
            self()
        return self


HEAD = ("system", "bodies", "electrostatics", "steps/s, 1 thread", "2 threads", "speed-up")
NOTE = f"""\
Steps of {1e3 * TIMESTEP:g} fs at constant energy, with everything a run needs but energies and
writing; Lennard-Jones switched off up to the cutoff of {CUTOFF} nm, mixed precision, tolerance,
splitting and mesh as a config that does not name them gets. List making is part of it."""


def mesh_chosen(field):
    """Splitting, order and mesh of a field, in words."""
    mesh = "x".join(map(str, field.reciprocal.mesh))
    return (f"alpha {field.law.alpha:.3f} /nm, order {field.reciprocal.order}, mesh {mesh},"
            f" {field.reciprocal.dtype}")


def table(quick, thread_counts, rounds, remark):
    """Rows of the table; what mesh was chosen goes to `remark`."""
    for name, bodies in TABLE[-1:] if quick else TABLE:
        state, runners = liquid(name, bodies, CUTOFF), {}
        for method, choices in METHODS.items():
            system = as_in_a_run(name, bodies, **choices)
            for threads in thread_counts:
                numba.set_num_threads(threads)
                runner = Trajectory(system, state).settled()
                runners[method, threads] = Contender(runner, threads)
            if method == "mesh Ewald":
                remark(f"{bodies} {name}: {mesh_chosen(runner.field)}")
        times = in_turns(runners, rounds, seconds=0.3, least=BLOCK, average=np.mean)
        for method in METHODS:
            rates = [1 / np.median(times[method, threads]) for threads in thread_counts]
            gain = (f"{ratio(times[method, 1], times[method, 2]):.2f}"
                    if 2 in thread_counts else "-")
            yield [name, bodies, method, *(f"{rate:.0f}" for rate in rates),
                   *["-"] * (2 - len(rates)), gain]


class Stopwatch:
    """Adds up the time spent in a method of an object, from now on."""

    def __init__(self, owner, method):
        self.seconds, inner = 0.0, getattr(owner, method)

        def timed(*given, **named):
            start = time.perf_counter()
            result = inner(*given, **named)
            self.seconds += time.perf_counter() - start
            return result

        setattr(owner, method, timed)


SHARE_HEAD = ("bodies", "threads", "pair forces %", "mesh %", "both %", "lists, records %",
              "rest %")
SHARE_NOTE = """\
Shares of a step of water with mesh Ewald. lists, records: writing what the kernels read of the
bodies, and making lists when they are due. rest: motion, sites of the mesh, Python."""


def shares(thread_counts, rounds, bodies=4000):
    """Rows: where the time of a step goes."""
    state, system = liquid("water", bodies, CUTOFF), as_in_a_run("water", bodies)
    for threads in thread_counts:
        numba.set_num_threads(threads)
        runner = Trajectory(system, state).settled()
        field = runner.field
        watches = [Stopwatch(field.pairs, "evaluate"), Stopwatch(field.reciprocal, "evaluate"),
                   Stopwatch(field.pairs.neighbours, "update")]
        parts = []
        with nothing_compiled():
            for _ in range(rounds):
                before, start = [w.seconds for w in watches], time.perf_counter()
                for _ in range(BLOCK):
                    runner()
                whole = time.perf_counter() - start
                parts.append([(w.seconds - b) / whole
                              for w, b in zip(watches, before, strict=True)])
        pairs, mesh, lists = 100 * np.median(parts, axis=0)
        pairs -= lists
        yield [bodies, threads, f"{pairs:.0f}", f"{mesh:.0f}", f"{pairs + mesh:.0f}",
               f"{lists:.0f}", f"{100 - pairs - mesh - lists:.0f}"]


GROWTH_HEAD = ("electrostatics", "ms/step at 4000", "32000", "108000", "exponent x")
GROWTH_NOTE = """\
Water, one thread; x of time = c N^x fitted to the logarithms."""


def growth(rounds, remark, sizes=(4000, 32000, 108000)):
    """Rows: time of a step over the number of bodies; what meshes were chosen to `remark`."""
    methods = {m: METHODS[m] for m in ("mesh Ewald", "reaction field")}
    numba.set_num_threads(1)
    runners = {}
    for method, choices in methods.items():
        for bodies in sizes:
            runner = Trajectory(as_in_a_run("water", bodies, **choices),
                                liquid("water", bodies, CUTOFF))
            for _ in range(SETTLE if bodies < 100000 else SETTLE // 2):
                runner()
            if method == "mesh Ewald":
                remark(f"{bodies} water: {mesh_chosen(runner.field)}")
            runners[method, bodies] = Contender(runner)
    times = in_turns(runners, rounds, seconds=0.3, least=40, average=np.mean)
    for method in methods:
        ms = [1e3 * np.median(times[method, bodies]) for bodies in sizes]
        exponent = np.polyfit(np.log(sizes), np.log(ms), 1)[0]
        yield [method, *(f"{t:.2f}" for t in ms), f"{exponent:.3f}"]
