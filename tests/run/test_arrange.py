"""The lattice start brings every liquid of the library to its density."""

import numpy as np
import pytest

from swirlight.errors import RunError
from swirlight.forces.field import ForceField
from swirlight.motion.draw import draw_motion, draw_orientations
from swirlight.motion.energy import kinetic_energies
from swirlight.motion.step import Mover
from swirlight.motion.thermostats import make_thermostat
from swirlight.run.arrange import lattice_positions, remove_overlaps
from swirlight.species.library import library_names, load_species
from swirlight.state import State
from swirlight.system import Interactions, System
from swirlight.units import BOLTZMANN


def start(species, bodies, density, temperature, cutoff=0.8):
    """A drawn state with overlaps removed. density : [u/nm³]"""
    box = np.full(3, (bodies * species.total_mass / density) ** (1 / 3))
    cutoff = min(cutoff, 0.499 * box[0])
    system = System((species,), (bodies,),
                    Interactions(cutoff, electrostatics="reaction-field"), temperature)
    random = np.random.default_rng(17)
    zeros = np.zeros((bodies, 3))
    state = State(lattice_positions(bodies, box, random), draw_orientations(bodies, random),
                  zeros, zeros.copy(), box, random=random)
    field = ForceField(system, box)
    return system, state, field, remove_overlaps(system, state, field)


@pytest.mark.parametrize("name", library_names())
def test_every_library_liquid(name):
    species = load_species(name)
    liquid = species.liquid
    system, state, field, energy = start(species, 64, liquid.density, liquid.temperature)
    assert energy < 0, "a relaxed liquid is bound"
    draw_motion(system, state)
    mover = Mover(system, field, None, 0.002, make_thermostat(system, "langevin", 10.0))
    mover.begin(state)
    for _ in range(300):
        mover.advance(state, energies=False)
    kinetic = 2 * sum(kinetic_energies(system, state)) / (BOLTZMANN * mover.freedom.total)
    # six friction times after the start; the width is that of a canonical temperature
    width = liquid.temperature * np.sqrt(2 / mover.freedom.total)
    assert abs(kinetic - liquid.temperature) < 5 * width  # 5 sigma, the bath still catches up


def test_lattice_fills_odd_boxes_and_odd_numbers():
    for bodies, box in ((1, [2, 2, 2]), (13, [1.0, 2.0, 5.0]), (256, [3, 3, 3])):
        sites = lattice_positions(bodies, np.array(box, float), np.random.default_rng(0))
        assert sites.shape == (bodies, 3) and np.all(sites >= 0) and np.all(sites < box)
        assert len(np.unique(sites.round(9), axis=0)) == bodies


def test_each_species_is_drawn_and_numbered_along_the_lattice():
    box, counts = np.array([3.0, 3.0, 3.0]), (20, 88)  # 108 sites, none vacant
    sites = lattice_positions(counts, box, np.random.default_rng(0))
    everywhere = lattice_positions(108, box, np.random.default_rng(0))
    rank = [int(np.flatnonzero((everywhere == site).all(axis=1))[0]) for site in sites]
    assert sorted(rank) == list(range(108))
    assert rank[:20] == sorted(rank[:20]) and rank[20:] == sorted(rank[20:])
    assert rank[:20] != list(range(20))


def test_too_dense_is_said():
    species = load_species("water")
    with pytest.raises(RunError, match="lower the density"):
        start(species, 64, 20 * species.liquid.density, 300.0)
