"""What the choice of splitting, waves and mesh promises."""

import subprocess
import sys
from dataclasses import replace

import pytest

from swirlight.forces import accuracy
from swirlight.forces.field import ForceField
from tests.reference.field import copied, rms, without_lennard_jones
from tests.reference.samples import dense_mixture


def test_typical_force_is_that_of_a_dense_sample(plain_pairs):
    """Not a bound, but the scale of the tolerance: within a factor 2 of the true rms force."""
    system, position, orientation, box = dense_mixture(electrostatics="direct-ewald",
                                                       tolerance=1e-6)
    bare = without_lennard_jones(system)
    force = ForceField(bare, box).evaluate(position, orientation, box).force
    assert 0.5 < accuracy.typical_force(system, box) / rms(force) < 2.0


@pytest.mark.parametrize("tolerance", [1e-3, 1e-5])
def test_real_space_error(plain_pairs, tolerance):
    """The direct sum at the chosen splitting against the same at a twice sharper one."""
    system, position, orientation, box = dense_mixture(electrostatics="direct-ewald",
                                                       tolerance=tolerance, cutoff=0.75)
    system = without_lennard_jones(system)
    rough = copied(ForceField(system, box).evaluate(position, orientation, box))
    finer = without_lennard_jones(system, tolerance=1e-12)
    exact = ForceField(finer, box).evaluate(position, orientation, box)
    assert 0.02 * tolerance < rms(rough.force - exact.force) / rms(exact.force) < tolerance
    assert rms(rough.torque - exact.torque) / rms(exact.torque) < tolerance


def test_choice_of_mesh_meets_its_share_and_a_coarser_one_does_not():
    system, *_, box = dense_mixture(tolerance=1e-4)
    alpha = accuracy.splitting(system, box)
    order, mesh = accuracy.choose_mesh(system, box, alpha)

    def error(points):
        return accuracy.body_error(system, *accuracy.mesh_error(alpha, order, points, box))

    assert error(mesh) <= accuracy.allowed_error(system, box)
    assert error(tuple(int(0.8 * n) for n in mesh)) > accuracy.allowed_error(system, box)


def test_orders_and_spacings_asked_for_are_kept():
    system, *_, box = dense_mixture(mesh_order=6, mesh_spacing=0.05)
    assert accuracy.choose_mesh(system, box, 5.0) == (6, accuracy.mesh_points(box, 0.05))
    assert all(e / n <= 0.05 for e, n in zip(box, accuracy.mesh_points(box, 0.05), strict=True))
    fixed = replace(system, interactions=replace(system.interactions, mesh_spacing=None))
    assert accuracy.choose_mesh(fixed, box, 5.0)[0] == 6


def test_a_dilute_sample_is_not_asked_for_more_than_a_dense_one():
    """Bodies at contact set the scale: a gas may have a coarser splitting, hardly a finer one."""
    dense, *_, box = dense_mixture()
    assert accuracy.splitting(dense, 4 * box) < 1.15 * accuracy.splitting(dense, box)


def test_choosing_needs_no_compiler():
    """`swirlight check` prints splitting and mesh and must not wait for numba."""
    code = "import sys, swirlight.forces.accuracy; sys.exit('numba' in sys.modules)"
    assert subprocess.run([sys.executable, "-c", code], timeout=60).returncode == 0
