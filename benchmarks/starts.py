"""Starting states of any size within seconds: a settled box of some 500 bodies, repeated.

The small box starts from a lattice without overlaps and runs for 2 ps, its motion drawn anew
ten times, so that bodies move as they do in the liquid. A larger one is whole copies of it
(500 bodies 8, 64 or 216 times for the sizes of the tables), the bodies numbered along it, as in
a run, and their motion drawn afresh. Where the number of bodies is no multiple, as few as
possible are left out and the box shrinks to keep the density.
"""

from functools import cache

import numpy as np
from systems import SYSTEMS, TIMESTEP, box_of, with_plain_cutoff

from swirlight.forces.field import ForceField
from swirlight.motion.draw import draw_motion, draw_orientations
from swirlight.motion.step import Mover
from swirlight.run.arrange import lattice_positions, remove_overlaps
from swirlight.state import State

SMALL = 500
DRAWS, STEPS = 10, 100


@cache
def _settled(name, bodies, cutoff):
    """A small box after its first 2 ps."""
    system, random = with_plain_cutoff(name, bodies, cutoff=cutoff), np.random.default_rng(1)
    box, nothing = box_of(name, bodies), np.zeros((2, bodies, 3))
    state = State(lattice_positions(bodies, box, random), draw_orientations(bodies, random),
                  *nothing, box, random=random)
    field = ForceField(system, box)
    remove_overlaps(system, state, field)
    mover = Mover(system, field, None, TIMESTEP)
    for _ in range(DRAWS):
        draw_motion(system, state)
        mover.begin(state, energies=False)
        for _ in range(STEPS):
            mover.advance(state, energies=False)
    return state


def _copies(name, bodies, cutoff):
    """How often the small box is repeated along each edge; it must itself hold the cutoff."""
    wanted = round((bodies / SMALL) ** (1 / 3))
    most = int((bodies / (1.1 * SYSTEMS[name][1])) ** (1 / 3) / (2 * cutoff))
    return max(1, min(wanted, most))


def liquid(name, bodies, cutoff):
    """A state of `bodies` bodies of a system, with thermal motion."""
    copies = _copies(name, bodies, cutoff)
    small = _settled(name, -(-bodies // copies**3), cutoff)
    shift = np.stack(np.meshgrid(*[np.arange(copies)] * 3), axis=-1).reshape(-1, 1, 3)
    random = np.random.default_rng(2)
    chosen = np.sort(random.permutation(len(shift) * len(small.position))[:bodies])
    box = box_of(name, bodies)
    place = (small.position % small.box + shift * small.box).reshape(-1, 3)[chosen]
    nothing = np.zeros((2, bodies, 3))
    state = State(place * (box / (copies * small.box)),
                  np.tile(small.orientation, (len(shift), 1))[chosen], *nothing, box,
                  random=random)
    draw_motion(with_plain_cutoff(name, bodies, cutoff=cutoff), state)
    return state
