"""Places of sites against the plain twin."""

import numpy as np
import pytest

from swirlight.forces.sites import place_sites
from tests.reference.plain import levers
from tests.reference.samples import dense_mixture


def test_levers_equal_those_of_rotation_matrices():
    system, position, orientation, _ = dense_mixture()
    found = place_sites(system, position, orientation, np.empty((16 * 7, 3)))
    np.testing.assert_allclose(found, levers(system, orientation), atol=1e-16)


def test_arrays_of_another_shape_are_refused():
    system, position, orientation, _ = dense_mixture()
    with pytest.raises(ValueError, match=r"\(112, 3\), got .*\(111, 3\)"):
        place_sites(system, position, orientation, np.empty((111, 3)))
