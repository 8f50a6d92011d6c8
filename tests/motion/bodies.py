"""Small invented bodies for the tests of motion; every number is invented."""

import numpy as np

from swirlight.species.body import OpticalResponse, Species
from swirlight.state import State
from swirlight.system import Interactions, System


def body(inertia, mass=20.0, dipole=(0, 0, 0), charge=0.0, response=None, name="body"):
    """A species with given principal moments; its sites carry only the charges."""
    inertia = np.asarray(inertia, float)
    freedom = 3 if inertia.all() else (2 if inertia.any() else 0)
    dipole = np.asarray(dipole, float)
    # a pair of charges ±10 e on a short lever makes the dipole
    sites = np.array([dipole / 20, -dipole / 20])
    return Species(
        name=name, source="invented", labels=("A", "B"), sites=sites,
        mass=np.array([mass / 2, mass / 2]), charge=np.array([10.0, -10.0]) + charge / 2,
        sigma=np.zeros(2), epsilon=np.zeros(2), inertia=inertia, freedom=freedom,
        frame=np.eye(3), responses=() if response is None else (response,),
    )


def response(polarizability=0.0, absorptive=0.0, gyration=(0, 0, 0), rectification=0.0):
    """An optical response; a number or three numbers stand for a diagonal tensor."""

    def tensor(value):
        value = np.asarray(value, float)
        return value if value.ndim == 2 else np.diag(np.broadcast_to(value, 3)).astype(float)

    return OpticalResponse(None, tensor(polarizability), tensor(absorptive),
                           np.asarray(gyration, float), tensor(rectification))


def system(*pairs, temperature=300.0):
    """A system of (species, count) pairs without interactions."""
    species, counts = zip(*pairs, strict=True)
    return System(species, counts, Interactions(cutoff=1.0, electrostatics="none"), temperature)


def still(system, seed=1):
    """A state at rest at the origin, unturned."""
    n = system.bodies
    return State(
        position=np.zeros((n, 3)), orientation=np.tile([1.0, 0, 0, 0], (n, 1)),
        velocity=np.zeros((n, 3)), angular_momentum=np.zeros((n, 3)), box=np.full(3, 5.0),
        random=np.random.default_rng(seed),
    )


def thermal(system, seed=1):
    """A state with drawn orientations and momenta."""
    from swirlight.motion.draw import draw_motion, draw_orientations

    state = still(system, seed)
    state.position[:] = 5.0 * state.random.random((system.bodies, 3))
    state.orientation[:] = draw_orientations(system.bodies, state.random)
    draw_motion(system, state, without_total_momentum=False)
    return state
