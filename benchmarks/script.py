"""The same forces as someone would write them in an afternoon, with numpy and scipy.

All pairs of sites within the cutoff from a periodic k-d tree, the laws of `textbook.py` on
arrays of all pairs, sums over sites by bincount, and from sites to bodies.
"""

import numpy as np
from scipy.spatial import cKDTree
from scipy.spatial.transform import Rotation
from scipy.special import erfc

from swirlight.units import COULOMB


class Script:
    """The script for a system of one species: call it for force and torque.

    alpha : Ewald splitting. [1/nm]
    """

    def __init__(self, system, state, alpha):
        (self.species,), self.state, self.alpha = system.species, state, alpha
        self.sigma, self.epsilon = system.lennard_jones
        self.cutoff = system.interactions.cutoff

    def places(self):
        """Lever arms (N, sites, 3) and places (N sites, 3)."""
        turn = Rotation.from_quat(self.state.orientation, scalar_first=True).as_matrix()
        lever = self.species.sites @ turn.swapaxes(1, 2)
        return lever, (self.state.position[:, None] + lever).reshape(-1, 3)

    def near(self, place):
        """(pairs, 2) sites of two bodies within the cutoff."""
        tree = cKDTree(place % self.state.box % self.state.box, boxsize=self.state.box)
        pairs = tree.query_pairs(self.cutoff, output_type="ndarray")
        body = pairs // len(self.species.sites)
        return pairs[body[:, 0] != body[:, 1]]

    def __call__(self, pairs=None):
        """pairs : as `near` finds them; found anew if not given."""
        lever, place = self.places()
        pairs = self.near(place) if pairs is None else pairs
        first, second = pairs.T
        apart = place[first] - place[second]
        apart -= self.state.box * np.round(apart / self.state.box)
        r2 = (apart**2).sum(axis=1)
        force = (self.strength(first, second, r2) / r2)[:, None] * apart
        on_site = np.stack([np.bincount(first, f, len(place)) - np.bincount(second, f, len(place))
                            for f in force.T], axis=1).reshape(lever.shape)
        return on_site.sum(axis=1), np.cross(lever, on_site).sum(axis=1)

    def strength(self, first, second, r2):
        """Force along the pair times the distance, of all pairs."""
        species, sites = self.species, len(self.species.sites)
        a, b = first % sites, second % sites
        strength = np.zeros_like(r2)
        touching = np.flatnonzero(self.epsilon[a, b] > 0)
        sigma = self.sigma[a[touching], b[touching]]
        six = (sigma**2 / r2[touching]) ** 3
        strength[touching] = 24 * self.epsilon[a[touching], b[touching]] * (2 * six**2 - six)
        if species.charge.any():
            r = np.sqrt(r2)
            bell = 2 * self.alpha / np.sqrt(np.pi) * np.exp(-((self.alpha * r) ** 2))
            strength += COULOMB * species.charge[a] * species.charge[b] * (
                erfc(self.alpha * r) / r + bell)
        return strength
