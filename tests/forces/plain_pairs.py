"""The pair forces written out plainly, and the invented bodies they are tried on.

Nothing here is shared with the package's kernels: every pair of sites is visited in every
nearby image, with erfc and the cut-off forms as they stand in textbooks.
"""

import itertools

import numpy as np
from scipy.special import erfc

from swirlight.species.body import Species
from swirlight.system import Interactions, System
from swirlight.units import COULOMB


def body(name, places, mass, charge, sigma, epsilon):
    """A species in its own centre-of-mass frame, axes as given (not principal: not needed)."""
    places, mass = np.array(places, float), np.array(mass, float)
    places = places - mass @ places / mass.sum()
    labels = tuple("ABCDEFGHIJKLMNOP"[: len(mass)])
    freedom = {1: 0, 2: 2}.get(len(mass), 3)
    inertia = np.array([(mass @ (places**2).sum(1)) - mass @ places[:, k] ** 2 for k in range(3)])
    return Species(name, "invented for a test", labels, places, mass, np.array(charge, float),
                   np.array(sigma, float), np.array(epsilon, float), inertia, freedom, np.eye(3))


FIVE = body(
    "five",
    [[0, 0, 0], [0.10, 0.02, 0], [-0.04, 0.10, 0.03], [-0.03, -0.06, 0.11], [0.01, -0.07, -0.1]],
    [12, 1, 16, 19, 14], [0.1, 0.25, -0.3, -0.25, 0.2],
    [0.3, 0.24, 0.28, 0.29, 0.31], [0.3, 0.1, 0.6, 0.3, 0.5],
)
TWO = body("two", [[0, 0, 0], [0, 0, 0.12]], [14, 16], [0.4, -0.4], [0.3, 0.28], [0.5, 0.7])
ATOM = body("atom", [[0, 0, 0]], [40], [0], [0.32], [0.9])
ION = body("ion", [[0, 0, 0]], [23], [1.0], [0.26], [0.4])
# Charges without Lennard-Jones, as on the hydrogens of most water models, and a bare mass.
SPCE = body("water", [[0, 0, 0], [0.0816490, 0.0577359, 0], [-0.0816490, 0.0577359, 0]],
            [15.999, 1.008, 1.008], [-0.8476, 0.4238, 0.4238], [0.3166, 0, 0], [0.65, 0, 0])
WEIGHTED = body("weighted", [[0, 0, 0], [0, 0.02, 0.1], [0.1, 0, 0]], [14, 16, 2],
                [0.3, -0.3, 0], [0.3, 0.28, 0], [0.5, 0.7, 0])


def arrangement(count, box, seed, spread=0.02):
    """Centres on a jittered lattice and random orientations."""
    rng = np.random.default_rng(seed)
    box = np.array(box, float)
    points = np.ceil(box * (count / box.prod()) ** (1 / 3)).astype(int)
    lattice = np.array(list(itertools.product(*(range(p) for p in points))))
    chosen = rng.permutation(len(lattice))[:count]
    position = (lattice[chosen] + 0.5) / points * box + rng.normal(0, spread, (count, 3))
    # Anywhere, not in the first box.
    position += box * rng.integers(-3, 4, (count, 3))
    orientation = rng.normal(size=(count, 4))
    return position, orientation / np.linalg.norm(orientation, axis=1)[:, None]


def sample(species, counts, box, seed=1, **interactions):
    """A system, its positions, orientations and box."""
    system = System(tuple(species), tuple(counts), Interactions(**{"cutoff": 0.9, **interactions}))
    box = np.array(box, float)
    return system, *arrangement(sum(counts), box, seed), box


def rotation(quaternion):
    """(…, 3, 3) rotation matrices."""
    w, x, y, z = np.moveaxis(quaternion, -1, 0)
    return np.moveaxis(np.array([
        [1 - 2 * (y * y + z * z), 2 * (x * y - w * z), 2 * (x * z + w * y)],
        [2 * (x * y + w * z), 1 - 2 * (x * x + z * z), 2 * (y * z - w * x)],
        [2 * (x * z - w * y), 2 * (y * z + w * x), 1 - 2 * (x * x + y * y)],
    ]), (0, 1), (-2, -1))


def lennard_jones(r, sigma, epsilon, form, cutoff):
    """u and −u′ of one pair."""
    def plain(r):
        s = (sigma / r) ** 6
        return 4 * epsilon * (s * s - s), 24 * epsilon * (2 * s * s - s) / r

    u, f = plain(r)
    if form == "force-shifted":
        edge, slope = plain(cutoff)
        return u - edge + (r - cutoff) * slope, f - slope
    if form == "switched":
        x = np.clip((r - 0.9 * cutoff) / (0.1 * cutoff), 0, 1)
        s = 1 - 10 * x**3 + 15 * x**4 - 6 * x**5
        ds = (-30 * x**2 + 60 * x**3 - 30 * x**4) / (0.1 * cutoff)
        return u * s, f * s - u * ds
    return u, f


def coulomb(r, law):
    """u and −u′ of two unit charges, without k."""
    a, rc = law.alpha, law.cutoff
    bell = 2 * a / np.sqrt(np.pi)
    if law.kind == "ewald":
        return erfc(a * r) / r, erfc(a * r) / r**2 + bell * np.exp(-((a * r) ** 2)) / r
    if law.kind == "damped-shifted":
        edge = erfc(a * rc) / rc
        slope = erfc(a * rc) / rc**2 + bell * np.exp(-((a * rc) ** 2)) / rc
        return (erfc(a * r) / r - edge + slope * (r - rc),
                erfc(a * r) / r**2 + bell * np.exp(-((a * r) ** 2)) / r - slope)
    if law.kind == "reaction-field":
        e = law.epsilon_rf
        k = 0.5 if np.isinf(e) else (e - 1) / (2 * e + 1)
        c = 1.5 if np.isinf(e) else 3 * e / (2 * e + 1)
        return 1 / r + k * r**2 / rc**3 - c / rc, 1 / r**2 - 2 * k * r / rc**3
    return 0 * r, 0 * r


def plain_forces(system, law, position, orientation, box):
    """Force, torque (N, 3), energies of Lennard-Jones and charges, virial (3,), pairs met."""
    inter = system.interactions
    sigma, epsilon = system.lennard_jones
    owner = np.repeat(np.arange(system.bodies), np.diff(system.site_start))
    kind = system.type_of_site
    lever = np.einsum("sij,sj->si", rotation(orientation)[owner], system.type_position[kind])
    centre = position - box * np.floor(position / box)
    force, torque = np.zeros((system.bodies, 3)), np.zeros((system.bodies, 3))
    energy, virial, met = np.zeros(2), np.zeros(3), 0
    for image in itertools.product((-1, 0, 1), repeat=3):
        apart = centre[owner][None] + np.array(image) * box - centre[owner][:, None]
        d = apart + lever[None] - lever[:, None]
        r = np.sqrt((d**2).sum(axis=-1))
        meets = (r < inter.cutoff) & ((owner[:, None] != owner[None]) | any(image))
        i, j = np.nonzero(meets)
        met += len(i)
        r, d, apart = r[i, j], d[i, j], apart[i, j]
        u_lj, f_lj = lennard_jones(r, sigma[kind[i], kind[j]], epsilon[kind[i], kind[j]],
                                   inter.cutoff_form, inter.cutoff)
        u_q, f_q = coulomb(r, law)
        qq = COULOMB * system.site_charge[i] * system.site_charge[j]
        push = -((f_lj + qq * f_q) / r)[:, None] * d  # on site i
        np.add.at(force, owner[i], push)
        np.add.at(torque, owner[i], np.cross(lever[i], push))
        energy += 0.5 * u_lj.sum(), 0.5 * (qq * u_q).sum()
        virial -= 0.5 * (apart * push).sum(axis=0)
    return force, torque, energy, virial, met // 2
