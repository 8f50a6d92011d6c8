"""The mesh sum: splines, plain twin, determinism, images, error estimate."""

import numba
import numpy as np
import pytest

from swirlight.forces import accuracy
from swirlight.forces.ewald import DirectEwald
from swirlight.forces.mesh import MeshEwald
from swirlight.forces.splines import (
    ORDERS,
    WIDTH,
    cardinal_spline,
    spline_moduli,
    spline_table,
)
from swirlight.units import COULOMB
from tests.reference.field import rms

BOX = np.array([1.3, 1.5, 1.4])


def charges(count, seed=1, box=BOX):
    """Random neutral charges at random places, some outside the box."""
    rng = np.random.default_rng(seed)
    charge = rng.normal(size=count)
    return charge - charge.mean(), rng.uniform(-2.0, 3.0, (count, 3)) * box


def plain_mesh(charge, place, box, alpha, order, mesh):
    """Slow twin: whole charge density by loops, complex transform, numerical potential.

    Returns the potential on the mesh and the energy; forces follow by finite differences.
    """
    density = np.zeros(mesh)
    for q, x in zip(charge, place, strict=True):
        u = x / box * mesh
        near = [np.arange(int(np.floor(a)) - order + 1, int(np.floor(a)) + 1) for a in u]
        wx, wy, wz = (cardinal_spline(order, a - n) for a, n in zip(u, near, strict=True))
        index = np.ix_(*(n % m for n, m in zip(near, mesh, strict=True)))
        density[index] += q * np.einsum("i,j,k->ijk", wx, wy, wz)
    k2 = sum(np.ix_(*[(2 * np.pi * np.fft.fftfreq(m, 1 / m) / e) ** 2
                      for m, e in zip(mesh, box, strict=True)]))
    k2[0, 0, 0] = 1.0
    green = 4 * np.pi * COULOMB / box.prod() * np.exp(-k2 / 4 / alpha**2) / k2
    green[0, 0, 0] = 0.0
    moduli = np.einsum("i,j,k->ijk", *(spline_moduli(m, order) for m in mesh))
    return float((0.5 * green * moduli * np.abs(np.fft.fftn(density)) ** 2).sum())


@pytest.mark.parametrize("order", ORDERS)
def test_spline_weights_are_cardinal_splines(order):
    table, step = spline_table(order), 1e-6
    for w in (0.0, 0.3, 0.999):
        powers = (w - 0.5) ** np.arange(WIDTH)
        at = w + order - 1 - np.arange(WIDTH)
        slope = (cardinal_spline(order, at + step) - cardinal_spline(order, at - step)) / 2 / step
        np.testing.assert_allclose(powers @ table[:WIDTH], cardinal_spline(order, at), atol=2e-14)
        np.testing.assert_allclose(powers[:-1] @ table[WIDTH:], slope, atol=1e-6)
    assert np.all(table[:, order:] == 0.0)


@pytest.mark.parametrize("order", ORDERS)
def test_energy_equals_the_plain_twin_and_forces_its_slope(order):
    """Odd orders on even meshes too, where a wave has no amplitude."""
    charge, place = charges(9)
    mesh, alpha, step = (12, 10, 15), 3.0, 1e-5
    field, force = MeshEwald(charge, BOX, alpha, order, mesh), np.empty_like(place)
    energy, _ = field.evaluate(place, BOX, force)
    assert energy == pytest.approx(plain_mesh(charge, place, BOX, alpha, order, mesh), rel=1e-12)
    for m, a in ((0, 0), (3, 1), (8, 2)):
        sides = []
        for sign in (1, -1):
            moved = place.copy()
            moved[m, a] += sign * step
            sides.append(plain_mesh(charge, moved, BOX, alpha, order, mesh))
        assert force[m, a] == pytest.approx((sides[1] - sides[0]) / (2 * step), rel=1e-7,
                                            abs=1e-7 * rms(force))


@pytest.mark.parametrize("dtype, floor", [(np.float64, 2e-8), (np.float32, 2e-6)])
def test_mesh_converges_to_the_direct_sum(dtype, floor):
    charge, place = charges(60)
    exact, force = np.empty_like(place), np.empty_like(place)
    energy, virial = DirectEwald(charge, BOX, 4.0, 60.0).evaluate(place, BOX, exact)
    field = MeshEwald(charge, BOX, 4.0, 8, (40, 48, 45), dtype)
    mesh_energy, mesh_virial = field.evaluate(place, BOX, force)
    assert rms(force - exact) < floor * rms(exact)
    assert mesh_energy == pytest.approx(energy, rel=10 * floor)
    assert mesh_virial == pytest.approx(virial, rel=100 * floor)


@pytest.mark.parametrize("order", [4, 5, 6])
@pytest.mark.parametrize("spacing", [0.12, 0.08])
def test_error_estimate(order, spacing):
    """Rms error of 5 draws of 60 random charges against the estimate.

    300 squared force errors, about a third of them independent (few waves carry the error):
    their mean has a standard error near 15 %, its root 8 %. Bounds at five of them.
    """
    mesh, alpha = accuracy.mesh_points(BOX, spacing), 4.0
    ratios = []
    for seed in range(5):
        charge, place = charges(60, seed)
        exact, force = np.empty_like(place), np.empty_like(place)
        DirectEwald(charge, BOX, alpha, 12 * alpha).evaluate(place, BOX, exact)
        MeshEwald(charge, BOX, alpha, order, mesh).evaluate(place, BOX, force)
        pair, own = accuracy.mesh_error(alpha, order, mesh, BOX)
        expected = (charge**2).sum() ** 2 * pair + (charge**4).sum() * own
        ratios.append(((force - exact) ** 2).sum() / COULOMB**2 / expected)
    assert 0.6 < np.sqrt(np.mean(ratios)) < 1.4


def test_error_estimate_of_the_waves_left_out():
    charge, place = charges(200, 3)
    exact, force = np.empty_like(place), np.empty_like(place)
    DirectEwald(charge, BOX, 4.0, 70.0).evaluate(place, BOX, exact)
    DirectEwald(charge, BOX, 4.0, 25.0).evaluate(place, BOX, force)
    expected = COULOMB * (charge**2).sum() * np.sqrt(accuracy.left_out_error(4.0, 25.0, BOX) / 200)
    assert rms(force - exact) == pytest.approx(expected, rel=0.3)  # 600 numbers, 4 sigma: 25 %


def test_same_bits_for_any_number_of_threads():
    charge, place = charges(500)
    results = []
    before = numba.get_num_threads()
    for threads in (1, min(2, numba.config.NUMBA_NUM_THREADS)):
        numba.set_num_threads(threads)
        force = np.empty_like(place)
        sums = MeshEwald(charge, BOX, 4.0, 5, (20, 24, 20), np.float32).evaluate(place, BOX, force)
        results.append((*sums, force.tobytes()))
    numba.set_num_threads(before)
    assert results[0] == results[1]


def test_the_unforced_call_gives_the_same_forces_and_images_do_not_matter():
    charge, place = charges(50)
    field = MeshEwald(charge, BOX, 4.0, 5, (20, 24, 20))
    force, again = np.empty_like(place), np.empty_like(place)
    field.evaluate(place, BOX, force)
    assert field.evaluate(place, BOX, again, energies=False) is None
    np.testing.assert_array_equal(force, again)
    field.evaluate(place + BOX * [3.0, -2.0, 0.0], BOX, again)
    np.testing.assert_allclose(again, force, atol=1e-9 * rms(force))


def test_a_charge_on_the_edge_of_the_box():
    """−1e-17 − floor(−1e-17) rounds to 1: such a charge belongs to the first cell."""
    charge, place = charges(10)
    place[0] = [-1e-17, BOX[1], 0.0]
    field = MeshEwald(charge, BOX, 4.0, 5, (20, 24, 20))
    force, again = np.empty_like(place), np.empty_like(place)
    energy, _ = field.evaluate(place, BOX, force)
    place[0] = 0.0
    assert energy == pytest.approx(field.evaluate(place, BOX, again)[0], rel=1e-13)
    np.testing.assert_allclose(again, force, atol=1e-10 * rms(force))


def test_a_not_a_number_is_seen():
    charge, place = charges(10)
    place[4, 1] = np.nan
    force = np.zeros_like(place)
    energy, _ = MeshEwald(charge, BOX, 4.0, 5, (20, 24, 20)).evaluate(place, BOX, force)
    assert np.isnan(energy) and np.isnan(force).any()


@pytest.mark.parametrize("order, mesh", [(3, (20, 20, 20)), (9, (20, 20, 20)), (5, (20, 6, 20))])
def test_orders_and_meshes_that_cannot_be(order, mesh):
    with pytest.raises(ValueError, match="order|points"):
        MeshEwald(np.ones(2), BOX, 4.0, order, mesh)
