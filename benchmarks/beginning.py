"""How long it takes from the command to the first step, with and without compiled kernels.

    python beginning.py       what is timed: water from a lattice to its first step
"""

import os
import subprocess
import sys
import tempfile
import time

import numpy as np

BODIES, WARM = 500, 3
HEAD = ("start", "seconds", "of it removing overlaps")
NOTE = f"""\
A fresh process that puts {BODIES} water on a lattice, removes overlaps, draws motion, and takes one
step with mesh Ewald and energies; default settings. cold: the folder for compiled kernels is
empty, and most are compiled when removing overlaps asks for forces. warm: it holds them; median
of {WARM}."""


def rows():
    with tempfile.TemporaryDirectory() as folder:
        environment = os.environ | {"NUMBA_CACHE_DIR": folder, "XDG_CACHE_HOME": folder}
        cold = _seconds(environment)
        warm = np.median([_seconds(environment) for _ in range(WARM)], axis=0)
    for name, (whole, descent) in (("cold", cold), ("warm", warm)):
        yield [name, f"{whole:.2f}", f"{descent:.2f}"]


def _seconds(environment):
    start = time.perf_counter()
    done = subprocess.run([sys.executable, __file__], check=True, stdout=subprocess.PIPE,
                          text=True, env=environment)
    return time.perf_counter() - start, float(done.stdout)


def main():
    from systems import TIMESTEP, as_in_a_run, box_of

    from swirlight.forces.field import ForceField
    from swirlight.motion.draw import draw_motion, draw_orientations
    from swirlight.motion.step import Mover
    from swirlight.run.arrange import lattice_positions, remove_overlaps
    from swirlight.state import State

    system, box = as_in_a_run("water", BODIES), box_of("water", BODIES)
    random = np.random.default_rng(1)
    state = State(lattice_positions(BODIES, box, random), draw_orientations(BODIES, random),
                  *np.zeros((2, BODIES, 3)), box, random=random)
    field = ForceField(system, box)
    start = time.perf_counter()
    remove_overlaps(system, state, field)
    descent = time.perf_counter() - start
    draw_motion(system, state)
    mover = Mover(system, field, None, TIMESTEP)
    mover.begin(state)
    mover.advance(state)
    print(descent)


if __name__ == "__main__":
    main()
