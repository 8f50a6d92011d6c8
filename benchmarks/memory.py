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
MESH_ARRAYS = 3.5  # charges, their transform, the potential, and half a mesh of coefficients
HEAD = ("electrostatics", "empty process MB", "peak MB", "mesh MB", "kB/body without mesh")
NOTE = f"""\
{BODIES} water, {STEPS} steps, one of them with energies. Empty: after the same with {SMALL} bodies,
kernels loaded. mesh: its points, {MESH_ARRAYS:g} times (charge density, transform, potential, and
half of it for the coefficients), in the precision it has; splines of the charges count to the
bodies."""


def peak():
    """The most memory this process has had. [bytes]"""
    try:  # ru_maxrss of a process begins with what its parent had when it started it
        lines = pathlib.Path("/proc/self/status").read_text().splitlines()
        return 1024 * next(int(x.split()[1]) for x in lines if x.startswith("VmHWM"))
    except (OSError, StopIteration):
        unit = 1 if sys.platform == "darwin" else 1024
        return unit * resource.getrusage(resource.RUSAGE_SELF).ru_maxrss


def run(state, electrostatics):
    """Some steps of a state; bytes of the mesh arrays."""
    system = as_in_a_run("water", len(state.position), electrostatics=electrostatics)
    trajectory = Trajectory(system, state)
    for _ in range(STEPS):
        trajectory()
    trajectory.mover.advance(trajectory.state)
    mesh = trajectory.field.reciprocal
    return 0 if mesh is None else float(MESH_ARRAYS * np.prod(mesh.mesh) * mesh.dtype.itemsize)


def rows():
    """Rows of the table, one for each electrostatics."""
    with tempfile.TemporaryDirectory() as folder:
        for bodies in (SMALL, BODIES):
            state = liquid("water", bodies, CUTOFF)
            np.savez(pathlib.Path(folder, f"{bodies}.npz"),
                     **{name: getattr(state, name) for name in State.ARRAYS})
        for method in ("mesh-ewald", "reaction-field"):
            _process(folder, method, SMALL)  # so that the one that counts compiles nothing
            (empty, _), (most, mesh) = _process(folder, method, SMALL, BODIES)
            yield [method, f"{empty / 1e6:.0f}", f"{most / 1e6:.0f}", f"{mesh / 1e6:.0f}",
                   f"{(most - empty - mesh) / BODIES / 1e3:.2f}"]


def _process(folder, method, *sizes):
    """For each size in turn, what a fresh process has had at most by then, and mesh arrays."""
    done = subprocess.run([sys.executable, __file__, folder, method, *map(str, sizes)],
                          check=True, stdout=subprocess.PIPE, text=True)
    return json.loads(done.stdout)


def main(folder, method, *sizes):
    found = []
    for size in sizes:
        with np.load(pathlib.Path(folder, f"{size}.npz")) as arrays:
            state = State(**arrays)
        mesh = run(state, method)
        found.append([peak(), mesh])
    print(json.dumps(found))


if __name__ == "__main__":
    main(*sys.argv[1:])
