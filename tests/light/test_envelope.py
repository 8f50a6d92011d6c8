"""Shapes of pulses: widths, areas, derivatives, ends."""

import numpy as np
import pytest

from swirlight.errors import InputError
from swirlight.light.envelope import (
    ENVELOPES,
    FlatTop,
    Gaussian,
    Rectangle,
    Sech2,
    Table,
    make_envelope,
)

TRAPEZIUM = ((0.0, 0.4, 1.9, 2.2), (0.0, 2.0, 2.0, 0.0))
ALL = [
    Gaussian(1.3), Sech2(0.7), FlatTop(1.1, 0.3), Rectangle(0.9), Table(1.5, *TRAPEZIUM),
    Rectangle(0.9).resolved(30.0), Table(1.5, *TRAPEZIUM).resolved(60.0),
]
SMOOTH = [e.resolved(60.0) for e in ALL[:5]]
names = [f"{type(e).__name__}" for e in ALL]


def fine(envelope, points=400_001):
    before, after = envelope.reach(1e-12)
    return np.linspace(-before - 0.1, after + 0.1, points)


@pytest.mark.parametrize("envelope", ALL, ids=names)
def test_duration_is_the_width_at_half_the_peak_intensity(envelope):
    t = fine(envelope)
    f = envelope.intensity(t)
    lit = t[f >= 0.5 - 1e-9]
    # a smoothed table keeps its width up to the kinks it rounds off; samples are 2e-5 ps apart
    tolerance = 1e-3 if envelope is ALL[-1] else 5e-5
    width = envelope.duration
    if envelope is ALL[-2]:  # ramps inside the length, half a cycle each; sin⁴(πx/2) = ½
        width -= 2 * (2 / np.pi * np.arcsin(0.5**0.25)) * np.pi / 30.0
    assert lit[-1] - lit[0] == pytest.approx(width, abs=tolerance)
    assert f.max() == pytest.approx(1.0, abs=1e-6)


@pytest.mark.parametrize("envelope", ALL, ids=names)
def test_fluence_factor_is_the_area_of_the_shape(envelope):
    t = fine(envelope)
    area = np.trapezoid(envelope.intensity(t), t)
    assert area == pytest.approx(envelope.fluence_factor * envelope.duration, rel=1e-5)


@pytest.mark.parametrize("envelope", ALL, ids=names)
@pytest.mark.parametrize("level", [1e-6, 1e-4, 0.3])
def test_reach_is_where_the_intensity_passes_the_level(envelope, level):
    t = fine(envelope)
    lit = t[envelope.intensity(t) > level]
    before, after = envelope.reach(level)
    tolerance = 2e-3 if envelope is ALL[-1] else 5e-5  # a smoothed table: one knot, or samples
    assert -lit[0] == pytest.approx(before, abs=tolerance)
    assert lit[-1] == pytest.approx(after, abs=tolerance)


@pytest.mark.parametrize("envelope", SMOOTH, ids=lambda e: type(e).__name__)
def test_derivatives_are_those_of_the_amplitude(envelope):
    before, after = envelope.reach(1e-4)
    t, h = np.linspace(-before, after, 211)[1:-1], 1e-5
    a, slope, curve = envelope.derivatives(t)
    low, high = envelope.derivatives(t - h)[0], envelope.derivatives(t + h)[0]
    np.testing.assert_allclose(a, envelope.amplitude(t), atol=1e-14)
    np.testing.assert_allclose(a**2, envelope.intensity(t), atol=1e-14)
    scale = np.abs(curve).max()
    np.testing.assert_allclose(slope, (high - low) / (2 * h), rtol=1e-5, atol=1e-2 * scale * h)
    numeric = (envelope.derivatives(t + h)[1] - envelope.derivatives(t - h)[1]) / (2 * h)
    kink = np.abs(numeric - curve) > 1e-3 * scale  # the second derivative of a ramp may jump
    assert kink.sum() <= 4


def test_symmetric_shapes_are_symmetric():
    t = np.linspace(0.0, 3.0, 301)
    for envelope in (*ALL[:4], ALL[5]):
        np.testing.assert_array_equal(envelope.intensity(t), envelope.intensity(-t))


def test_default_centres():
    assert Gaussian(2.0).default_centre == 5.0
    assert Sech2(2.0).default_centre == pytest.approx(6.2)
    assert FlatTop(2.0, 0.5).default_centre == pytest.approx(1.25)
    assert Rectangle(2.0).default_centre == 1.0
    table = Table(None, *TRAPEZIUM)
    assert table.intensity(-table.default_centre) == 0.0  # the stage begins where the table does
    assert Gaussian(2.0).intensity(-5.0) < 1e-7 and Sech2(2.0).intensity(-6.2) < 1e-4


def test_rectangle_sums_to_its_duration_over_steps_that_meet_its_edges():
    steps = np.arange(0, 400) * 0.005 - 1.0
    assert (0.005 * Rectangle(0.8).intensity(steps)).sum() == pytest.approx(0.8, rel=1e-12)


def test_table_is_stretched_to_the_duration_and_straight_between_its_points():
    table = Table(3.0, *TRAPEZIUM)
    # half maximum at 0.2 and 2.05 of the file: 1.85 wide, middle 1.125
    stretch = 3.0 / 1.85
    t = (np.array([0.3, 1.0, 2.15]) - 1.125) * stretch
    np.testing.assert_allclose(table.intensity(t), [0.75, 1.0, 1 / 6], rtol=1e-12)
    assert Table(None, *TRAPEZIUM).duration == pytest.approx(1.85)


def test_far_ends_do_not_overflow():
    with np.errstate(all="raise", under="ignore"):
        assert Sech2(0.1).amplitude(np.array([-1e4, 1e4])).max() == 0.0
        assert Gaussian(0.1).derivatives(np.array([1e4])).max() == 0.0


@pytest.mark.parametrize(
    ("arguments", "message"),
    [
        (("sech", 1.0), "there are gaussian, sech2, flat-top, rectangle, table"),
        (("flat-top", 1.0), "flat-top envelope needs it"),
        (("gaussian", 1.0, 0.1), "no other has it"),
        (("flat-top", 1.0, 1.1), "at most the duration"),
        (("table", 1.0), "table envelope needs it"),
        (("table", 1.0, None, ((0, 1), (0, 0))), "somewhere positive"),
        (("table", 1.0, None, ((0, 0, 1), (0, 1, 0))), "rising times"),
        (("table", 1.0, None, ((0,), (1,))), "two rows"),
    ],
)
def test_what_does_not_fit_is_refused(arguments, message):
    with pytest.raises(InputError, match=message):
        make_envelope(*arguments)


@pytest.mark.parametrize("envelope", [Rectangle(1.0), Table(1.5, *TRAPEZIUM)])
@pytest.mark.parametrize("carrier", [2.0, 6.3, 200.0])
def test_ramps_stay_inside_the_length(envelope, carrier):
    ramped = envelope.resolved(carrier)
    assert ramped.reach(0.0) == pytest.approx(envelope.reach(0.0))
    before, after = envelope.reach(0.0)
    assert not ramped.derivatives(np.array([-before, after]))[0].any()
    assert not ramped.derivatives(np.array([-before, after]))[1].any()
    assert ramped.default_centre == pytest.approx(envelope.default_centre)


def test_registry_knows_each_by_its_name():
    assert list(ENVELOPES) == ["gaussian", "sech2", "flat-top", "rectangle", "table"]
    assert make_envelope("sech2", 1.0) == Sech2(1.0)
