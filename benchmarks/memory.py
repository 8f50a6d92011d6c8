"""Peak memory of a large box, each electrostatics in a process of its own.

    python memory.py folder electrostatics sizes       such a process; prints JSON
"""

import json
import pathlib
import resource
import subprocess
import sys
import tempfile

import numpy as np
from starts import liquid
from steps import Trajectory
from systems import CUTOFF, as_in_a_run

from swirlight.state import State

BODIES, SMALL, STEPS = 108000, 500, 30
HEAD = ("electrostatics", "empty process MB", "peak MB", "mesh points", "bytes a point",
        "mesh MB", "kB/body without mesh")
NOTE = f"""\
{BODIES} water, {STEPS} steps, one of them with energies. Empty: after the same with {SMALL} bodies,
kernels loaded. mesh: the arrays that are kept of its points (charges or potential, coefficients);
transforms, which are needed in passing, and the splines of the charges count to the bodies."""


def peak():
    """The most memory this process has had. [bytes]"""
    try:  # ru_maxrss of a process begins with what its parent had when it started it
        lines = pathlib.Path("/proc/self/status").read_text().splitlines()
        return 1024 * next(int(x.split()[1]) for x in lines if x.startswith("VmHWM"))
    except (OSError, StopIteration):
        unit = 1 if sys.platform == "darwin" else 1024
        return unit * resource.getrusage(resource.RUSAGE_SELF).ru_maxrss


def run(state, electrostatics):
    """Some steps of a state; points of the mesh and bytes of its arrays."""
    system = as_in_a_run("water", len(state.position), electrostatics=electrostatics)
    trajectory = Trajectory(system, state)
    for _ in range(STEPS):
        trajectory()
    trajectory.mover.advance(trajectory.state)
    mesh = trajectory.field.reciprocal
    if mesh is None:
        return 0, 0
    points = int(np.prod(mesh.mesh))
    # Whatever has a number for every second point or more, and not a row for each charge.
    return points, sum(array.nbytes for array in _arrays(list(vars(mesh).values()))
                       if array.base is None and array.size >= points // 2
                       and len(array) != len(mesh.charge))


def _arrays(things):
    """All arrays in nested tuples and lists."""
    for thing in things:
        if isinstance(thing, np.ndarray):
            yield thing
        elif isinstance(thing, (tuple, list)):
            yield from _arrays(thing)


def rows():
    """Rows of the table, one for each electrostatics."""
    with tempfile.TemporaryDirectory() as folder:
        for bodies in (SMALL, BODIES):
            state = liquid("water", bodies, CUTOFF)
            np.savez(pathlib.Path(folder, f"{bodies}.npz"),
                     **{name: getattr(state, name) for name in State.ARRAYS})
        for method in ("mesh-ewald", "reaction-field"):
            _process(folder, method, SMALL)  # so that the one that counts compiles nothing
            (empty, *_), (most, points, mesh) = _process(folder, method, SMALL, BODIES)
            yield [method, f"{empty / 1e6:.0f}", f"{most / 1e6:.0f}", points,
                   f"{mesh / points:.1f}" if points else "-", f"{mesh / 1e6:.0f}",
                   f"{(most - empty - mesh) / BODIES / 1e3:.2f}"]


def _process(folder, method, *sizes):
    """Of a fresh process, for each size in turn: peak so far, points and bytes of the mesh."""
    done = subprocess.run([sys.executable, __file__, folder, method, *map(str, sizes)],
                          check=True, stdout=subprocess.PIPE, text=True)
    return json.loads(done.stdout)


def main(folder, method, *sizes):
    found = []
    for size in sizes:
        with np.load(pathlib.Path(folder, f"{size}.npz")) as arrays:
            state = State(**arrays)
        mesh = run(state, method)
        found.append([peak(), *mesh])
    print(json.dumps(found))


if __name__ == "__main__":
    main(*sys.argv[1:])
