"""Sums over orientations against their plain twin."""

import numpy as np

from swirlight.observe.sums import orientation_sums
from swirlight.rotation import rotation_matrix
from tests.motion.bodies import body, system, thermal


def test_sums_equal_their_plain_twin():
    bodies = system((body((0.1, 0.2, 0.28), dipole=(0.02, 0.05, -0.03)), 5),
                    (body((0, 0, 0)), 3), (body((0.3, 0.3, 0.0), dipole=(0, 0, 0.06)), 4))
    state, beam = thermal(bodies), np.array([0.6, 0.0, 0.8])
    turn = rotation_matrix(state.orientation)
    own = np.repeat([s.dipole for s in bodies.species], bodies.counts, axis=0)
    dipole = sum(r @ mu for r, mu in zip(turn, own, strict=True))
    cosine = np.delete(turn[:, :, 2] @ beam, [5, 6, 7])  # without the atoms
    found = orientation_sums(state.orientation, bodies.freedom, bodies.dipole, beam)
    expected = [*dipole, cosine.sum(), (cosine**2).sum(), 9]
    np.testing.assert_allclose(found, expected, rtol=0, atol=1e-14)
