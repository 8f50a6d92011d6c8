"""What is timed: three liquids, at their densities and with the forces they are timed with."""

import numpy as np
from scipy.spatial import cKDTree

from swirlight.rotation import to_laboratory
from swirlight.species.body import GENERAL, Species
from swirlight.species.frame import body_frame
from swirlight.species.library import load_species
from swirlight.system import Interactions, System

CUTOFF = 0.9  # nm, between sites
SPLITTING = 3.5  # 1/nm
TIMESTEP = 0.002  # ps


def five():
    """A body with charge and Lennard-Jones on all of its five sites, invented for timing."""
    mass = np.array([12.0, 1.0, 19.0, 35.0, 80.0])
    charge = np.array([0.3, 0.1, -0.15, -0.15, -0.1])
    places = np.array([[0, 0, 0], [0, 0, 0.109], [0.13, 0, -0.04], [-0.085, 0.15, -0.05],
                       [-0.09, -0.165, -0.055]])
    frame = body_frame(places, mass, charge)
    return Species("five", "invented for timing", tuple("ABCDE"), frame.sites, mass, charge,
                   np.array([0.33, 0.22, 0.29, 0.34, 0.36]),
                   np.array([0.4, 0.08, 0.3, 1.1, 1.3]), frame.inertia, GENERAL, frame.rotation)


# Species, bodies per nm³. SPC/E water and acetonitrile as at room temperature; the atom has the
# parameters of argon, which at 298 K and this density is a dense fluid, not a liquid.
SYSTEMS = {
    "water": (lambda: load_species("water"), 33.4),
    "acetonitrile": (lambda: load_species("acetonitrile"), 11.4),
    "atoms": (lambda: load_species("argon"), 20.4),
    "five": (five, 8.0),
}


def box_of(name, bodies):
    """(3,) edges of the cube that holds so many bodies at the density of the liquid. [nm]"""
    return np.full(3, (bodies / SYSTEMS[name][1]) ** (1 / 3))


def with_plain_cutoff(name, bodies, precision="mixed", cutoff=CUTOFF):
    """The system of the force calls: plain cut-off, real-space Ewald of a fixed splitting."""
    species = SYSTEMS[name][0]()
    charged = bool(species.charge.any())
    return System((species,), (bodies,), Interactions(
        cutoff, cutoff_form="plain", precision=precision,
        electrostatics="mesh-ewald" if charged else "none",
        splitting=SPLITTING if charged else None))


def as_in_a_run(name, bodies, **choices):
    """The system of the whole steps: what a config that says nothing more gets, and `choices`."""
    return System((SYSTEMS[name][0](),), (bodies,), Interactions(CUTOFF, **choices))


def site_places(system, state):
    """Where all sites are, inside the box (S, 3) [nm], and the body of each (S,)."""
    owner = np.repeat(np.arange(system.bodies), np.diff(system.site_start))
    lever = to_laboratory(state.orientation[owner], system.type_position[system.type_of_site])
    return (state.position[owner] + lever) % state.box % state.box, owner


def useful_pairs(system, state):
    """Pairs of sites of two bodies within the cutoff, each once."""
    place, owner = site_places(system, state)
    tree, cutoff = cKDTree(place, boxsize=state.box), system.interactions.cutoff
    within = (tree.count_neighbors(tree, cutoff) - len(place)) // 2
    inside = 0
    for first, last in zip(system.type_start[:-1], system.type_start[1:], strict=True):
        body = cKDTree(system.type_position[first:last])
        inside += len(body.query_pairs(cutoff)) * system.counts[0]
    return int(within - inside)
