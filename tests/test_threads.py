"""A lit, thermostatted liquid, large enough for every loop to run on threads: same bits."""

import os
import pathlib
import subprocess
import sys

import pytest

CODE = """
import hashlib, numba, numpy as np
from swirlight.forces.field import ForceField
from swirlight.light.light import Light
from swirlight.motion.draw import draw_motion, draw_orientations
from swirlight.motion.step import Mover
from swirlight.motion.thermostats import make_thermostat
from swirlight.run.arrange import lattice_positions
from swirlight.species.library import load_species
from swirlight.state import State
from swirlight.system import Interactions, System
from tests.motion.test_light import terahertz

COUNT = 5000
edges, random = np.full(3, (COUNT / 33.3) ** (1 / 3)), np.random.default_rng(5)
still = np.zeros((COUNT, 3))
interactions = Interactions(0.9, precision={precision!r}, electrostatics={electrostatics!r})
system = System((load_species("water"),), (COUNT,), interactions, 300.0)
start = State(lattice_positions(COUNT, edges, random), draw_orientations(COUNT, random), still,
              still.copy(), edges, random=random)
draw_motion(system, start)
for threads in 1, 2, 3:
    numba.set_num_threads(threads)
    state = start.copy()
    light = Light(system, (terahertz(1e10, duration=0.1, centre=0.02),))
    field = ForceField(system, edges)
    mover = Mover(system, field, light, 0.001, make_thermostat(system, "langevin", 2.0))
    mover.begin(state)
    for step in range(25):
        mover.advance(state, energies=step % 5 == 4)
    assert mover.ledger.light_work != 0.0 and field.pairs.neighbours.made > 2
    digest = hashlib.sha256(mover.ledger.values.tobytes())
    for name in state.ARRAYS:
        digest.update(getattr(state, name).tobytes())
    print(digest.hexdigest(), mover.total_energy(state).hex())
"""


@pytest.mark.parametrize("electrostatics", ["mesh-ewald", "reaction-field"])
@pytest.mark.parametrize("precision", ["mixed", "double"])
def test_one_two_and_three_threads_give_the_same_bits(precision, electrostatics):
    code = CODE.format(precision=precision, electrostatics=electrostatics)
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True,
                          env={**os.environ, "NUMBA_NUM_THREADS": "3"}, timeout=600,
                          cwd=pathlib.Path(__file__).parents[1])
    assert done.returncode == 0, done.stderr
    first, *others = done.stdout.splitlines()
    assert others == [first, first]
