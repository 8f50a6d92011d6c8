"""Pair forces against the same sums written plainly, and against differences of the energy."""

import numpy as np
import pytest

from swirlight.compiled import numba
from swirlight.forces.laws import CoulombLaw
from swirlight.forces.pairs import PairForces

from .plain_pairs import FIVE, ION, SPCE, TWO, WEIGHTED, plain_forces, rotation, sample

EWALD = CoulombLaw("ewald", 0.9, alpha=3.4)
LAWS = {
    "none": CoulombLaw("none", 0.9),
    "ewald": EWALD,
    "conducting reaction field": CoulombLaw("reaction-field", 0.9),
    "reaction field": CoulombLaw("reaction-field", 0.9, epsilon_rf=40.0),
    "damped shifted": CoulombLaw("damped-shifted", 0.9, alpha=2.0),
}


def evaluate(system, law, position, orientation, box, energies=True, **options):
    """Force, torque and sums of a fresh `PairForces`."""
    pairs = PairForces(system, law, box, **options)
    force, torque = np.full((2, system.bodies, 3), np.nan)
    return force, torque, pairs.evaluate(position, orientation, box, force, torque, energies)


def relative(got, expected):
    """rms deviation over rms."""
    return np.sqrt(((got - expected) ** 2).mean() / (expected**2).mean())


def assert_plain(system, law, position, orientation, box, tolerance, energies=True):
    expected = plain_forces(system, law, position, orientation, box)
    force, torque, sums = evaluate(system, law, position, orientation, box, energies)
    assert relative(force, expected[0]) < tolerance
    assert relative(torque, expected[1]) < tolerance
    if energies:
        scale = np.abs(expected[2]).sum()
        assert abs(sums.lennard_jones - expected[2][0]) < tolerance * scale
        assert abs(sums.coulomb - expected[2][1]) < tolerance * scale
        assert np.abs(sums.virial - expected[3]).max() < tolerance * np.abs(expected[3]).max()


@pytest.mark.parametrize("form", ["switched", "force-shifted", "plain", "tail-corrected"])
def test_forms_of_the_lennard_jones_cutoff(form):
    assert_plain(*_with_law(sample([TWO], [90], [1.9, 2.1, 2.0], precision="double",
                                   cutoff_form=form), LAWS["none"]), tolerance=1e-11)


@pytest.mark.parametrize("name", [name for name in LAWS if name != "none"])
def test_coulomb_laws(name):
    assert_plain(*_with_law(sample([TWO], [90], [1.9, 2.1, 2.0], precision="double"), LAWS[name]),
                 tolerance=1e-11)


def _with_law(parts, law):
    system, *where = parts
    return system, law, *where


@pytest.fixture(scope="module")
def mixture():
    """A dense mixture of charged bodies of five and of two sites, with an override."""
    return sample([FIVE, TWO], [48, 60], [2.3, 2.2, 2.4], precision="double",
                  overrides=((("five", "B"), ("two", "A"), 0.29, 0.8),))


def test_dense_mixture(mixture):
    assert_plain(*_with_law(mixture, EWALD), tolerance=1e-11)


def test_dense_mixture_in_mixed_precision(mixture):
    system, *where = mixture
    light, *_ = sample([FIVE, TWO], [48, 60], where[2],
                       overrides=system.interactions.overrides)
    expected = evaluate(system, EWALD, *where)
    force, torque, sums = evaluate(light, EWALD, *where)
    # The rounding of float sums; a position rounded to float would show as 1e-5.
    assert relative(force, expected[0]) < 3e-6
    assert relative(torque, expected[1]) < 3e-6
    energy = abs(expected[2].lennard_jones) + abs(expected[2].coulomb)
    assert abs(sums.lennard_jones - expected[2].lennard_jones) < 2e-6 * energy
    assert abs(sums.coulomb - expected[2].coulomb) < 2e-6 * energy
    assert np.abs(sums.virial - expected[2].virial).max() < 2e-6 * np.abs(expected[2].virial).max()


def turned(orientation, body, axis, angle):
    """The orientations with one body turned about a laboratory axis."""
    w, (x, y, z) = np.cos(angle / 2), np.sin(angle / 2) * axis
    a, b, c, d = orientation[body]
    result = orientation.copy()
    result[body] = [w * a - x * b - y * c - z * d, w * b + x * a + y * d - z * c,
                    w * c - x * d + y * a + z * b, w * d + x * c - y * b + z * a]
    return result


def test_forces_and_torques_are_differences_of_the_energy(mixture):
    system, position, orientation, box = mixture
    force, torque, _ = evaluate(system, EWALD, position, orientation, box)
    pairs = PairForces(system, EWALD, box)
    unused = np.zeros((2, system.bodies, 3))

    def energy(position, orientation):
        sums = pairs.evaluate(position, orientation, box, *unused, energies=True)
        return sums.lennard_jones + sums.coulomb

    step = 1e-5  # nm and rad: truncation and rounding are then both below 1e-7 of the rms
    for body in (0, 31, 50, 107):
        slopes = np.zeros((2, 3))
        for k, axis in enumerate(np.eye(3)):
            for sign in (1, -1):
                moved = position.copy()
                moved[body] += sign * step * axis
                slopes[0, k] -= sign * energy(moved, orientation) / (2 * step)
                slopes[1, k] -= sign * energy(position, turned(orientation, body, axis,
                                                               sign * step)) / (2 * step)
        assert np.abs(slopes[0] - force[body]).max() < 1e-6 * np.sqrt((force**2).mean())
        assert np.abs(slopes[1] - torque[body]).max() < 1e-6 * np.sqrt((torque**2).mean())


def test_virial_is_the_slope_under_scaling_of_the_centres():
    system, position, orientation, box = sample([TWO], [90], [1.9, 2.1, 2.0], precision="double")
    law = LAWS["damped shifted"]  # no force at the cutoff, so no jump of the energy
    virial = evaluate(system, law, position, orientation, box)[2].virial
    step = 1e-5
    for k in range(3):
        slope = 0.0
        for sign in (1, -1):
            scale = np.ones(3)
            scale[k] += sign * step
            sums = evaluate(system, law, position * scale, orientation, box * scale)[2]
            slope -= sign * (sums.lennard_jones + sums.coulomb) / (2 * step)
        assert abs(slope - virial[k]) < 1e-6 * np.abs(virial).max()


def test_energies_do_not_change_the_forces():
    """The two kernels differ in rounding only."""
    system, *where = sample([SPCE], [216], [1.864] * 3, precision="double")
    with_energies = evaluate(system, EWALD, *where)
    without = evaluate(system, EWALD, *where, energies=False)
    assert without[2] is None
    assert relative(without[0], with_energies[0]) < 1e-13
    assert relative(without[1], with_energies[1]) < 1e-13


def test_same_bits_for_any_number_of_threads():
    system, *where = sample([SPCE], [216], [1.864] * 3)
    results = []
    for threads in (1, min(2, numba.config.NUMBA_NUM_THREADS)):
        numba.set_num_threads(threads)
        results.append(evaluate(system, EWALD, *where))
    for one, two in zip(results[0][:2], results[1][:2], strict=True):
        assert np.array_equal(one, two)
    assert np.array_equal(results[0][2].virial, results[1][2].virial)
    assert results[0][2].coulomb == results[1][2].coulomb


def test_ions_and_sites_that_do_nothing():
    """Single charged sites, and bodies of which one site is only a mass."""
    system, *where = sample([ION, WEIGHTED], [30, 40], [1.9, 1.8, 2.0], precision="double")
    assert_plain(system, EWALD, *where, tolerance=1e-11)
    assert (evaluate(system, EWALD, *where)[1][:30] == 0.0).all()


def test_bodies_of_many_sites_are_taken_in_groups(monkeypatch):
    """Two sites a kernel call, on bodies of five."""
    monkeypatch.setattr("swirlight.forces.pairs.GROUP", 2)
    system, *where = sample([FIVE], [30], [1.9, 1.9, 2.0], precision="double")
    assert_plain(system, LAWS["none"], *where, tolerance=1e-11)


def test_bare_dimer_from_the_reaction_field_of_vacuum():
    """With permittivity 1 outside, no more than the constant 1/rc per pair is left of it."""
    system, _, orientation, box = sample([SPCE], [2], [20.0] * 3, precision="double", cutoff=5.0,
                                         cutoff_form="plain")
    position = np.array([[0.1, 0.2, 19.9], [0.35, 0.3, 0.05]])
    law = CoulombLaw("reaction-field", 5.0, epsilon_rf=1.0)
    sums = evaluate(system, law, position, orientation, box)[2]
    places = position[:, None] + np.einsum("nij,sj->nsi", rotation(orientation), SPCE.sites)
    places[1, :, 2] += 20.0
    r = np.linalg.norm(places[0][:, None] - places[1][None], axis=-1)
    q = SPCE.charge
    # 138.935... u nm³/ps²/e² is e²/4πε0, CODATA 2018 (from memory: 138.935458 kJ/mol nm)
    assert sums.coulomb == pytest.approx(138.935458 * (np.outer(q, q) / r).sum(), rel=1e-7)


def test_first_cutoffs_must_agree():
    system, *_, box = sample([TWO], [90], [2.0] * 3)
    with pytest.raises(ValueError, match="cutoff of the interactions"):
        PairForces(system, CoulombLaw("ewald", 1.0, alpha=3.0), box)
