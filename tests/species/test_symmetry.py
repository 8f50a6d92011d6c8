"""Point groups and what they leave of the response tensors."""

import numpy as np
import pytest
from scipy.spatial.transform import Rotation

from swirlight.errors import InputError
from swirlight.species.frame import body_frame
from swirlight.species.invariants import gyration_spaces, invariant_tensors
from swirlight.species.response import allowed_by, hold_against, require_absorbing
from swirlight.species.symmetry import point_group

from .bodies import BODIES

# The character tables of any textbook give the order of each group; an infinite group stands
# as its generators.
ORDER = {"C1": 1, "Ci": 2, "Cs": 2, "C2": 2, "C3": 3, "S4": 4, "C2h": 4, "C2v": 4, "D2": 4,
         "C3h": 6, "C3v": 6, "D3": 6, "D2d": 8, "D2h": 8, "D3h": 12, "D3d": 12, "D6h": 24,
         "Td": 24, "Th": 24, "Oh": 48, "Ih": 120}


def group_of(name, turn=None):
    position, mass, charge = BODIES[name]
    if turn is not None:
        position = position @ turn.T
    frame = body_frame(position, mass, charge)
    return point_group(frame.sites, frame.freedom, mass, charge)


@pytest.mark.parametrize("name", BODIES)
def test_the_group_is_found_in_any_frame(name):
    for turn in Rotation.random(2, random_state=np.random.RandomState(3)).as_matrix():
        group = group_of(name, turn)
        assert group.name == name
        if name in ORDER:
            assert len(group.operations) == ORDER[name]


@pytest.mark.parametrize("name", ORDER)
def test_the_operations_form_a_group(name):
    operations = group_of(name).operations
    for product in np.einsum("aij,bjk->abik", operations, operations).reshape(-1, 3, 3):
        assert np.abs(operations - product).max(axis=(1, 2)).min() < 1e-9


def test_charges_and_lennard_jones_break_a_symmetry_of_the_masses():
    position, mass, charge = BODIES["Td"]
    frame = body_frame(position, mass, charge)
    marked = np.array([0, 1.0, 0, 0, 0])
    assert point_group(frame.sites, frame.freedom, mass, marked).name == "C3v"
    marked[2] = 2.0
    assert point_group(frame.sites, frame.freedom, mass, marked).name == "Cs"


# What the groups leave, component by component: symmetric polar tensor, time-odd axial vector
# up to its sign, axial tensor. Derived by hand from the operations.
WORDS = {
    "Kh": ("xx = yy = zz", "none", "none"),
    "D∞h": ("xx = yy, zz", "along z", "none"),
    "C∞v": ("xx = yy, zz", "along z", "xy = -yx"),
    "C2v": ("xx, yy, zz", "along x, y or z", "xz, zx"),
    "C3v": ("xx = yy, zz", "along z", "xy = -yx"),
    "C1": ("xx, xy, xz, yy, yz, zz", "any direction", "xx, xy, xz, yx, yy, yz, zx, zy, zz"),
    "Ci": ("xx, xy, xz, yy, yz, zz", "any direction", "none"),
    "Cs": ("xx, xy, yy, zz", "in the xy plane or along z", "xz, yz, zx, zy"),
    "C3": ("xx = yy, zz", "along z", "xx = yy, xy = -yx, zz"),
    "D2d": ("xx = yy, zz", "along z", None),  # its κ depends on which axis comes first
    "Td": ("xx = yy = zz", "none", "none"),
    "D2": (None, "along x, y or z", "xx, yy, zz"),
}


@pytest.mark.parametrize("name", WORDS)
def test_what_a_group_leaves(name):
    allowed = allowed_by(group_of(name).operations)
    for part, words in zip(("polarizability", "gyration", "rectification"), WORDS[name],
                           strict=True):
        if words is not None:
            assert allowed.words(part) == words, part


@pytest.mark.parametrize("name", BODIES)
def test_allowed_tensors_obey_the_defining_equations(name):
    operations = group_of(name).operations
    for basis, axial in ((invariant_tensors(operations), False),
                         (invariant_tensors(operations, axial=True), True)):
        for tensor in basis:
            for q in operations:
                sign = np.linalg.det(q) if axial else 1.0
                np.testing.assert_allclose(sign * q @ tensor @ q.T, tensor, atol=1e-9)
    for space in gyration_spaces(operations):
        for q in operations:
            turned = space @ q.T
            assert np.allclose(turned, space) or np.allclose(turned, -space)


@pytest.mark.parametrize("name", ORDER)
def test_projection_equals_the_average_over_the_group(name):
    operations = group_of(name).operations
    random = np.random.default_rng(5)
    tensor = random.normal(size=(3, 3))
    symmetric, allowed = tensor + tensor.T, allowed_by(operations)
    mean = np.mean([q @ symmetric @ q.T for q in operations], axis=0)
    np.testing.assert_allclose(allowed.part("polarizability", symmetric), mean, atol=1e-9)
    mean = np.mean([np.linalg.det(q) * q @ tensor @ q.T for q in operations], axis=0)
    np.testing.assert_allclose(allowed.part("rectification", tensor), mean, atol=1e-9)


def test_gyration_may_lie_in_one_allowed_space_but_not_across_two():
    group = group_of("C2v")
    for axis in np.eye(3):
        for sign in (1.0, -1.0):  # both signs are time reverses of each other
            kept, note = hold_against("gyration", sign * axis, group)
            np.testing.assert_allclose(kept, sign * axis, atol=1e-12)
            assert note == ""
    with pytest.raises(InputError, match="component [xz] is forbidden by.*C2v.*along x"):
        hold_against("gyration", np.array([1.0, 0, 0.9]), group)
    slanted = np.array([0.3, -0.2, 0.9])
    np.testing.assert_allclose(hold_against("gyration", slanted, group_of("Ci"))[0], slanted)
    with pytest.raises(InputError, match="along z"):
        hold_against("gyration", slanted, group_of("C3v"))


def test_gyration_keeps_its_sign_only_where_the_operation_says_so():
    """A mirror keeps an axial vector across it and reverses one in it: Q g = det(Q) g there is
    the ordinary rule, the other sign is allowed because g is odd under time reversal."""
    mirror = np.diag([1.0, 1, -1])
    spaces = gyration_spaces([mirror])
    in_plane, along = spaces[0], spaces[1]
    np.testing.assert_allclose(along @ mirror.T, np.linalg.det(mirror) * along)
    np.testing.assert_allclose(in_plane @ mirror.T, -np.linalg.det(mirror) * in_plane)


def test_forbidden_parts_are_refused_unless_ignored():
    group = group_of("C2v")
    tensor = np.diag([4.0, 5, 6])
    tensor[0, 1] = tensor[1, 0] = 0.2
    with pytest.raises(InputError, match="component xy, yx is forbidden by the "
                                         "symmetry C2v.*xx, yy, zz.*symmetry: ignore"):
        hold_against("polarizability", tensor, group)
    kept, note = hold_against("polarizability", tensor, group, ignore=True)
    np.testing.assert_allclose(kept, tensor, atol=1e-12)
    assert note == ("polarizability: component xy, yx kept although C2v forbids it "
                    "(symmetry: ignore)")


def test_rounding_of_typed_numbers_is_removed():
    group = group_of("C3v")
    kept, note = hold_against("polarizability", np.diag([4.00001, 3.99999, 6.0]), group)
    np.testing.assert_allclose(kept, np.diag([4.0, 4.0, 6.0]), rtol=1e-12, atol=1e-12)
    assert note == ""


def test_rectification_of_linear_bodies():
    """κ_zz, κ_xx = κ_yy and κ_xy = −κ_yx are all that rotation about the axis leaves; the
    mirror planes of the sites leave only the last, an inversion nothing."""
    polar, centric = group_of("C∞v"), group_of("D∞h")
    swirl = np.array([[0.0, 1, 0], [-1, 0, 0], [0, 0, 0]])
    axial = np.diag([1.0, 1, 3])
    np.testing.assert_allclose(hold_against("rectification", swirl, polar)[0], swirl, atol=1e-12)
    for tensor, group in ((axial, polar), (axial, centric), (swirl, centric)):
        with pytest.raises(InputError, match="forbidden by the symmetry"):
            hold_against("rectification", tensor, group)
        kept, note = hold_against("rectification", tensor, group, ignore=True)
        np.testing.assert_allclose(kept, tensor, atol=1e-12)
        assert "ignore" in note
    for tensor in (np.diag([1.0, 2, 3]), np.eye(3)[[1, 0, 2]]):
        with pytest.raises(InputError, match="has no meaning on a linear body"):
            hold_against("rectification", tensor, polar, ignore=True)


@pytest.mark.parametrize("name", ["C∞v", "D∞h"])
def test_linear_bodies_have_axial_polarizability_and_gyration_whatever_is_ignored(name):
    group = group_of(name)
    with pytest.raises(InputError, match="xx.* has no meaning on a linear body.*xx = yy, zz"):
        hold_against("polarizability", np.diag([4.0, 5, 6]), group, ignore=True)
    with pytest.raises(InputError, match="component x has no meaning on a linear body.*along z"):
        hold_against("gyration", np.array([0.1, 0, 1.0]), group, ignore=True)
    np.testing.assert_allclose(hold_against("gyration", np.array([0, 0, -2.0]), group)[0],
                               [0, 0, -2.0], atol=1e-12)


def test_atoms_have_only_an_isotropic_polarizability():
    group = group_of("Kh")
    hold_against("polarizability", 2.0 * np.eye(3), group)
    with pytest.raises(InputError, match="no meaning on an atom"):
        hold_against("gyration", np.array([0, 0, 1.0]), group, ignore=True)
    with pytest.raises(InputError, match="forbidden by the symmetry Kh"):
        hold_against("rectification", np.eye(3), group)


def test_gain_is_refused():
    require_absorbing(np.diag([0.0, 0.0, 1.0]))
    require_absorbing(np.zeros((3, 3)))
    with pytest.raises(InputError, match="amplify the light"):
        require_absorbing(np.diag([-0.1, 1.0, 1.0]))
    with pytest.raises(InputError, match="amplify the light"):
        require_absorbing(np.array([[1.0, 2.0, 0], [2.0, 1.0, 0], [0, 0, 1.0]]))
