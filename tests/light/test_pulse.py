"""Polarisation, strength, turning, phases and copies of a pulse."""

from math import pi, sqrt

import numpy as np
import pytest

from swirlight.errors import InputError
from swirlight.light.envelope import Gaussian, Rectangle, Sech2
from swirlight.light.polarisation import conjugate_product, transverse_axes, unit_direction
from swirlight.light.pulse import Bias, Pulse, amplitude_of_intensity, intensity_of_fluence

DIRECTIONS = ["x", "y", "z", "-x", "-y", "-z", (0, 1, 1), (0.95, 0.1, 0.2), (-0.3, 0.5, 0.1)]


def pulse(**parts):
    given = {"carrier": 7.0, "amplitude": 3.0, "envelope": Gaussian(1.0), "centre": 2.0}
    return Pulse(**{**given, **parts})


@pytest.mark.parametrize("direction", DIRECTIONS, ids=str)
def test_axes_are_right_handed_and_transverse(direction):
    k = np.array(unit_direction(direction))
    e1, e2 = transverse_axes(k)
    np.testing.assert_allclose(np.cross(e1, e2), k, atol=1e-15)
    np.testing.assert_allclose([e1 @ e1, e2 @ e2, e1 @ e2, e1 @ k], [1, 1, 0, 0], atol=1e-15)
    nearest = 0 if abs(k[0]) <= 0.9 else 1
    assert e1[nearest] > 0.0


def test_axes_of_the_beam_along_z_are_x_and_y():
    np.testing.assert_array_equal(transverse_axes((0, 0, 1)), np.eye(3)[:2])
    assert unit_direction("-z") == (0.0, 0.0, -1.0)
    for wrong in ("w", (0, 0, 0), (1, 2), (np.nan, 0, 1)):
        with pytest.raises(InputError, match="direction"):
            unit_direction(wrong)


@pytest.mark.parametrize("direction", DIRECTIONS, ids=str)
@pytest.mark.parametrize("degrees", [-45, -20, 0, 30, 45])
def test_conjugate_product_is_s3_intensity_along_the_beam(direction, degrees):
    p = pulse(direction=unit_direction(direction), ellipticity=np.radians(degrees), azimuth=0.7)
    g = conjugate_product(p.amplitude_at(np.array([0.0])))[0]
    np.testing.assert_allclose(g, p.s3 * p.amplitude**2 * p.beam, atol=1e-13)
    assert p.s3 == pytest.approx(np.sin(2 * np.radians(degrees)))


def test_amplitude_is_the_jones_vector_written_out():
    chi, psi, nu, beta = 0.3, 0.4, 1.7, -0.9
    p = pulse(ellipticity=chi, azimuth=psi, turning=(nu, beta), envelope=Sech2(2.0))
    t = np.array([-0.8, 0.0, 1.1])
    angle = psi + nu * t + 0.5 * beta * t**2
    x = np.cos(chi) * np.cos(angle) - 1j * np.sin(chi) * np.sin(angle)
    y = np.cos(chi) * np.sin(angle) + 1j * np.sin(chi) * np.cos(angle)
    expected = 3.0 * np.sqrt(Sech2(2.0).intensity(t))[:, None] * np.stack([x, y, 0 * x], axis=1)
    np.testing.assert_allclose(p.amplitude_at(t), expected, rtol=1e-13)


def test_derivatives_follow_amplitude_and_azimuth():
    p = pulse(ellipticity=0.3, azimuth=0.4, turning=(1.7, -0.9), mirror=(0.6, 0.0, 0.8))
    t, h = np.linspace(-1.0, 1.0, 9), 1e-4
    value, first, second = p.derivatives_at(t)
    np.testing.assert_allclose(value, p.amplitude_at(t), rtol=1e-13)
    np.testing.assert_allclose(first, (p.amplitude_at(t + h) - p.amplitude_at(t - h)) / (2 * h),
                               atol=1e-6)
    np.testing.assert_allclose(
        second, (p.derivatives_at(t + h)[1] - p.derivatives_at(t - h)[1]) / (2 * h), atol=1e-6)


def test_strength_from_intensity_field_and_fluence():
    linear = amplitude_of_intensity(1e10)
    assert amplitude_of_intensity(1e10, 1.5) == pytest.approx(linear / sqrt(1.5))
    assert pulse(amplitude=linear).intensity == pytest.approx(1e10)
    assert pulse(amplitude=linear, refractive_index=1.5).intensity == pytest.approx(1.5e10)
    # 1 ps rectangle: 1e10 W/cm² × 1e-12 s
    assert intensity_of_fluence(0.01, Rectangle(1.0)) == pytest.approx(1e10)
    assert pulse(amplitude=linear, envelope=Rectangle(1.0)).fluence == pytest.approx(0.01)
    assert pulse(ellipticity=pi / 4).peak_field == pytest.approx(3.0 / sqrt(2))
    assert pulse(ellipticity=0.0).peak_field == 3.0


def test_local_field_is_lorentz():
    n = 1.344
    p = pulse(refractive_index=n, local_field="lorentz")
    assert p.local_factor == pytest.approx((n**2 + 2) / 3)
    assert pulse(refractive_index=n).local_factor == 1.0


def test_faint_light_is_none_at_all():
    before, _ = Gaussian(1.0).reach(1e-24)
    values = pulse().amplitude_at(np.array([-before - 1e-6, -before + 1e-6]))
    assert not values[0].any() and values[1].any()


def test_edges_of_a_rectangle_that_steps_meet_count_half_wherever_it_stands():
    times = 0.001 * np.arange(2000)
    for centre in np.round(np.arange(0.3, 1.2, 0.017), 3):
        p = pulse(amplitude=1.0, envelope=Rectangle(0.246), centre=centre)
        shape = (np.abs(p.amplitude_at(times - centre)) ** 2).sum(axis=1)
        assert 0.001 * shape.sum() == pytest.approx(0.246, rel=1e-12)


def test_bias_is_on_from_its_beginning_until_its_end():
    field = Bias((0.0, 0.0, 2.0), begin=1.0, end=2.0).field([0.5, 1.0, 1.5, 2.0])
    np.testing.assert_array_equal(field[:, 2], [0, 2, 2, 0])
    assert Bias((1, 0, 0)).always and not Bias((1, 0, 0), begin=0.0).always
    np.testing.assert_array_equal(Bias((1, 0, 0)).field([-5.0, 99.0])[:, 0], [1, 1])


def test_span_covers_the_whole_train():
    begin, end = pulse(envelope=Rectangle(1.0), count=3, period=4.0).span()
    assert (begin, end) == (1.5, 10.5)
