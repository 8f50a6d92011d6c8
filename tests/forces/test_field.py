"""The assembled force field: derivatives, methods against each other, refusals.

Samples of `dense_mixture`: charged bodies of 5 and of 2 sites, neutral together.
"""

from dataclasses import replace

import numba
import numpy as np
import pytest
from scipy.spatial.transform import Rotation

from swirlight.errors import InputError
from swirlight.forces.field import TERMS, ForceField
from swirlight.forces.mesh import MeshEwald
from swirlight.system import Interactions, System
from tests.reference.field import copied, rms, without_lennard_jones
from tests.reference.pairs import PlainPairs
from tests.reference.samples import DUMBBELL, FIVE, TWO, body, dense_mixture, lattice, turned

METHODS = {
    "mesh-ewald": {"tolerance": 1e-7},
    "direct-ewald": {"tolerance": 1e-9},
    "reaction-field": {},
    "damped-shifted": {},
}


def rotated(orientation, i, axis, angle):
    """Body i turned by an angle about an axis of the laboratory."""
    new = orientation.copy()
    turn = Rotation.from_rotvec(angle * np.eye(3)[axis])
    new[i] = (turn * Rotation.from_quat(orientation[i], scalar_first=True)).as_quat(
        scalar_first=True)
    return new


def slope(energy, step):
    """Derivative at 0 by central differences of fourth order."""
    return (8 * (energy(step) - energy(-step)) - energy(2 * step) + energy(-2 * step)) / 12 / step


def worst_derivative(method, bodies, settings):
    """Largest error of forces and torques on some bodies, relative to their rms."""
    system, position, orientation, box = dense_mixture(electrostatics=method, **settings)
    field = ForceField(system, box)
    found = copied(field.evaluate(position, orientation, box))
    step, force_error, torque_error = 1e-4, 0.0, 0.0

    def moved(i, a, h):
        return position + h * np.outer(np.arange(len(position)) == i, np.eye(3)[a])

    for i in bodies:
        for a in range(3):
            by_place = slope(lambda h, i=i, a=a: field.evaluate(
                moved(i, a, h), orientation, box).energy, step)
            by_angle = slope(lambda h, i=i, a=a: field.evaluate(
                position, rotated(orientation, i, a, h), box).energy, step)
            force_error = max(force_error, abs(found.force[i, a] + by_place))
            torque_error = max(torque_error, abs(found.torque[i, a] + by_angle))
    return force_error / rms(found.force), torque_error / rms(found.torque)


@pytest.mark.parametrize("method", METHODS)
def test_forces_and_torques_are_derivatives_of_the_energy(plain_pairs, method):
    assert max(worst_derivative(method, (0, 31), METHODS[method])) < 1e-6


@pytest.mark.slow
@pytest.mark.parametrize("method", METHODS)
def test_forces_and_torques_are_derivatives_with_the_real_pairs(method, table):
    force, torque = worst_derivative(method, range(0, 32, 3), METHODS[method])
    table(f"{method}: force, torque against finite differences", f"{force:.1e}, {torque:.1e}",
          "1e-6")
    assert max(force, torque) < 1e-6


def virial_error(method, settings):
    """Virial against −dU/dlnλ of boxes with scaled centres, relative."""
    system, position, orientation, box = dense_mixture(electrostatics=method, **settings)
    field = ForceField(system, box)
    found = field.evaluate(position, orientation, box).virial
    expected = -slope(lambda h: field.evaluate(
        position * np.exp(h), orientation, box * np.exp(h)).energy, 1e-4)
    return abs(found / expected - 1)


@pytest.mark.parametrize("method", ["mesh-ewald", "direct-ewald", "damped-shifted"])
def test_virial_is_the_derivative_by_the_volume(plain_pairs, method):
    """In the switched form, where no pair jumps as it passes the cut-off."""
    assert virial_error(method, METHODS[method]) < 1e-6


@pytest.mark.slow
@pytest.mark.parametrize("method", ["mesh-ewald", "direct-ewald", "damped-shifted"])
def test_virial_with_the_real_pairs(method, table):
    error = virial_error(method, METHODS[method])
    table(f"{method}: virial against volume scaling", f"{error:.1e}", "1e-6")
    assert error < 1e-6


@pytest.mark.parametrize("tolerance", [1e-4, 1e-6])
@pytest.mark.parametrize("seed", [7, 8])
def test_mesh_meets_its_tolerance(plain_pairs, table, tolerance, seed):
    """Against the direct sum converged to 1e-11, both of electric forces alone."""
    system, position, orientation, box = dense_mixture(seed=seed, tolerance=tolerance)
    mesh = copied(ForceField(without_lennard_jones(system), box).evaluate(
        position, orientation, box))
    direct = without_lennard_jones(system, electrostatics="direct-ewald", tolerance=1e-12,
                                   splitting=5.2 / 0.6)
    exact = ForceField(direct, box).evaluate(position, orientation, box)
    force = rms(mesh.force - exact.force) / rms(exact.force)
    torque = rms(mesh.torque - exact.torque) / rms(exact.torque)
    table("mesh against direct Ewald: force, torque", f"{force:.2e}, {torque:.2e}", tolerance)
    assert 0.02 * tolerance < force < tolerance
    assert torque < tolerance
    assert mesh.energy == pytest.approx(exact.energy, rel=tolerance)


def test_mixed_precision_of_the_mesh(plain_pairs):
    """Floats on the mesh, double pairs: what the mesh alone adds, at the same settings."""
    system, position, orientation, box = dense_mixture(splitting=5.0, mesh_order=5,
                                                       mesh_spacing=0.05)
    system = without_lennard_jones(system)
    double = ForceField(system, box)
    mixed = ForceField(without_lennard_jones(system, precision="mixed"), box)
    assert (double.reciprocal.dtype, mixed.reciprocal.dtype) == (np.float64, np.float32)
    exact = double.evaluate(position, orientation, box)
    rough = mixed.evaluate(position, orientation, box)
    assert rms(rough.force - exact.force) < 2e-6 * rms(exact.force)
    assert rms(rough.torque - exact.torque) < 2e-6 * rms(exact.torque)


def test_field_of_the_real_pairs_equals_that_of_the_plain_twin(monkeypatch):
    system, position, orientation, box = dense_mixture(splitting=3.4 * 0.9 / 0.6)
    found = copied(ForceField(system, box).evaluate(position, orientation, box))
    monkeypatch.setattr("swirlight.forces.field.PairForces", PlainPairs)
    plain = ForceField(system, box).evaluate(position, orientation, box)
    assert rms(found.force - plain.force) < 1e-10 * rms(plain.force)
    assert rms(found.torque - plain.torque) < 1e-10 * rms(plain.torque)
    assert found.virial == pytest.approx(plain.virial, rel=1e-10)
    for name in TERMS:
        assert found.terms[name] == pytest.approx(plain.terms[name], rel=1e-10, abs=1e-9)


@pytest.mark.slow
@pytest.mark.parametrize("method", METHODS)
def test_mixed_precision_against_double(method, table):
    """To 3e-6 of the rms force and torque, pairs and mesh together, at the same settings."""
    system, position, orientation, box = dense_mixture(electrostatics=method)
    mixed = replace(system, interactions=replace(system.interactions, precision="mixed"))
    exact = copied(ForceField(system, box).evaluate(position, orientation, box))
    rough = ForceField(mixed, box).evaluate(position, orientation, box)
    force = rms(rough.force - exact.force) / rms(exact.force)
    torque = rms(rough.torque - exact.torque) / rms(exact.torque)
    table(f"{method}: mixed against double: force, torque", f"{force:.1e}, {torque:.1e}", "3e-6")
    assert force < 3e-6 and torque < 3e-6


def test_same_bits_for_any_number_of_threads(plain_pairs):
    system, position, orientation, box = dense_mixture()
    results, before = [], numba.get_num_threads()
    for threads in (1, min(2, numba.config.NUMBA_NUM_THREADS)):
        numba.set_num_threads(threads)
        found = ForceField(system, box).evaluate(position, orientation, box)
        results.append((found.force.tobytes(), found.torque.tobytes(), found.energy, found.virial))
    numba.set_num_threads(before)
    assert results[0] == results[1]


def test_the_mesh_does_not_push_the_whole_sample(plain_pairs):
    system, position, orientation, box = dense_mixture(tolerance=1e-3)
    field = ForceField(system, box)
    force = field.evaluate(position, orientation, box).force
    assert np.abs(force.sum(axis=0)).max() < 1e-11 * np.abs(force).sum()
    left = field._push.sum(axis=0)  # what the mesh itself did
    assert np.abs(left).max() > 1e-6 * np.abs(force).max()


def test_bodies_take_only_the_torques_they_can_follow(plain_pairs):
    """An atom none, a linear body none along its axis, whatever the charges do."""
    ion = body("ion", [[0, 0, 0]], [23.0], [1.0], [0.25], [0.3])
    crooked = replace(TWO, sites=TWO.sites + [0.01, 0.0, 0.0])  # charges off the axis
    system = System((ion, crooked, DUMBBELL), (6, 6, 6), Interactions(0.6, precision="double"))
    rng, box = np.random.default_rng(3), np.full(3, 1.4)
    position, orientation = lattice(rng, 18, box, 0.05), turned(rng, 18)
    torque = ForceField(system, box).evaluate(position, orientation, box).torque
    axis = Rotation.from_quat(orientation, scalar_first=True).apply([0.0, 0.0, 1.0])
    assert np.all(torque[:6] == 0.0)
    along = (torque * axis).sum(axis=1)
    assert np.abs(along).max() < 1e-12 * rms(torque)


def test_terms_add_up_and_forces_alone_are_the_same(plain_pairs):
    for method in METHODS:
        system, position, orientation, box = dense_mixture(electrostatics=method)
        field = ForceField(system, box)
        whole = copied(field.evaluate(position, orientation, box))
        assert tuple(whole.terms) == TERMS
        assert whole.energy == pytest.approx(sum(whole.terms.values()), rel=1e-14)
        alone = field.evaluate(position, orientation, box, energies=False)
        assert (alone.energy, alone.terms, alone.virial) == (None, None, None)
        np.testing.assert_allclose(alone.force, whole.force, atol=1e-12 * rms(whole.force))


def test_point_charges_obey_the_virial_theorem(plain_pairs):
    """Coulomb part of point charges: W = U, p V = U/3 (energy homogeneous of degree −1)."""
    plus = body("plus", [[0, 0, 0]], [23.0], [1.0], [0.25], [0.0])
    minus = body("minus", [[0, 0, 0]], [35.0], [-1.0], [0.25], [0.0])
    box = np.array([1.5, 1.4, 1.6])
    rng = np.random.default_rng(5)
    position, orientation = rng.uniform(size=(20, 3)) * box, turned(rng, 20)
    for method, rel in (("direct-ewald", 1e-9), ("mesh-ewald", 1e-6)):
        system = System((plus, minus), (10, 10), Interactions(
            0.65, electrostatics=method, precision="double", tolerance=0.01 * rel))
        found = ForceField(system, box).evaluate(position, orientation, box)
        assert found.virial == pytest.approx(found.energy, rel=rel)


def test_a_box_that_changes_is_followed(plain_pairs):
    """Splitting and mesh stay, everything that depends on the box is made anew, and back."""
    system, position, orientation, box = dense_mixture(tolerance=1e-6)
    field = ForceField(system, box)
    first = field.evaluate(position, orientation, box).energy
    larger = field.evaluate(1.02 * position, orientation, 1.02 * box).energy
    anew = ForceField(replace(system, interactions=replace(
        system.interactions, splitting=field.law.alpha)), 1.02 * box)
    assert larger == pytest.approx(
        anew.evaluate(1.02 * position, orientation, 1.02 * box).energy, rel=1e-6)
    assert field.evaluate(position, orientation, box).energy == first


def test_a_net_charge_is_refused_with_ewald_only():
    box = np.full(3, 2.0)
    for method in METHODS:
        system = System((FIVE, TWO), (3, 2), Interactions(0.9, electrostatics=method))
        if "ewald" in method:
            with pytest.raises(InputError, match=r"neutral box; .* carries \+1 e \(3 five of"):
                ForceField(system, box)
        else:
            ForceField(system, box)


def test_bodies_without_charges_need_no_mesh(plain_pairs):
    argon = body("argon", [[0, 0, 0]], [39.948], [0.0], [0.34], [1.0])
    system = System((argon,), (8,), Interactions(0.5))
    field = ForceField(system, np.full(3, 1.2))
    assert field.reciprocal is None and field.law.kind == "none"


def test_the_mesh_is_that_of_the_settings(plain_pairs):
    system, *_, box = dense_mixture(splitting=4.0, mesh_order=6, mesh_spacing=0.08,
                                    precision="mixed")
    mesh = ForceField(system, box).reciprocal
    assert isinstance(mesh, MeshEwald)
    assert (mesh.alpha, mesh.order, mesh.dtype) == (4.0, 6, np.float32)
    tight = replace(system, interactions=replace(system.interactions, tolerance=1e-6))
    assert ForceField(tight, box).reciprocal.dtype == np.float64


@pytest.mark.parametrize("method", ["mesh-ewald", "direct-ewald"])
def test_a_mesh_part_kept_apart_and_the_rest_make_the_whole(plain_pairs, method):
    system, position, orientation, box = dense_mixture(electrostatics=method, tolerance=1e-6)
    whole = copied(ForceField(system, box).evaluate(position, orientation, box))
    apart = ForceField(replace(system, interactions=replace(system.interactions, mesh_every=2)),
                       box)
    parts = apart.evaluate(position, orientation, box)
    assert (parts.energy, parts.virial, parts.terms) == (whole.energy, whole.virial, whole.terms)
    # rounding only: what is added in which order
    np.testing.assert_allclose(parts.force, whole.force, rtol=0, atol=1e-12 * rms(whole.force))
    np.testing.assert_allclose(parts.torque, whole.torque, rtol=0,
                               atol=1e-12 * rms(whole.torque))
    assert rms(parts.mesh_force) > 1e-3 * rms(whole.force)
    mesh_force, mesh_torque = parts.mesh_force.copy(), parts.mesh_torque.copy()
    without = apart.evaluate(position, orientation, box, energies=False, mesh=False)
    assert without.mesh_force is None and without.energy is None
    np.testing.assert_allclose(without.force + mesh_force, whole.force, rtol=0,
                               atol=1e-12 * rms(whole.force))
    np.testing.assert_allclose(without.torque + mesh_torque, whole.torque, rtol=0,
                               atol=1e-12 * rms(whole.torque))
