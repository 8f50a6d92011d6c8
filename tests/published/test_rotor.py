"""The torque-free asymmetric top against Jacobi elliptic functions and independent tables."""

import numpy as np
import pytest
from scipy.special import ellipj

from swirlight import rotation
from swirlight.motion.energy import angular_velocity
from swirlight.motion.kernels import drift
from swirlight.motion.rotor import rotor_kinds
from tests.motion.bodies import body, still, system

pytestmark = pytest.mark.published

# I = (1, 2, 3), R(0) = 1. Body-frame ω and R at t = 10, computed with mpmath.odefun (Taylor
# series, 30 digits) from Euler's equations and dR/dt = R skew(ω); the Jacobi closed form for ω
# agrees to 16 digits.
TABLES = {
    "about the long axis": (
        [1.0, 1.0, 1.0],
        [-0.603470423092518, -1.27899313854787, 0.887726788215733],
        [[-0.374490263898062, -0.796613129614899, -0.474515082974941],
         [0.734463248324407, -0.567216853947408, 0.372597339575533],
         [-0.56596888528109, -0.208979813195343, 0.797500256157024]],
    ),
    "near the unstable axis": (
        [0.01, 1.0, 0.02],
        [-0.803664518877521, -0.595166649853101, 0.464390876633983],
        [[-0.883161454853947, 0.0409707258502003, -0.467276411006983],
         [-0.389578800569372, -0.618903437969004, 0.682046107398229],
         [-0.26125505317063, 0.784397816221753, 0.562552986925993]],
    ),
}
INERTIA = np.array([1.0, 2.0, 3.0])


def rotate(omega, time, steps):
    """The state after free rotation from R = 1, and its body-frame angular velocity."""
    bodies = system((body(INERTIA), 1))
    state = still(bodies)
    state.angular_momentum[0] = INERTIA * omega
    kinds = rotor_kinds(bodies.inertia)
    for _ in range(steps):
        drift(state, bodies, kinds, time / steps)
    omega = rotation.to_body(state.orientation, angular_velocity(bodies, state))[0]
    return rotation.rotation_matrix(state.orientation[0]), omega


@pytest.mark.parametrize("case", TABLES)
def test_asymmetric_top_tables_and_second_order(case):
    start, omega_end, matrix_end = TABLES[case]
    errors = []
    for steps in (2000, 4000, 8000):
        matrix, omega = rotate(start, 10.0, steps)
        errors.append(max(np.abs(matrix - matrix_end).max(), np.abs(omega - omega_end).max()))
    assert errors[-1] < 2e-5
    # second order: halving the step quarters the error
    assert errors[0] / errors[1] == pytest.approx(4, rel=0.02)
    assert errors[1] / errors[2] == pytest.approx(4, rel=0.02)
    # what is left after Richardson's extrapolation is fourth order
    fine, omega_fine = rotate(start, 10.0, 8000)
    coarse, omega_coarse = rotate(start, 10.0, 4000)
    assert np.abs(fine + (fine - coarse) / 3 - matrix_end).max() < 2e-9
    assert np.abs(omega_fine + (omega_fine - omega_coarse) / 3 - omega_end).max() < 2e-9


def test_asymmetric_top_against_elliptic_functions():
    """Landau & Lifshitz, Mechanics, §37 (from memory), for L² > 2 E I₂.

    ω₁ = a cn τ, ω₂ = b sn τ, ω₃ = c dn τ from the instant at which ω₂ = 0, up to the senses
    of the axes, which Euler's equations fix.
    """
    one, two, three = INERTIA
    omega0 = np.array([0.6, 0.0, 1.1])
    energy2 = INERTIA @ omega0**2
    square = (INERTIA**2) @ omega0**2
    assert square > energy2 * two
    a = np.sqrt((energy2 * three - square) / (one * (three - one)))
    b = np.sqrt((energy2 * three - square) / (two * (three - two)))
    c = np.sqrt((square - energy2 * one) / (three * (three - one)))
    rate = np.sqrt((three - two) * (square - energy2 * one) / (one * two * three))
    m = (two - one) * (energy2 * three - square) / ((three - two) * (square - energy2 * one))
    for time in (0.7, 3.0, 11.0):
        sn, cn, dn, _ = ellipj(rate * time, m)
        # I₂ dω₂/dt = (I₃ − I₁) ω₃ω₁ > 0 at the start
        expected = np.array([a * cn, b * sn, c * dn])
        _, omega = rotate(omega0, time, 4000)
        assert np.abs(omega - expected).max() < 2e-5
        _, finer = rotate(omega0, time, 8000)
        assert np.abs(finer + (finer - omega) / 3 - expected).max() < 1e-9
