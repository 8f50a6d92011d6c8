"""Tails and constants against closed forms and quadrature."""

import numpy as np
import pytest
from scipy.integrate import quad
from scipy.special import erf, erfc

from swirlight.forces import corrections
from swirlight.forces.laws import CoulombLaw
from swirlight.system import Interactions, System
from swirlight.units import COULOMB
from tests.forces.plain_pairs import lennard_jones
from tests.reference.samples import DUMBBELL, FIVE, TWO

BOX = np.array([2.0, 2.2, 2.5])


def mixture(form, cutoff=0.9):
    return System((FIVE, TWO, DUMBBELL), (7, 7, 20), Interactions(cutoff, cutoff_form=form))


def slow_tail(system, box, missing):
    """2π/V Σ over all ordered pairs of sites of ∫ missing(σ, ε, r) r² dr, quadrature by pair."""
    sigma, epsilon = system.lennard_jones
    number = [np.sum(system.type_of_site == t) for t in range(len(sigma))]
    rc, total = system.interactions.cutoff, 0.0
    for a in range(len(sigma)):
        for b in range(len(sigma)):
            def pair(r, s=sigma[a, b], e=epsilon[a, b]):
                return missing(s, e, r) * r**2

            integral = sum(quad(pair, low, high, epsabs=0, epsrel=1e-11)[0]
                           for low, high in ((0.9 * rc, rc), (rc, 5 * rc), (5 * rc, np.inf)))
            total += number[a] * number[b] * integral
    return 2 * np.pi / np.prod(box) * total


def test_tail_of_the_switched_form_is_what_the_switch_takes_away():
    system = mixture("switched")
    rc = system.interactions.cutoff

    def missing(sigma, epsilon, r):
        whole, used = (lennard_jones(r, sigma, epsilon, form, rc)[0]
                       for form in ("plain", "switched"))
        return whole - used * (r < rc)

    assert corrections.tail_energy(system, BOX) == pytest.approx(
        slow_tail(system, BOX, missing), rel=1e-9)


def test_tail_of_the_plain_cut():
    system = mixture("tail-corrected")
    rc = system.interactions.cutoff

    def missing(sigma, epsilon, r):
        return lennard_jones(r, sigma, epsilon, "plain", rc)[0] * (r >= rc)

    assert corrections.tail_energy(system, BOX) == pytest.approx(
        slow_tail(system, BOX, missing), rel=1e-9)


def test_pressure_of_the_switched_tail_is_density_times_energy_per_body():
    """p_tail = ρ U_tail/N, and the virial is the derivative by the volume."""
    system, step = mixture("switched"), 1e-5
    energy, virial = corrections.tail_energy(system, BOX), corrections.tail_virial(system, BOX)
    volume, bodies = BOX.prod(), system.bodies
    pressure = virial / (3 * volume)
    assert pressure == pytest.approx(bodies / volume * energy / bodies, rel=1e-14)
    up, down = (corrections.tail_energy(system, BOX * (1 + s)) for s in (step, -step))
    assert virial == pytest.approx((down - up) / np.log((1 + step) / (1 - step)), rel=1e-8)


def test_pressure_of_the_tail_correction_is_the_integral_of_the_force():
    system = mixture("tail-corrected")
    rc, volume = system.interactions.cutoff, BOX.prod()

    def minus_r_slope(sigma, epsilon, r):
        return r * lennard_jones(r, sigma, epsilon, "plain", rc)[1] * (r >= rc)

    # p V = −(1/3)(2π/V) Σ ∫ r u′ r² dr, and W = 3 p V
    assert corrections.tail_virial(system, BOX) == pytest.approx(
        slow_tail(system, BOX, minus_r_slope), rel=1e-9)
    assert corrections.tail_virial(system, BOX) / (3 * volume) == pytest.approx(
        corrections.tail_energy(system, BOX) / volume
        + corrections.impulsive_pressure(system, BOX), rel=1e-14)


@pytest.mark.parametrize("form", ["plain", "force-shifted"])
def test_no_tail_for_forms_that_are_whole_as_they_are(form):
    system = mixture(form)
    assert corrections.tail_energy(system, BOX) == 0.0
    assert corrections.tail_virial(system, BOX) == 0.0


def slow_intramolecular(system, added):
    total = 0.0
    for species, count in zip(system.species, system.counts, strict=True):
        for a in range(len(species.charge)):
            for b in range(a):
                r = np.linalg.norm(species.sites[a] - species.sites[b])
                total += count * COULOMB * species.charge[a] * species.charge[b] * added(r)
    return total


def test_ewald_constants():
    system, law = mixture("switched"), CoulombLaw("ewald", 0.9, alpha=3.3)
    squares = (system.site_charge**2).sum()
    assert corrections.self_energy(system, law) == pytest.approx(
        -3.3 / np.sqrt(np.pi) * COULOMB * squares, rel=1e-14)
    assert corrections.intramolecular_energy(system, law) == pytest.approx(
        slow_intramolecular(system, lambda r: -erf(3.3 * r) / r), rel=1e-12)


@pytest.mark.parametrize("permittivity", [1.0, 4.0, np.inf])
def test_reaction_field_constants_of_a_neutral_body_are_those_of_its_dipole(permittivity):
    """−k μ², k = (ε − 1)/(2ε + 1)/rc³: a dipole in the field it makes itself (Onsager 1936)."""
    system = System((DUMBBELL,), (5,), Interactions(0.9))
    law = CoulombLaw("reaction-field", 0.9, epsilon_rf=permittivity)
    ratio = 0.5 if np.isinf(permittivity) else (permittivity - 1) / (2 * permittivity + 1)
    whole = (corrections.self_energy(system, law)
             + corrections.intramolecular_energy(system, law))
    expected = -5 * COULOMB * ratio / 0.9**3 * (DUMBBELL.dipole**2).sum()
    assert whole == pytest.approx(expected, rel=1e-12, abs=1e-12)


def test_damped_shifted_constants():
    system, law = mixture("switched"), CoulombLaw("damped-shifted", 0.9, alpha=2.0)
    edge = erfc(1.8) / 0.9
    slope = edge / 0.9 + 4.0 / np.sqrt(np.pi) * np.exp(-1.8**2) / 0.9
    assert corrections.self_energy(system, law) == pytest.approx(
        -COULOMB * (0.5 * edge + 2.0 / np.sqrt(np.pi)) * (system.site_charge**2).sum(), rel=1e-14)
    assert corrections.intramolecular_energy(system, law) == pytest.approx(
        slow_intramolecular(
            system, lambda r: erfc(2 * r) / r - 1 / r - edge + slope * (r - 0.9)), rel=1e-12)


def test_no_constants_without_charges():
    system, law = mixture("switched"), CoulombLaw("none", 0.9)
    assert corrections.self_energy(system, law) == 0.0
    assert corrections.intramolecular_energy(system, law) == 0.0
