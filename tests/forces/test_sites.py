"""Charges of bodies against plain twins."""

import numpy as np
import pytest
from scipy.spatial.transform import Rotation

from swirlight.forces.sites import add_to_bodies, place_charges
from tests.reference.plain import levers
from tests.reference.samples import dense_mixture


def test_charges_are_placed_and_their_forces_collected():
    """Against sums over sites with the levers of rotation matrices; freedoms of all three kinds."""
    system, position, orientation, _ = dense_mixture()
    lever = levers(system, orientation)
    charged = np.flatnonzero(system.site_charge)
    body = np.repeat(np.arange(system.bodies), np.diff(system.site_start))[charged]
    first = np.searchsorted(charged, system.site_start).astype(np.int32)
    place, rng = np.empty((len(charged), 3)), np.random.default_rng(1)
    place_charges(position, orientation, first, system.type_of_site[charged],
                  system.type_position, place)
    np.testing.assert_allclose(place, position[body] + lever[charged], atol=1e-15)

    push = rng.normal(size=place.shape)
    freedom = np.array([0, 2, 3])[np.arange(system.bodies) % 3]
    force, torque = rng.normal(size=(2, system.bodies, 3))
    expected, turning = force.copy(), torque.copy()
    np.add.at(expected, body, push)
    np.add.at(turning, body, np.cross(lever[charged], push))
    expected -= np.outer(system.mass, expected.sum(axis=0)) / system.mass.sum()
    axis = Rotation.from_quat(orientation, scalar_first=True).apply([0.0, 0.0, 1.0])
    turning[freedom == 0] = 0.0
    linear = freedom == 2
    turning[linear] -= (turning * axis).sum(axis=1)[linear, None] * axis[linear]
    work = add_to_bodies(position, orientation, freedom, system.mass, True, place, push, first,
                         force, torque)
    assert work == pytest.approx((push * lever[charged]).sum(), rel=1e-11)
    np.testing.assert_allclose(force, expected, atol=1e-12)
    np.testing.assert_allclose(torque, turning, atol=1e-12)
