"""The polynomials that stand for erfc, and the constants of the pair laws."""

import mpmath
import numpy as np
import pytest

from swirlight.errors import InputError
from swirlight.forces.laws import CoulombLaw


def exact_smooth_force(alpha, z):
    """[erf(αr) − 2αr exp(−α²r²)/√π]/r³ with 40 digits."""
    with mpmath.workdps(40):
        r = mpmath.sqrt(mpmath.mpf(z))
        a = alpha * r
        return float((mpmath.erf(a) - 2 * a * mpmath.exp(-a * a) / mpmath.sqrt(mpmath.pi)) / r**3)


@pytest.mark.parametrize("z", [1e-8, 1e-4, 0.01, 0.09, 0.81])
def test_smooth_force_without_cancellation(z):
    law = CoulombLaw("ewald", 0.9, alpha=3.5)
    assert law.smooth_force(np.array([z]))[0] == pytest.approx(exact_smooth_force(3.5, z),
                                                               rel=1e-13)


@pytest.mark.parametrize("alpha", [1.0, 3.5, 8.0])
@pytest.mark.parametrize("tolerance", [5e-8, 2e-14])
def test_polynomials_keep_their_tolerance(alpha, tolerance):
    law = CoulombLaw("ewald", 0.9, alpha=alpha)
    force, energy = law.polynomials(tolerance)
    z = np.random.default_rng(1).uniform(1e-6, 0.81, 2000)
    t = 2 * z / 0.81 - 1
    for powers, exact in ((force, law.smooth_force(z)), (energy, law.smooth_energy(z))):
        got = np.polynomial.polynomial.polyval(t, powers)
        # Horner's scheme adds rounding to the fit's own error.
        assert np.abs(got - exact).max() < (tolerance + 1e-14) * 2 * np.abs(powers).sum()


def test_too_sharp_a_splitting_is_refused():
    with pytest.raises(InputError, match="splitting of 60 /nm is too sharp for a cutoff of 0.9 nm"):
        CoulombLaw("ewald", 0.9, alpha=60.0).polynomials(2e-14)


def test_laws_vanish_at_the_cutoff():
    """Energy of the reaction field; energy and force of the damped shifted law."""
    edge = np.array([0.81])
    for law in (CoulombLaw("reaction-field", 0.9, epsilon_rf=30.0),
                CoulombLaw("damped-shifted", 0.9, alpha=2.0)):
        assert abs(1 / 0.9 - law.smooth_energy(edge)[0] + law.force_shift * 0.9) < 1e-14
    assert abs(1 / 0.9**3 - law.smooth_force(edge)[0] - law.force_shift / 0.9) < 1e-14


def test_unknown_law_is_refused():
    with pytest.raises(ValueError, match="known: none, ewald, reaction-field, damped-shifted"):
        CoulombLaw("bare", 0.9)
