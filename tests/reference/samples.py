"""Bodies and samples that tests of the forces share; all parameters invented unless said."""

import numpy as np
from scipy.spatial.transform import Rotation

from swirlight.species.body import ATOM, GENERAL, LINEAR, Species
from swirlight.system import Interactions, System


def body(name, sites, mass, charge, sigma, epsilon, mixing="lorentz-berthelot"):
    """A species from sites in any frame, turned to its principal axes (a linear one to z)."""
    sites, mass = np.array(sites, float), np.array(mass, float)
    sites = sites - mass @ sites / mass.sum()
    square = (sites**2).sum(axis=1)
    tensor = np.einsum("s,sij->ij", mass, square[:, None, None] * np.eye(3)
                       - sites[:, :, None] * sites[:, None, :])
    moments, axes = np.linalg.eigh(tensor)
    if moments[0] < 1e-9 * moments[2] or len(sites) == 1:  # the axis of no moment becomes z
        moments, axes = moments[[2, 1, 0]], axes[:, [2, 1, 0]]
        moments = np.where(moments < 1e-9 * max(moments[0], 1.0), 0.0, moments)
    axes = axes * np.sign(np.linalg.det(axes))
    freedom = {0: GENERAL, 1: LINEAR, 3: ATOM}[int(np.count_nonzero(moments == 0.0))]
    return Species(
        name=name, source="invented", labels=tuple(f"s{j}" for j in range(len(mass))),
        sites=sites @ axes, mass=mass, charge=np.array(charge, float),
        sigma=np.array(sigma, float), epsilon=np.array(epsilon, float), inertia=moments,
        freedom=freedom, frame=axes.T, mixing=mixing,
    )


FIVE = body(  # a cation, all five sites charged
    "five", [[0, 0, 0], [0.11, 0.01, -0.02], [-0.03, 0.12, 0.04], [-0.05, -0.07, 0.13],
             [0.02, -0.05, -0.11]],
    [14.0, 16.0, 19.0, 12.0, 1.0], [0.55, -0.25, 0.40, 0.35, -0.05],
    [0.30, 0.28, 0.27, 0.29, 0.22], [0.40, 0.55, 0.25, 0.80, 0.10],
)
TWO = body("two", [[0, 0, 0], [0, 0.12, 0]], [17.0, 9.0], [-1.2, 0.2], [0.30, 0.26], [0.5, 0.2])
DUMBBELL = body("dumbbell", [[0, 0, 0], [0, 0, 0.11]], [14.0, 15.0], [0.25, -0.25], [0.3, 0.31],
                [0.3, 0.4])


def turned(rng, count):
    """(count, 4) unit quaternions, uniform."""
    q = rng.normal(size=(count, 4))
    return q / np.linalg.norm(q, axis=1, keepdims=True)


def lattice(rng, count, box, jitter):
    """(count, 3) places near a simple cubic lattice, in random order, some outside the box."""
    side = int(np.ceil(count ** (1 / 3)))
    grid = np.stack(np.meshgrid(*[np.arange(side)] * 3, indexing="ij"), -1).reshape(-1, 3)
    chosen = rng.permutation(grid)[:count]
    place = (chosen + 0.5 + rng.uniform(-jitter, jitter, (count, 3))) / side
    return (place + rng.integers(-1, 2, (count, 3))) * box


def dense_mixture(count=16, density=8.0, seed=7, **interactions):
    """System, position, orientation, box: `count` each of FIVE and TWO in a box not cubic."""
    settings = {"cutoff": 0.6, "precision": "double"} | interactions
    system = System((FIVE, TWO), (count, count), Interactions(**settings))
    rng = np.random.default_rng(seed)
    edge = (2 * count / density) ** (1 / 3)
    box = edge * np.array([1.0, 1.05, 1 / 1.05])
    position = lattice(rng, 2 * count, box, 0.08)
    return system, position, without_overlap(rng, system, position, box), box


def without_overlap(rng, system, position, box, draws=60):
    """Orientations, each the best of some draws: sites of two bodies kept as far as can be."""
    placed, orientation = np.empty((0, 3)), []
    for i, k in enumerate(system.species_of):
        options = []
        for q in turned(rng, draws):
            sites = position[i] + Rotation.from_quat(q, scalar_first=True).apply(
                system.species[k].sites)
            apart = sites[:, None] - placed
            apart -= np.round(apart / box) * box
            options.append((np.min((apart**2).sum(-1), initial=1e9), tuple(q), sites))
        _, q, sites = max(options, key=lambda option: option[0])
        placed = np.concatenate([placed, sites])
        orientation.append(q)
    return np.array(orientation)


def spce(sigma=0.3166, epsilon=0.650):
    """SPC/E water, Berendsen, Grigera & Straatsma, J. Phys. Chem. 91 (1987) 6269.

    epsilon : [u nm²/ps², to 1e-9 kJ/mol]. Planar, the dipole along −y of the frame below: only
    distances inside the molecule matter to whoever uses it.
    """
    half = np.deg2rad(109.47) / 2
    arm = 0.1 * np.array([np.sin(half), np.cos(half), 0.0])
    return body("SPC/E", [[0, 0, 0], arm, arm * [-1, 1, 1]], [15.999, 1.008, 1.008],
                [-0.8476, 0.4238, 0.4238], [sigma, 0.0, 0.0], [epsilon, 0.0, 0.0])
