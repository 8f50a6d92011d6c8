"""Pure figures of the plan against numbers worked by hand."""

import numpy as np
import pytest

from swirlight.run.plan.figures import (
    absorbed_spin,
    kinetic_heat_capacity,
    photon_over_kt,
    quantum_rotation,
    rotation_periods,
)
from swirlight.run.plan.light import deciding
from swirlight.run.plan.sample import smallest_count


def test_thermal_periods_of_nitrogen():
    # 2π√(I/kT) in SI: two masses of 14.007 u, 0.1098 nm apart, at 77 K
    inertia = 0.5 * 14.007 * 0.1098**2
    seconds = 2 * np.pi * np.sqrt(inertia * 1.66053906892e-27 * 1e-18 / (1.380649e-23 * 77.0))
    got = rotation_periods([inertia, inertia, 0.0], 77.0)
    np.testing.assert_allclose(got, [seconds * 1e12, seconds * 1e12, 0.0], rtol=1e-9)


def test_quantum_rotation_is_rotational_constant_over_kt():
    # ħ²/2I = hcB; B of N2 1.99 1/cm (from memory) and kT at 300 K 208.51 1/cm
    inertia = 1.054571817e-34 / (4 * np.pi * 2.99792458e10 * 1.99) / (1.66053906892e-27 * 1e-18)
    got = quantum_rotation([inertia, inertia, 0.0], 300.0)
    np.testing.assert_allclose(got, [1.99 / 208.5104401] * 2 + [0.0], rtol=1e-6)


def test_photon_over_kt():
    # kT/h at 300 K is 6.250985737 THz
    assert photon_over_kt(2 * np.pi * 6.250985737, 300.0) == pytest.approx(1.0, rel=1e-8)


@pytest.mark.parametrize(("freedom", "joules"), [(0, 12.4717), (2, 20.7862), (3, 24.9434)])
def test_kinetic_heat_capacity(freedom, joules):
    # (3 + f) R/2
    assert kinetic_heat_capacity(freedom) * 1e3 == pytest.approx(joules, rel=1e-5)


def test_absorbed_spin_of_each_kind_of_body():
    a = np.diag([1.0, 1.0, 4.0])
    assert absorbed_spin(a, 3, 1.0, 6.0) == pytest.approx(6.0)  # Tr/6 of the dose
    assert absorbed_spin(a, 2, 1.0, 6.0) == pytest.approx(5.0)  # (α∥ + α⊥)/6
    assert absorbed_spin(a, 0, 1.0, 6.0) == 0.0
    assert absorbed_spin(np.eye(3), 2, -1.0, 6.0) == pytest.approx(-2.0)  # ⅔ of 3


def test_smallest_count_is_just_enough():
    box, cutoff, bodies = np.array([3.0, 4.0, 5.0]), 1.2, 500
    least = smallest_count(bodies, box, cutoff)
    edge = lambda n: box.min() * (n / bodies) ** (1 / 3)  # noqa: E731
    assert edge(least) >= 2 * cutoff > edge(least - 1)
    assert smallest_count(500, box, 1.5) == 500


def test_deciding_figure():
    class Averaged:
        coupling = "averaged"

        class envelope:
            duration = 1.0

    class Resolved(Averaged):
        coupling = "resolved"

    figures = {
        name: (v, "") for name, v in {
            "alignment well": 0.5, "gyration well": 0.1, "alignment impulse": 0.2,
            "gyration impulse": 0.3, "absorption impulse": 0.05, "dipole energy": 4.0,
            "dipole impulse": 0.9,
        }.items()
    }
    assert deciding(Averaged, figures, rotation_period=2.0) == ("gyration impulse", 0.3)
    assert deciding(Averaged, figures, rotation_period=0.5) == ("alignment well", 0.5)
    assert deciding(Resolved, figures, rotation_period=2.0) == ("dipole impulse", 0.9)
    figures["dipole energy"] = (0.4, "kT")
    assert deciding(Resolved, figures, rotation_period=2.0) == ("dipole energy", 0.4)
