"""Fields in time: beats, copies, resolved carriers and their area."""

from dataclasses import replace
from math import pi

import numpy as np
import pytest

from swirlight.light.envelope import FlatTop, Gaussian, Rectangle, Sech2, Table
from swirlight.light.polarisation import conjugate_product
from swirlight.light.pulse import Bias, Pulse
from swirlight.light.schedule import (
    coherency_rows,
    group_amplitude,
    make_block,
    resolved_field,
)

FAST, SLOW = 2000.0, 2 * pi  # rad/ps: near infrared, 1 THz


def pulse(**parts):
    given = {"carrier": FAST, "amplitude": 3.0, "envelope": Gaussian(1.0), "centre": 2.0}
    return Pulse(**{**given, **parts})


def terahertz(**parts):
    given = {"carrier": SLOW, "coupling": "resolved", "envelope": Gaussian(1.5), "centre": 4.0}
    return pulse(**{**given, **parts})


TIMES = np.linspace(0.0, 5.0, 101)


def test_one_pulse_is_its_own_amplitude():
    p = pulse(phase=1.1)
    np.testing.assert_array_equal(group_amplitude([p], TIMES), p.amplitude_at(TIMES - 2.0))
    np.testing.assert_allclose(make_block(TIMES, [(p,)], [], None).amplitude,
                               p.amplitude_at(TIMES - 2.0) * np.exp(-1.1j), rtol=1e-14)


def test_coherency_rows_are_the_matrix():
    rng = np.random.default_rng(3)
    amplitude = rng.normal(size=(5, 3)) + 1j * rng.normal(size=(5, 3))
    matrix = np.einsum("ti,tj->tij", amplitude, amplitude.conj())
    rows = coherency_rows(amplitude)
    for n, (i, j) in enumerate(((0, 0), (1, 1), (2, 2), (0, 1), (0, 2), (1, 2))):
        np.testing.assert_allclose(rows[:, n], matrix.real[:, i, j], rtol=1e-13)
    # G_k = i ε_kij 𝓔_i 𝓔_j* = −ε_kij Im(𝓔𝓔†)_ij
    for n, (i, j) in enumerate(((1, 2), (2, 0), (0, 1))):
        np.testing.assert_allclose(rows[:, 6 + n], -2 * matrix.imag[:, i, j], rtol=1e-13)


def test_two_counter_rotating_circular_fields_are_a_turning_linear_one():
    """ê₊ e^{−iδt} + ê₋ e^{iδt} = √2 (x̂ cos δt + ŷ sin δt), phases counted from the centre."""
    delta = 3.0
    plus = pulse(carrier=FAST + delta, amplitude=1.0)
    minus = pulse(carrier=FAST - delta, amplitude=1.0, ellipticity=-pi / 4)
    linear = pulse(amplitude=2**0.5, ellipticity=0.0, turning=(delta, 0.0))
    np.testing.assert_allclose(coherency_rows(group_amplitude([plus, minus], TIMES)),
                               coherency_rows(group_amplitude([linear], TIMES)), atol=1e-11)


def test_beat_follows_the_difference_of_carriers_and_phases():
    a, b = pulse(), pulse(carrier=FAST + 5.0, centre=2.3, phase=0.4, amplitude=1.0)
    wave = [p.amplitude_at(TIMES - p.centre)
            * np.exp(-1j * (p.carrier * (TIMES - p.centre) + p.phase))[:, None] for p in (a, b)]
    np.testing.assert_allclose(coherency_rows(group_amplitude([a, b], TIMES)),
                               coherency_rows(wave[0] + wave[1]), atol=1e-10)


def test_copies_of_a_train_are_exact():
    single, train = terahertz(), terahertz(count=3, period=40.3)
    shifted = TIMES + 2 * 40.3
    np.testing.assert_allclose(resolved_field([train], shifted)[0],
                               resolved_field([single], TIMES)[0], atol=1e-11)
    np.testing.assert_allclose(group_amplitude([replace(train, coupling="averaged")], shifted)
                               * np.exp(-1j * SLOW * 2 * 40.3),
                               group_amplitude([single], TIMES), atol=1e-11)


def test_far_apart_groups_add_as_matrices():
    a, b = pulse(), pulse(carrier=1.5 * FAST, ellipticity=-pi / 4, amplitude=1.0)
    block = make_block(TIMES, [(a,), (b,)], [], None)
    assert block.coherency.shape == (101, 2, 9)
    expected = conjugate_product(a.amplitude_at(TIMES - 2)) + conjugate_product(
        b.amplitude_at(TIMES - 2))
    np.testing.assert_allclose(block.conjugate_product, expected, rtol=1e-13)


def test_local_field_dresses_the_bodies_but_not_the_report():
    p = pulse(local_field="lorentz", refractive_index=1.4)
    block = make_block(TIMES, [(p,)], [], None)
    bare = make_block(TIMES, [(pulse(),)], [], None)
    np.testing.assert_allclose(block.coherency, bare.coherency * p.local_factor**2, rtol=1e-13)
    np.testing.assert_array_equal(block.conjugate_product, bare.conjugate_product)


def test_light_of_each_time_stands_alone():
    lights = [(pulse(),)], [(terahertz(),)], Bias((0, 0, 1), 1.0, 2.0)
    block = make_block(TIMES, *lights)
    for n in (0, 17, 100):
        alone = make_block(TIMES[n:n + 1], *lights)
        np.testing.assert_allclose(alone.coherency[0], block.coherency[n], rtol=1e-13)
        np.testing.assert_allclose(alone.wave[0], block.wave[n], rtol=1e-12, atol=1e-18)
        np.testing.assert_array_equal(alone.bias[0], block.bias[n])


def test_dark_times_are_marked():
    block = make_block(TIMES, [(pulse(envelope=Rectangle(1.0)),)], [], None)
    np.testing.assert_array_equal(block.averaged_on, np.abs(TIMES - 2.0) <= 0.5 + 1e-9)
    assert not block.resolved_on.any()


def test_field_is_largest_at_the_centre_along_the_azimuth_axis():
    p = terahertz(azimuth=0.5, ellipticity=0.2)
    axis = np.array([np.cos(0.5), np.sin(0.5), 0.0])
    t = p.centre + np.linspace(-0.4, 0.4, 801)
    along = resolved_field([p], t)[0] @ axis
    assert abs(t[along.argmax()] - p.centre) < 1e-3
    assert along.max() == pytest.approx(p.peak_field, rel=1e-9)
    shifted = resolved_field([replace(p, phase=pi)], t)[0] @ axis
    np.testing.assert_allclose(shifted, -along, atol=1e-13)


def test_positive_helicity_turns_counter_clockwise_looking_into_the_beam():
    """For k̂ = ẑ the viewer at +z, looking down, sees x to the right and y up."""
    t = 4.0 + np.linspace(-0.4, 0.4, 81)
    for sign in (1, -1):
        field, _ = resolved_field([terahertz(ellipticity=sign * pi / 4)], t)
        angle = np.unwrap(np.arctan2(field[:, 1], field[:, 0]))
        assert (np.sign(np.diff(angle)) == sign).all()
        assert np.diff(angle).sum() == pytest.approx(sign * SLOW * 0.8, rel=0.05)
        # and the same seen along any other beam: E × Ė points along s3 k̂
        tilted = terahertz(ellipticity=sign * pi / 4, direction=(0.6, 0.0, -0.8))
        field, quadrature = resolved_field([tilted], t)
        assert (sign * np.cross(field, quadrature) @ np.array([0.6, 0.0, -0.8]) > 0).all()


ENVELOPES = {
    "gaussian": Gaussian(0.8), "sech2": Sech2(0.8), "flat-top": FlatTop(2.0, 0.7),
    "rectangle": Rectangle(2.3).resolved(SLOW),
    "table": Table(2.0, (0, 1, 2, 3), (0.2, 1.0, 0.3, 0.5)).resolved(SLOW),
}


@pytest.mark.parametrize("envelope", ENVELOPES.values(), ids=ENVELOPES.keys())
def test_resolved_pulses_have_no_net_area(envelope):
    p = terahertz(envelope=envelope, phase=0.7, ellipticity=0.3, turning=(0.4, 0.2), centre=9.0)
    t = np.linspace(0.0, 18.0, 72_001)
    field, _ = resolved_field([p], t)
    # a flat top may jump at its corners, which the trapezium sees to half a sample
    assert np.abs(np.trapezoid(field, t, axis=0)).max() < 1e-3 * p.amplitude / SLOW
    naive = (p.amplitude_at(t - 9.0) * np.exp(-1j * (SLOW * (t - 9.0) + 0.7))[:, None]).real
    assert np.abs(np.trapezoid(naive, t, axis=0)).max() > 2e-3 * p.amplitude / SLOW


@pytest.mark.parametrize("name", ["gaussian", "sech2", "rectangle", "table"])
def test_field_is_minus_the_rate_of_the_vector_potential(name):
    p = terahertz(envelope=ENVELOPES[name], phase=0.7, ellipticity=0.3, turning=(0.4, 0.2))
    t, h = np.linspace(2.0, 6.0, 57) + 0.001, 1e-5

    def potential(t):
        slow = p.amplitude_at(t - 4.0) * np.exp(-1j * (SLOW * (t - 4.0) + 0.7))[:, None]
        return (slow / (1j * SLOW)).real

    field, quadrature = resolved_field([p], t)
    np.testing.assert_allclose(field, -(potential(t + h) - potential(t - h)) / (2 * h), atol=1e-6)
    rate = (resolved_field([p], t + h)[0] - resolved_field([p], t - h)[0]) / (2 * h)
    np.testing.assert_allclose(quadrature, rate / SLOW, atol=1e-3)


def test_resolved_pulses_add_as_fields():
    a, b = terahertz(), terahertz(carrier=2 * SLOW, centre=4.5, direction=(1.0, 0.0, 0.0))
    block = make_block(TIMES, [], [(a,), (b,)], None)
    np.testing.assert_allclose(block.field,
                               resolved_field([a], TIMES)[0] + resolved_field([b], TIMES)[0])
