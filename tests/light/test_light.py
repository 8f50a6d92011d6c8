"""Torques, powers and energies of bodies in light, against plain twins and identities."""

from math import pi

import numpy as np
import pytest

from swirlight.light.envelope import Gaussian, Rectangle
from swirlight.light.exposure import mirrored
from swirlight.light.light import Light
from swirlight.light.pulse import Bias, Pulse
from swirlight.light.regime import rotation_rate
from swirlight.species.body import ATOM, GENERAL, LINEAR
from tests.light.bodies import (
    complex_polarizability,
    isotropic,
    matrix,
    orientations,
    response,
    sample,
    species,
    turned,
    twin_averaged,
    twin_resolved,
)

FAST, SLOW = 2000.0, 2 * pi
FREE = {GENERAL: (1, 1, 1), LINEAR: (1, 1, 0), ATOM: (0, 0, 0)}
STEADY = Rectangle(10.0)


def pulse(**parts):
    given = {"carrier": FAST, "amplitude": 3.0, "envelope": STEADY, "centre": 5.0}
    return Pulse(**{**given, **parts})


def terahertz(**parts):
    return pulse(**{"carrier": SLOW, "coupling": "resolved", "envelope": Gaussian(2.0), **parts})


def lit(system, pulses, time, bias=None, q=None):
    """(LightLoad, LightEnergies, orientations) at one time."""
    light = Light(system, pulses, bias)
    q = orientations(system.bodies) if q is None else q
    block = light.schedule(np.array([time]))
    return (light.apply(block, 0, q),
            light.energies(block, 0, q, np.zeros((system.bodies, 3))), q)


def bodies_of(system):
    return [(i, system.species[k]) for i, k in enumerate(system.species_of)]


MIXTURE = sample(
    species(response(1)), species(response(2), name="rod", freedom=LINEAR),
    species(response(3), name="atom", freedom=ATOM), species(name="unlit"), count=3)
POLARISATIONS = [(pi / 4, "z"), (-0.3, "z"), (0.0, "z"), (0.4, "skew")]


def direction(name):
    return (0.48, -0.64, 0.6) if name == "skew" else (0.0, 0.0, 1.0)


@pytest.mark.parametrize(("chi", "beam"), POLARISATIONS)
def test_averaged_kernel_against_the_complex_polarizability(chi, beam):
    p = pulse(ellipticity=chi, azimuth=0.4, direction=direction(beam))
    load, sums, q = lit(MIXTURE, (p,), 4.0)
    amplitude, power, energy = p.amplitude_at(np.array([-1.0]))[0], 0.0, 0.0
    for i, kind in bodies_of(MIXTURE):
        if not kind.responses:
            np.testing.assert_array_equal(load.torque[i], 0.0)
            continue
        torque, absorbed, stored = twin_averaged(q[i], kind.responses[0], amplitude, FAST,
                                                 FREE[kind.freedom])
        np.testing.assert_allclose(load.torque[i], torque, atol=1e-12)
        power, energy = power + absorbed, energy + stored
    assert load.absorbed_power == pytest.approx(power, rel=1e-12)
    assert sums.absorbed_power == load.absorbed_power
    assert sums.light_energy == pytest.approx(energy, rel=1e-12)
    assert load.force is None and load.bias_torque is None


def test_several_colours_add_torques_and_powers():
    pulses = (pulse(), pulse(carrier=2 * FAST, ellipticity=-0.3, amplitude=2.0),
              pulse(carrier=2 * FAST + 1.0, ellipticity=0.1, centre=5.5))
    together, sums, _ = lit(MIXTURE, pulses, 5.1)
    parts = [lit(MIXTURE, part, 5.1) for part in (pulses[:1], pulses[1:])]
    np.testing.assert_allclose(together.torque, parts[0][0].torque + parts[1][0].torque,
                               atol=1e-12)
    assert together.absorbed_power == pytest.approx(
        sum(p[0].absorbed_power for p in parts), rel=1e-12)
    assert sums.light_energy == pytest.approx(sum(p[1].light_energy for p in parts), rel=1e-12)


def test_quadrature_over_an_optical_cycle():
    """⟨p×E⟩ and ⟨E·ṗ⟩ with p(t) = Re[α𝓔e^{−iωt}] over one cycle, by the trapezium rule."""
    p = pulse(ellipticity=0.3, azimuth=0.7, direction=(0.48, -0.64, 0.6))
    system = sample(species(response(4)), count=4)
    load, _, q = lit(system, (p,), 5.0)
    phase = np.arange(64) * 2 * pi / 64
    power = 0.0
    for i in range(4):
        r = matrix(q[i])
        alpha = r @ complex_polarizability(system.species[0].responses[0]) @ r.T
        wave = np.exp(-1j * phase)[:, None] * p.amplitude_at(np.array([0.0]))
        dipole, field, rate = (wave @ alpha.T).real, wave.real, (-1j * FAST * wave @ alpha.T).real
        np.testing.assert_allclose(load.torque[i], np.cross(dipole, field).mean(axis=0),
                                   atol=1e-12)
        power += (field * rate).sum(axis=1).mean()
    assert load.absorbed_power == pytest.approx(power, rel=1e-12)


def difference_torque(system, pulses, time, q, bias=None, which="light_energy"):
    """−∂U/∂(rotation of every body about lab axis a), summed over bodies."""
    step = 1e-5
    out = np.zeros(3)
    for axis in range(3):
        energy = [getattr(lit(system, pulses, time, bias, turned(q, s * step * np.eye(3)[axis]))[1],
                          which) for s in (1, -1)]
        out[axis] = -(energy[0] - energy[1]) / (2 * step)
    return out


@pytest.mark.parametrize("kappa", [False, True])
def test_conservative_torques_are_slopes_of_the_reported_energy(kappa):
    system = sample(species(response(5, absorption=False, kappa=kappa)),
                    species(response(5, absorption=False, gyration=False), freedom=LINEAR,
                            name="rod"), count=1)
    rod = system.species[1].responses[0]
    rod.polarizability[:] = np.diag([1.0, 1.0, 4.0])  # axially symmetric, as a rod's must be
    p = pulse(ellipticity=0.3, azimuth=0.2)
    load, _, q = lit(system, (p,), 5.0)
    np.testing.assert_allclose(load.torque.sum(axis=0), difference_torque(system, (p,), 5.0, q),
                               rtol=1e-7, atol=1e-7)
    wave = terahertz()
    system = sample(species(response(5, absorption=False, gyration=False)), count=1)
    load, _, q = lit(system, (wave,), 4.8)
    np.testing.assert_allclose(load.torque.sum(axis=0), difference_torque(system, (wave,), 4.8, q),
                               rtol=1e-7, atol=1e-7)


def test_polarizability_and_gyration_do_not_spin_a_body_in_circular_light():
    for beam in ("z", "skew"):
        p = pulse(direction=direction(beam))
        system = sample(species(response(6, absorption=False)), count=40)
        load, _, _ = lit(system, (p,), 5.0)
        along = load.torque @ p.beam
        assert np.abs(load.torque).max() > 1.0
        assert np.abs(along).max() < 1e-13 * np.abs(load.torque).max()
    elliptic, _, _ = lit(system, (pulse(ellipticity=0.4),), 5.0)
    assert np.abs(elliptic.torque[:, 2]).max() > 0.1


def test_gyration_never_acts_along_the_beam():
    system = sample(species(response(6, alpha=False, absorption=False)), count=40)
    for chi in (pi / 4, 0.3, -0.2):
        load, _, _ = lit(system, (pulse(ellipticity=chi),), 5.0)
        assert np.abs(load.torque[:, 2]).max() < 1e-14 * np.abs(load.torque).max()


@pytest.mark.parametrize("chi", [pi / 4, -pi / 4])
def test_circular_light_gives_one_hbar_for_each_absorbed_photon(chi):
    """τ·k̂ = s3 P/ω on every body, whatever α_S, α_D and g (P: see Beth 1936)."""
    p = pulse(ellipticity=chi, direction=(0.48, -0.64, 0.6))
    for seed in range(3):
        system = sample(species(response(seed)), count=1)
        load, _, _ = lit(system, (p,), 5.0)
        assert load.torque[0] @ p.beam == pytest.approx(p.s3 * load.absorbed_power / FAST,
                                                        rel=1e-12)


def test_isotropic_absorption_follows_s3_in_elliptic_light_too():
    for chi in (0.3, -0.1, 0.0):
        p = pulse(ellipticity=chi)
        load, _, _ = lit(sample(species(isotropic(0.7)), count=5), (p,), 5.0)
        expected = np.tile([0, 0, 0.5 * 0.7 * p.s3 * p.amplitude**2], (5, 1))
        np.testing.assert_allclose(load.torque, expected, atol=1e-12)
        assert load.absorbed_power * p.s3 / FAST == pytest.approx(load.torque[:, 2].sum(),
                                                                  abs=1e-12)


def test_absorptive_torque_averages_to_a_sixth_of_the_trace():
    """Over random orientations (Tr α_D/6) G; a rod (α∥ + α⊥)/6 G; the 24 rotations of a cube
    average a second-rank tensor exactly."""
    cube = np.array([q for q in np.ndindex(3, 3, 3, 3)], float) - 1.0
    cube = cube[np.isin(np.abs(cube).sum(axis=1), (1, 2, 4))]
    cube /= np.linalg.norm(cube, axis=1, keepdims=True)  # each rotation twice, as ±q
    assert len(cube) == 48
    general = response(7, alpha=False, gyration=False)
    rod = isotropic()
    rod.absorptive[:] = np.diag([0.4, 0.4, 1.5])
    g = 9.0  # s3 |𝓔|²
    for block, freedom, mean in ((general, GENERAL, np.trace(general.absorptive) / 6 * g),
                                 (rod, LINEAR, (0.4 + 1.5) / 6 * g), (rod, ATOM, 0.0)):
        system = sample(species(block, freedom=freedom), count=48)
        load, sums, _ = lit(system, (pulse(),), 5.0, q=np.ascontiguousarray(cube))
        np.testing.assert_allclose(load.torque.mean(axis=0), [0, 0, mean], atol=1e-12)
        assert sums.absorbed_power > 0.0


@pytest.mark.parametrize("block", [isotropic(0.3), response(8, alpha=False, absorption=False)])
@pytest.mark.parametrize("freedom", [GENERAL, LINEAR])
def test_mirrored_light_reverses_odd_torques_to_the_last_bit(block, freedom):
    system = sample(species(block, freedom=freedom), count=33)
    pulses = (pulse(ellipticity=0.6, azimuth=0.3, direction=(0.48, -0.64, 0.6)),)
    plus, minus = (lit(system, x, 5.0)[0] for x in (pulses, mirrored(pulses)))
    np.testing.assert_array_equal(plus.torque, -minus.torque)
    assert plus.absorbed_power == minus.absorbed_power
    assert np.abs(plus.torque).max() > 0.1


def test_mirrored_light_leaves_even_torques_to_the_last_bit():
    system = sample(species(response(8, absorption=False, gyration=False)), count=33)
    pulses = (pulse(ellipticity=0.6, azimuth=0.3),)
    plus, minus = (lit(system, x, 5.0)[0] for x in (pulses, mirrored(pulses)))
    np.testing.assert_array_equal(plus.torque, minus.torque)


def test_mirror_image_of_bodies_in_mirrored_light():
    """Reflected orientation axes and tensors: same energies, torques reflected as axial vectors."""
    block = response(9, kappa=True)
    q = orientations(1, seed=4)
    p = pulse(ellipticity=0.5, azimuth=0.3, turning=(0.2, 0.1))
    across = np.array([-np.sin(0.3), np.cos(0.3), 0.0])
    mirror = np.eye(3) - 2 * np.outer(across, across)
    # the image's body frame: x and z as they were reflected, y turned over to stay right-handed
    flip = np.diag([1.0, -1.0, 1.0])
    image = type(block)(None, flip @ block.polarizability @ flip, flip @ block.absorptive @ flip,
                        -flip @ block.gyration, -flip @ block.rectification @ flip)
    qi = _quaternion(mirror @ matrix(q[0]) @ flip)[None]
    bias, mirrored_bias = Bias((0.3, 0.2, -0.4)), Bias(tuple(mirror @ [0.3, 0.2, -0.4]))
    a = species(block)
    b = species(image)
    b.sites[:] = a.sites @ flip
    load, sums, _ = lit(sample(a, count=1), (p,), 4.0, bias, q)
    load_i, sums_i, _ = lit(sample(b, count=1), mirrored((p,)), 4.0, mirrored_bias, qi)
    np.testing.assert_allclose(load_i.torque[0], -mirror @ load.torque[0], atol=1e-12)
    np.testing.assert_allclose(load_i.bias_torque[0], -mirror @ load.bias_torque[0], atol=1e-13)
    np.testing.assert_allclose(sums_i.rectified_dipole, mirror @ sums.rectified_dipole, atol=1e-12)
    for name in ("light_energy", "bias_energy", "absorbed_power"):
        assert getattr(sums_i, name) == pytest.approx(getattr(sums, name), rel=1e-12)


def _quaternion(r):
    """Scalar first, of a rotation matrix with positive 1 + trace."""
    w = 0.5 * np.sqrt(1 + np.trace(r))
    return np.array([w, *(np.array([r[2, 1] - r[1, 2], r[0, 2] - r[2, 0], r[1, 0] - r[0, 1]])
                          / (4 * w))])


def test_turning_light_of_constant_strength_works_through_its_azimuth():
    """∂U/∂t at fixed orientation is ψ̇ τ·k̂, so d(H0 + U)/dt = ψ̇ τ_light·k̂."""
    system = sample(species(response(10, absorption=False)), count=6)
    p = pulse(ellipticity=0.3, turning=(2.0, 0.5), direction=(0.48, -0.64, 0.6))
    step = 1e-4
    energy = [lit(system, (p,), 6.0 + s * step)[1].light_energy for s in (1, -1)]
    load, _, _ = lit(system, (p,), 6.0)
    speed = 2.0 + 0.5 * (6.0 - p.centre)
    assert (energy[0] - energy[1]) / (2 * step) == pytest.approx(
        speed * load.torque.sum(axis=0) @ p.beam, rel=1e-7)


def test_resolved_kernel_against_the_plain_form():
    p = terahertz(ellipticity=0.3, azimuth=0.4, phase=0.2)
    load, sums, q = lit(MIXTURE, (p,), 5.3)
    from swirlight.light.schedule import resolved_field

    field, quadrature = (x[0] for x in resolved_field([p], np.array([5.3])))
    power, energy = 0.0, 0.0
    dark = response(0, False, False, False)
    for i, kind in bodies_of(MIXTURE):
        block = kind.responses[0] if kind.responses else dark
        torque, absorbed, stored = twin_resolved(q[i], block, kind.dipole, field, quadrature,
                                                 SLOW, FREE[kind.freedom])
        np.testing.assert_allclose(load.torque[i], torque, atol=1e-12)
        power, energy = power + absorbed, energy + stored
    assert load.absorbed_power == pytest.approx(power, rel=1e-12)
    assert sums.light_energy == pytest.approx(energy, rel=1e-12)


def test_two_resolved_colours_share_one_dipole():
    a, b = terahertz(), terahertz(carrier=3 * SLOW, ellipticity=-0.2, amplitude=1.0)
    system = sample(species(response(1, absorption=False, gyration=False)), count=5)
    load, sums, q = lit(system, (a, b), 5.3)
    field = Light(system, (a, b)).schedule(np.array([5.3])).field[0]
    for i, kind in bodies_of(system):
        torque, _, _ = twin_resolved(q[i], kind.responses[0], kind.dipole, field, 0 * field, 1.0)
        np.testing.assert_allclose(load.torque[i], torque, atol=1e-12)


def test_resolved_light_averages_to_averaged_light():
    """Narrow band, no dipole: torque and absorbed power over one cycle of a steady carrier."""
    system = sample(species(response(11), charge=(0, 0, 0)), count=4)
    parts = {"carrier": 400.0, "envelope": Gaussian(400.0), "centre": 0.0, "ellipticity": 0.3,
             "azimuth": 0.5}
    averaged, _, q = lit(system, (pulse(**parts),), 0.0)
    light = Light(system, (pulse(coupling="resolved", **parts),))
    count = 64
    block = light.schedule(np.arange(count) * (2 * pi / 400.0 / count))
    loads = [light.apply(block, n, q) for n in range(count)]
    np.testing.assert_allclose(np.mean([x.torque for x in loads], axis=0), averaged.torque,
                               atol=1e-6 * np.abs(averaged.torque).max())
    assert np.mean([x.absorbed_power for x in loads]) == pytest.approx(averaged.absorbed_power,
                                                                       rel=1e-7)


def test_net_charges_feel_the_resolved_and_the_static_field():
    ion = sample(species(charge=(1.0, 0.0, 0.0)), species(name="neutral"), count=2)
    light = Light(ion, (terahertz(),), Bias((0.0, 0.5, 0.0)))
    block = light.schedule(np.array([5.2]))
    q, position = orientations(4), np.arange(12.0).reshape(4, 3)
    load = light.apply(block, 0, q)
    np.testing.assert_allclose(load.force, np.outer([1, 1, 0, 0], block.field[0]))
    np.testing.assert_allclose(load.bias_force, np.outer([1, 1, 0, 0], [0, 0.5, 0]))
    energies = light.energies(block, 0, q, position)
    dipole = position[:2].sum(axis=0) + sum(
        matrix(q[i]) @ kind.dipole for i, kind in bodies_of(ion))
    assert energies.light_energy == pytest.approx(-dipole @ block.field[0], rel=1e-12)
    assert energies.bias_energy == pytest.approx(-0.5 * dipole[1], rel=1e-12)


def test_static_field_turns_dipoles_with_the_slope_of_its_energy():
    system, bias = sample(species(), species(name="rod", freedom=LINEAR), count=2), Bias((1, 2, 3))
    load, _, q = lit(system, (), 0.0, bias)
    np.testing.assert_allclose(load.bias_torque.sum(axis=0),
                               difference_torque(system, (), 0.0, q, bias, "bias_energy"),
                               rtol=1e-7)
    assert not load.torque.any()


def test_rectified_dipoles_feel_the_static_field_only():
    system = sample(species(response(12, kappa=True)), count=3)
    p, bias = pulse(ellipticity=0.4), Bias((0.0, 0.3, 0.8))
    without, _, q = lit(system, (p,), 5.0)
    load, sums, _ = lit(system, (p,), 5.0, bias)
    g, total = p.s3 * p.amplitude**2 * p.beam, np.zeros(3)
    for i, kind in bodies_of(system):
        r = matrix(q[i])
        p0 = r @ kind.responses[0].rectification @ r.T @ g
        total += p0
        np.testing.assert_allclose(load.torque[i] - without.torque[i], np.cross(p0, bias.vector),
                                   atol=1e-12)
    np.testing.assert_allclose(sums.rectified_dipole, total, atol=1e-12)
    np.testing.assert_allclose(lit(system, (p,), 5.0)[1].rectified_dipole, total, atol=1e-12)


def test_rods_take_no_torque_along_their_axis():
    system = sample(species(response(13, kappa=True), freedom=LINEAR), count=20)
    load, _, q = lit(system, (pulse(), terahertz()), 5.2, Bias((1.0, 2.0, 3.0)))
    axes = np.array([matrix(x)[:, 2] for x in q])
    for torque in (load.torque, load.bias_torque):
        assert np.abs(torque).max() > 0.1
        assert np.abs((torque * axes).sum(axis=1)).max() < 1e-14 * np.abs(torque).max()


def test_buffers_are_overwritten():
    light = Light(MIXTURE, (pulse(),), Bias((0, 0, 1.0)))
    block, q = light.schedule(np.array([5.0, 99.0])), orientations(MIXTURE.bodies)
    out = light.new_load()
    assert light.apply(block, 0, q, out) is out
    first = out.torque.copy()
    light.apply(block, 0, q, out)
    np.testing.assert_array_equal(out.torque, first)
    light.apply(block, 1, q, out)
    assert not out.torque.any() and out.absorbed_power == 0.0 and out.bias_torque.any()


def test_what_is_active():
    assert not Light(MIXTURE, ()).active
    assert Light(MIXTURE, (), Bias((0, 0, 1.0))).active and Light(MIXTURE, (pulse(),)).active


def test_beating_light_is_evaluated_as_one_amplitude():
    beat = 0.5 * rotation_rate(MIXTURE)
    plus = pulse(carrier=FAST + beat, amplitude=1.0)
    minus = pulse(carrier=FAST - beat, amplitude=1.0, ellipticity=-pi / 4)
    linear = pulse(amplitude=2**0.5, ellipticity=0.0, turning=(beat, 0.0))
    for time in (5.0, 5.3):
        np.testing.assert_allclose(lit(MIXTURE, (plus, minus), time)[0].torque,
                                   lit(MIXTURE, (linear,), time)[0].torque, atol=1e-11)
