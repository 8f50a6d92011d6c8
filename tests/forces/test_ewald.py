"""The direct sum over waves, against plain loops and against the whole plain Ewald sum."""

import numba
import numpy as np
import pytest

from swirlight.forces.ewald import DirectEwald, half_space
from swirlight.forces.field import ForceField
from swirlight.units import COULOMB
from tests.forces.test_mesh import BOX, charges
from tests.reference.field import copied, rms, without_lennard_jones
from tests.reference.plain import ewald_sum
from tests.reference.samples import dense_mixture


def test_half_space_holds_one_of_each_pair():
    unit, radius = 2 * np.pi / BOX, 20.0
    column, top, kept = half_space(radius, unit)
    waves = {(int(c[0]), int(c[1]), int(n) - int(top[2]))
             for c, row in zip(column, kept, strict=True) for n in np.flatnonzero(row)}
    whole = np.stack(np.meshgrid(*[np.arange(-8, 9)] * 3, indexing="ij"), -1).reshape(-1, 3)
    length = np.linalg.norm(whole * unit, axis=1)
    expected = {tuple(map(int, n)) for n in whole[(length > 0) & (length <= radius)]}
    assert waves | {(-a, -b, -c) for a, b, c in waves} == expected
    assert 2 * len(waves) == len(expected)


def test_sum_over_waves_equals_plain_loops():
    charge, place = charges(20)
    alpha, radius = 4.0, 30.0
    force = np.empty_like(place)
    energy, virial = DirectEwald(charge, BOX, alpha, radius).evaluate(place, BOX, force)
    expected_energy, expected_virial, expected = 0.0, 0.0, np.zeros_like(place)
    for n in np.ndindex(17, 17, 17):
        k = 2 * np.pi * (np.array(n) - 8) / BOX
        k2 = k @ k
        if not 0 < k2 <= radius**2:
            continue
        g = 2 * np.pi * COULOMB / BOX.prod() * np.exp(-k2 / 4 / alpha**2) / k2
        wave = np.exp(1j * place @ k)
        total = (charge * wave).sum()
        expected_energy += g * abs(total) ** 2
        expected_virial += g * abs(total) ** 2 * (1 - k2 / 2 / alpha**2)
        expected += 2 * g * np.outer(charge * np.imag(wave * total.conjugate()), k)
    assert energy == pytest.approx(expected_energy, rel=1e-12)
    assert virial == pytest.approx(expected_virial, rel=1e-11)
    np.testing.assert_allclose(force, expected, atol=1e-12 * rms(expected))


def test_same_bits_for_any_number_of_threads():
    charge, place = charges(100)
    results = []
    before = numba.get_num_threads()
    for threads in (1, min(2, numba.config.NUMBA_NUM_THREADS)):
        numba.set_num_threads(threads)
        force = np.empty_like(place)
        sums = DirectEwald(charge, BOX, 4.0, 30.0).evaluate(place, BOX, force)
        results.append((*sums, force.tobytes()))
    numba.set_num_threads(before)
    assert results[0] == results[1]


def compare_with_plain_ewald(count, cutoff, splittings, table):
    """Energy, force, torque, virial to 1e-9 against plain Python at other splittings."""
    system, position, orientation, box = dense_mixture(
        count, electrostatics="direct-ewald", tolerance=1e-13, cutoff=cutoff,
        splitting=5.2 / cutoff)
    system = without_lennard_jones(system)
    forces = copied(ForceField(system, box).evaluate(position, orientation, box))
    for alpha in splittings:
        plain = ewald_sum(system, position, orientation, box, alpha)
        worst = {
            "energy": abs(forces.energy / plain["energy"] - 1),
            "virial": abs(forces.virial / plain["virial"] - 1),
            "force": np.abs(forces.force - plain["force"]).max() / rms(plain["force"]),
            "torque": np.abs(forces.torque - plain["torque"]).max() / rms(plain["torque"]),
        }
        for what, error in worst.items():
            table(f"direct Ewald against plain Python, α = {alpha:g}/nm: {what}", f"{error:.1e}",
                  "1e-9")
        assert max(worst.values()) < 1e-9


def test_whole_sum_equals_an_independent_one(plain_pairs, table):
    compare_with_plain_ewald(4, 0.45, (5.0,), table)


@pytest.mark.slow
def test_whole_sum_with_the_real_pairs_equals_an_independent_one(table):
    compare_with_plain_ewald(12, 0.65, (5.0, 7.0), table)
