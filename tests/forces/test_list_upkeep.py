"""A list that is kept up while bodies move gives the forces of one made afresh."""

import numpy as np
import pytest

from swirlight.forces.field import ForceField
from swirlight.motion.draw import draw_motion, draw_orientations
from swirlight.motion.step import Mover
from swirlight.run.arrange import lattice_positions, remove_overlaps
from swirlight.species.library import load_species
from swirlight.state import State
from swirlight.system import Interactions, System

# (edge of the box / cutoff): several images of a body are met, and one
BOXES = {"two images": 2.02, "one image": 3.6}


@pytest.mark.parametrize("ratio", BOXES.values(), ids=BOXES)
@pytest.mark.parametrize("precision", ["double", "mixed"])
def test_bodies_that_cross_faces_are_not_lost(ratio, precision):
    cutoff = 0.8
    box = np.full(3, ratio * cutoff)
    bodies = int(17.0 * box.prod())  # liquid nitrogen has 17 per nm³
    system = System((load_species("nitrogen"),), (bodies,),
                    Interactions(cutoff, electrostatics="none", precision=precision),
                    temperature=77.0)
    random = np.random.default_rng(11)
    zeros = np.zeros((bodies, 3))
    state = State(lattice_positions(bodies, box, random), draw_orientations(bodies, random),
                  zeros, zeros.copy(), box, random=random)
    kept = ForceField(system, box)
    remove_overlaps(system, state, kept)
    draw_motion(system, state)
    before = np.floor(state.position / box)
    mover = Mover(system, kept, None, 0.004)
    mover.begin(state)
    for _ in range(500):
        mover.advance(state, energies=False)
    assert np.any(np.floor(state.position / box) != before), "nobody crossed: the test is blind"
    fresh = ForceField(system, box).evaluate(state.position, state.orientation, box, False)
    error = np.sqrt(np.mean((mover.load.field.force - fresh.force) ** 2))
    rms = np.sqrt(np.mean(fresh.force**2))
    # rounding alone: sums of some hundred terms in another order
    assert error < {"double": 1e-12, "mixed": 2e-6}[precision] * rms
