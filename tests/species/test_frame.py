"""The body frame: what fixes it, and that nothing else does."""

import numpy as np
import pytest
from scipy.spatial.transform import Rotation

from swirlight.errors import InputError
from swirlight.species.body import ATOM, GENERAL, LINEAR
from swirlight.species.frame import body_frame, inertia_tensor

from .bodies import BODIES, ring, water

TURNS = Rotation.random(4, random_state=np.random.RandomState(7)).as_matrix()


def turned(body, turn, shift=(0.3, -0.2, 0.9)):
    position, mass, charge = body
    return position @ turn.T + np.array(shift), mass, charge


@pytest.mark.parametrize("turn", TURNS)
def test_planar_water_has_its_dipole_along_y_and_its_first_hydrogen_at_positive_x(turn):
    frame = body_frame(*turned(water(), turn))
    charge = water()[2]
    dipole = charge @ frame.sites
    assert dipole[1] > 0.0
    np.testing.assert_allclose(dipole[[0, 2]], 0, atol=1e-14)
    np.testing.assert_allclose(frame.sites[:, 2], 0, atol=1e-14)
    assert frame.sites[1, 0] > 0.0 > frame.sites[2, 0]
    assert frame.inertia[0] < frame.inertia[1] < frame.inertia[2]


@pytest.mark.parametrize("name", BODIES)
@pytest.mark.parametrize("turn", TURNS)
def test_the_frame_does_not_depend_on_the_frame_of_the_file(name, turn):
    straight, other = body_frame(*BODIES[name]), body_frame(*turned(BODIES[name], turn))
    np.testing.assert_allclose(other.sites, straight.sites, atol=1e-12)
    np.testing.assert_allclose(other.inertia, straight.inertia, rtol=1e-12)
    assert other.freedom == straight.freedom


@pytest.mark.parametrize("name", BODIES)
def test_the_frame_is_a_proper_rotation_to_the_principal_axes(name):
    position, mass, charge = BODIES[name]
    frame = body_frame(position, mass, charge)
    np.testing.assert_allclose(frame.rotation @ frame.rotation.T, np.eye(3), atol=1e-14)
    assert np.linalg.det(frame.rotation) == pytest.approx(1.0)
    np.testing.assert_allclose((position - frame.centre) @ frame.rotation.T, frame.sites,
                               atol=1e-14)
    np.testing.assert_allclose(mass @ frame.sites, 0, atol=1e-13)
    np.testing.assert_allclose(inertia_tensor(frame.sites, mass), np.diag(frame.inertia),
                               atol=1e-12 * max(frame.inertia.max(), 1.0))


def test_listing_the_sites_in_another_order_only_changes_the_choice_that_order_makes():
    position, mass, charge = water()
    order = [2, 0, 1]
    first, other = body_frame(position, mass, charge), body_frame(
        position[order], mass[order], charge[order])
    np.testing.assert_allclose(other.inertia, first.inertia, rtol=1e-14)
    # Now the second hydrogen is the first listed: x changes sign, and z with it.
    np.testing.assert_allclose(other.sites, first.sites[order] * [-1, 1, -1], atol=1e-14)
    asymmetric = BODIES["C1"][0], BODIES["C1"][1], np.array([0.1, 0.2, -0.1, -0.4, 0.2])
    order = [3, 1, 0, 4, 2]
    first = body_frame(*asymmetric)
    other = body_frame(*(values[order] for values in asymmetric))
    # A dipole with three components leaves the order of the sites nothing to decide.
    np.testing.assert_allclose(other.sites, first.sites[order], atol=1e-14)


def test_degrees_of_freedom():
    assert body_frame(*BODIES["Kh"]).freedom == ATOM
    assert body_frame(*BODIES["C∞v"]).freedom == LINEAR
    assert body_frame(*BODIES["C2v"]).freedom == GENERAL
    assert (body_frame(*BODIES["Kh"]).inertia == 0).all()
    linear = body_frame(*BODIES["C∞v"])
    assert linear.inertia[2] == 0 and linear.inertia[0] == linear.inertia[1] > 0
    assert (linear.sites[:, :2] == 0).all()


def test_z_of_a_linear_body_points_along_its_dipole():
    position, mass, charge = BODIES["C∞v"]
    assert charge @ body_frame(position, mass, charge).sites[:, 2] > 0
    assert -charge @ body_frame(position, mass, -charge).sites[:, 2] > 0


def test_a_linear_body_without_dipole_has_its_first_site_up():
    frame = body_frame(*BODIES["D∞h"])
    assert frame.sites[0, 2] > 0


@pytest.mark.parametrize("name, height", [("prolate", 0.3), ("oblate", 0.02)])
def test_z_of_a_symmetric_top_is_its_own_axis(name, height):
    position = np.vstack([ring(3, 0.1, -height), [[0, 0, height]]])[:, [1, 2, 0]]
    mass, charge = np.array([2.0, 2, 2, 6]), np.array([0.1, 0.1, 0.1, -0.3])
    frame = body_frame(position, mass, charge)
    assert frame.inertia[0] == frame.inertia[1]
    assert (frame.inertia[2] < frame.inertia[0]) == (name == "prolate")
    assert charge @ frame.sites[:, 2] > 0  # dipole along +z
    assert frame.sites[0, 0] > 0 and frame.sites[0, 1] == pytest.approx(0, abs=1e-14)


def test_a_spherical_top_has_its_first_outer_site_on_z_and_the_next_in_the_xz_plane():
    frame = body_frame(*BODIES["Td"])
    assert frame.inertia[0] == frame.inertia[1] == frame.inertia[2]
    np.testing.assert_allclose(frame.sites[1], [0, 0, 0.08 * np.sqrt(3)], atol=1e-15)
    assert frame.sites[2, 0] > 0 and frame.sites[2, 1] == pytest.approx(0, abs=1e-15)


def test_moments_count_as_equal_up_to_a_millionth():
    position, mass, charge = BODIES["D6h"]
    for stretch, equal in ((4e-7, True), (4e-6, False)):
        stretched = position * [1 + stretch, 1, 1]
        inertia = body_frame(stretched, mass, charge).inertia
        assert (inertia[0] == inertia[1]) == equal


def test_rounded_coordinates_of_a_linear_body_are_put_on_its_axis():
    position = np.array([[0.0, 0, 0], [0.1, 0.1000004, 0.05], [0.2, 0.2, 0.1]])
    frame = body_frame(position, np.array([12.0, 13, 14]), np.zeros(3))
    assert frame.freedom == LINEAR and (frame.sites[:, :2] == 0).all()


def test_massless_sites_count_for_the_shape_but_not_for_the_mass():
    position, mass, charge = water()
    position = np.vstack([position, [[0, 0.015, 0]]])
    mass, charge = np.append(mass, 0.0), np.array([0, 0.5, 0.5, -1.0])
    np.testing.assert_allclose(body_frame(position, mass, charge).inertia,
                               body_frame(*water()).inertia, rtol=1e-13)


def test_refused_bodies():
    line = np.array([[0.0, 0, 0], [0, 0, 0.1], [0.05, 0, 0.05]])
    with pytest.raises(InputError, match="no site has a mass"):
        body_frame(line, np.zeros(3), np.zeros(3))
    with pytest.raises(InputError, match="on a line but a site is 0.05 nm off it"):
        body_frame(line, np.array([1.0, 1, 0]), np.ones(3))
    with pytest.raises(InputError, match="all the mass is at one point"):
        body_frame(line, np.array([0.0, 1, 0]), np.ones(3))
