"""Recorded totals: definitions by hand, and the units of the file."""

import numpy as np
import pytest
from scipy import constants

from swirlight.light.light import Light
from swirlight.light.pulse import Bias
from swirlight.motion.energy import kinetic_energies
from swirlight.motion.step import Mover
from swirlight.motion.thermostats import make_thermostat
from swirlight.observe.totals import TOTALS, present, sample
from swirlight.rotation import from_vector
from swirlight.units import BOLTZMANN
from tests.motion.bodies import body, response, still, system, thermal
from tests.motion.sources import Springs
from tests.motion.test_light import ANGSTROM3, MIXTURE, PULSES, optical

BIAS = Bias((3.0, -8.0, 20.0))
KJ = constants.atomic_mass * 1e6 * constants.N_A / 1e3  # kJ/mol in 1 u nm²/ps²


def lit_run(steps=500):
    bodies = system(*MIXTURE)
    state = thermal(bodies)
    bath = make_thermostat(bodies, "langevin", friction=1.0)
    mover = Mover(bodies, Springs(bodies), Light(bodies, PULSES, BIAS), 0.002, bath)
    mover.begin(state)
    for _ in range(steps):
        mover.advance(state)
    return bodies, state, mover


def test_every_total_has_its_shape_lit_and_dark():
    _, state, mover = lit_run(3)
    found = sample(mover, state)
    assert list(found) == list(TOTALS)
    dark = Mover(mover.system, None, None, 0.002)
    dark.begin(state)
    unlit = sample(dark, state)
    assert list(unlit) == [name for name, total in TOTALS.items() if not total.lit]
    everything = sample(dark, state, TOTALS.values())
    for values in (found, everything):
        for name, value in values.items():
            assert value.shape == TOTALS[name].shape
            assert np.isfinite(value).all()
    for name in ("light_energy", "light/amplitude", "light/conjugate_product", "light/field"):
        assert not everything[name].any()
    assert len(present(mover)) == len(TOTALS)


def test_units_of_the_file():
    energies = {n for n, t in TOTALS.items() if t.unit == "kJ mol-1"}
    assert energies == {
        "potential_energy", "kinetic_energy_translation", "kinetic_energy_rotation",
        "total_energy", "light_work", "bias_work", "bath_work", "absorbed_energy",
        "energy_residual", "light_energy", "bias_energy"}
    assert all(TOTALS[n].attributes["per"] == "box" for n in energies)
    assert TOTALS["pressure"].unit == "bar"
    assert TOTALS["temperature"].unit == "K"
    assert TOTALS["total_dipole"].unit == "C m"
    assert TOTALS["light/amplitude"].unit == "V m-1"
    for name in ("light_impulse", "total_angular_momentum"):
        assert TOTALS[name].unit == "g mol-1 nm+2 ps-1"


def test_energies_and_temperatures():
    bodies, state, mover = lit_run(50)
    found = sample(mover, state)
    translation, rotation = kinetic_energies(bodies, state)
    potential = Springs(bodies).evaluate(state.position, state.orientation, state.box).energy
    assert found["potential_energy"] == pytest.approx(KJ * potential, rel=1e-12)
    assert found["kinetic_energy_rotation"] == pytest.approx(KJ * rotation, rel=1e-12)
    total = KJ * (translation + rotation + potential)
    assert found["total_energy"] == pytest.approx(total, rel=1e-12)
    # 9 bodies with Langevin on translation: 27 and 3·3 + 3·2 degrees of freedom
    assert found["temperature_translation"] == pytest.approx(2 * translation / 27 / BOLTZMANN)
    assert found["temperature_rotation"] == pytest.approx(2 * rotation / 15 / BOLTZMANN)
    assert found["temperature"] == pytest.approx(
        2 * (translation + rotation) / 42 / BOLTZMANN)


def test_ledgers_close():
    bodies, state, mover = lit_run()
    found = sample(mover, state)
    opening = KJ * mover.ledger.opening_energy
    change = found["total_energy"] - opening
    works = found["light_work"] + found["bias_work"] + found["bath_work"]
    assert change - works == pytest.approx(found["energy_residual"], abs=1e-9)
    assert abs(found["energy_residual"]) < 1e-3 * found["kinetic_energy_rotation"]
    assert found["absorbed_energy"] > 0
    impulses = sum(found[f"{s}_impulse"] for s in ("pair", "light", "bias", "bath"))
    start = thermal(bodies).angular_momentum.sum(axis=0)
    assert np.allclose(found["total_angular_momentum"] - start, impulses, atol=1e-11)


def test_pressure_of_an_ideal_gas_and_of_a_virial():
    bodies = system((body((0, 0, 0), mass=40.0), 50))
    state = thermal(bodies)
    mover = Mover(bodies, None, None, 0.002)
    mover.begin(state)
    found = sample(mover, state)
    # N k T/V with V = 125 nm³, in SI and from the measured temperature
    ideal = 50 * constants.k * float(found["temperature"]) / 125e-27 / 1e5
    assert found["pressure"] == pytest.approx(ideal, rel=1e-8)
    springs = Springs(bodies)
    forces = springs.evaluate(state.position, state.orientation, state.box)
    forces.virial = 600.0
    springs.evaluate = lambda *_: forces
    mover = Mover(bodies, springs, None, 0.002)
    mover.begin(state)
    joules = 600.0 * constants.atomic_mass * 1e6
    added = joules / 3 / 125e-27 / 1e5
    assert sample(mover, state)["pressure"] == pytest.approx(ideal + added, rel=1e-8)


def test_dipole_of_the_box_counts_charges_and_rectification():
    kappa = 1e-3 * np.eye(3)
    chiral = body((0.1, 0.2, 0.28), dipole=(0, 0, 0.05),
                  response=response(absorptive=ANGSTROM3, rectification=kappa))
    ions = [(body((0, 0, 0), charge=q), 1) for q in (1.0, -1.0)]
    bodies = system((chiral, 1), *ions)
    state = still(bodies)
    state.position[1] = 7.0, 0, 0  # beyond the box: unwrapped positions count
    state.position[2] = 1.0, 0, 0
    pulse = optical(3e12, ellipticity=np.pi / 4)
    mover = Mover(bodies, None, Light(bodies, (pulse,)), 0.25)
    mover.begin(state, 0.75)
    unit = constants.e * 1e-9
    conjugate = np.array([0, 0, pulse.amplitude**2])  # s3 |𝓔|² k̂ at the peak
    expected = np.array([6.0, 0, 0.05]) + kappa @ conjugate
    assert np.allclose(sample(mover, state)["total_dipole"], unit * expected, rtol=1e-12)


def test_light_at_its_peak():
    """1 W/cm² of linear light has |𝓔| = 27.449 V/cm (I = ½ε0c|𝓔|²)."""
    bodies = system(*MIXTURE[:1])
    state = thermal(bodies)
    mover = Mover(bodies, None, Light(bodies, (optical(1e12, ellipticity=0.0, azimuth=0.0),)), 0.25)
    mover.begin(state, 0.75)
    found = sample(mover, state)
    peak = np.sqrt(2e16 / (constants.epsilon_0 * constants.c))
    assert peak == pytest.approx(2744.9e6, rel=1e-4)
    assert np.allclose(found["light/amplitude"], [[peak, 0], [0, 0], [0, 0]], rtol=1e-9)
    assert not found["light/conjugate_product"].any()
    circular = Mover(bodies, None, Light(bodies, (optical(1e12, ellipticity=-np.pi / 4),)), 0.25)
    circular.begin(state, 0.75)
    product = sample(circular, state)["light/conjugate_product"]
    assert np.allclose(product, [0, 0, -(peak**2)], rtol=1e-9, atol=1e-6 * peak**2)


def test_alignment_refers_to_the_beam():
    bodies = system((body((0.1, 0.2, 0.28)), 1), (body((0.3, 0.3, 0)), 1), (body((0, 0, 0)), 3))
    state = still(bodies)
    state.orientation[1] = from_vector(np.array([np.pi / 2, 0, 0]))  # body z along −y
    mover = Mover(bodies, None, None, 0.002)
    mover.begin(state)
    along_z = sample(mover, state)
    assert along_z["alignment"] == pytest.approx((1 - 0.5) / 2)
    assert along_z["orientation_along_beam"] == pytest.approx(0.5)
    along_y = sample(mover, state, beam=(0, 1, 0))
    assert along_y["orientation_along_beam"] == pytest.approx(-0.5)
