"""Mirrored, dark and phase-shifted light."""

from math import pi

import numpy as np
import pytest

from swirlight.light.envelope import Gaussian
from swirlight.light.exposure import dark, exposed, mirrored, with_phase
from swirlight.light.polarisation import transverse_axes, unit_direction
from swirlight.light.pulse import Pulse
from swirlight.light.schedule import (
    coherency_rows,
    group_amplitude,
    make_block,
    resolved_field,
)

TIMES = np.linspace(0.0, 5.0, 41)


def pulse(**parts):
    given = {"carrier": 7.0, "amplitude": 3.0, "envelope": Gaussian(1.5), "centre": 2.0}
    if "direction" in parts:
        parts["direction"] = unit_direction(parts["direction"])
    return Pulse(**{**given, **parts})


def reflection(first):
    """The mirror in the plane of k̂ and the azimuth axis of a pulse."""
    e1, e2 = transverse_axes(first.direction)
    across = np.cos(first.azimuth) * e2 - np.sin(first.azimuth) * e1
    return np.eye(3) - 2.0 * np.outer(across, across)


@pytest.mark.parametrize("direction", ["z", "-x", (0, 1, 1), (0.95, 0.1, 0.2)], ids=str)
@pytest.mark.parametrize("azimuth", [0.0, 0.4, 2.5])
def test_one_pulse_keeps_its_coherency_and_reverses_g_to_the_last_bit(direction, azimuth):
    p = pulse(direction=direction, azimuth=azimuth, ellipticity=0.5)
    plus, minus = (coherency_rows(group_amplitude(x, TIMES)) for x in ((p,), mirrored((p,))))
    np.testing.assert_array_equal(plus[:, :6], minus[:, :6])
    np.testing.assert_array_equal(plus[:, 6:], -minus[:, 6:])
    assert np.abs(plus[:, 6:]).max() > 1.0


def test_so_does_every_copy_of_a_train_and_a_second_pulse_after_the_first():
    train = pulse(azimuth=0.4, ellipticity=0.5, count=3, period=14.0, carrier=2001.7)
    later = pulse(azimuth=0.4, ellipticity=-0.2, centre=50.0, phase=0.9, carrier=2003.0)
    times = np.linspace(0.0, 60.0, 2401)
    plus, minus = (make_block(times, (x,), (), None).coherency[:, 0]
                   for x in ((train, later), mirrored((train, later))))
    np.testing.assert_array_equal(plus[:, :6], minus[:, :6])
    np.testing.assert_array_equal(plus[:, 6:], -minus[:, 6:])
    assert all(np.abs(plus[round(t * 40), 8]) > 1.0 for t in (2.0, 16.0, 30.0, 50.0))


def test_every_exposed_pulse_is_mirrored_in_one_plane():
    pulses = (
        pulse(ellipticity=0.5, azimuth=0.4, turning=(1.0, 0.3), direction=(0, 1, 1)),
        pulse(ellipticity=-0.3, azimuth=1.7, turning=(-2.0, 0.0), phase=0.6, direction=(0, 1, 1),
              centre=2.6, carrier=9.0),
        pulse(ellipticity=0.7, azimuth=0.2, turning=(0.5, 0.1), phase=1.0, direction="x"),
        pulse(ellipticity=0.2, azimuth=0.9, direction=(0, -1, -1)),
    )
    mirror, images = reflection(pulses[0]), mirrored(pulses)
    for p, image in zip(pulses, images, strict=True):
        np.testing.assert_allclose(group_amplitude([image], TIMES),
                                   group_amplitude([p], TIMES) @ mirror, atol=1e-13)
        np.testing.assert_allclose(resolved_field([image], TIMES)[0],
                                   resolved_field([p], TIMES)[0] @ mirror, atol=1e-13)
        assert (image.phase, image.amplitude, image.centre) == (p.phase, p.amplitude, p.centre)
        assert image.s3 == pytest.approx(-p.s3)
    total, image = (group_amplitude(x, TIMES) for x in (pulses, images))
    np.testing.assert_allclose(np.sum(np.abs(total) ** 2, axis=1),
                               np.sum(np.abs(image) ** 2, axis=1), rtol=1e-12)


def test_mirror_of_the_mirror_is_the_light_as_written():
    pulses = (pulse(azimuth=0.3), pulse(azimuth=1.0, ellipticity=0.1), pulse(direction="x"))
    twice = mirrored(mirrored(pulses))
    np.testing.assert_allclose(group_amplitude(twice, TIMES), group_amplitude(pulses, TIMES),
                               atol=1e-14)


def test_parameters_of_the_mirror():
    first, second = mirrored((
        pulse(ellipticity=pi / 4, azimuth=0.3, turning=(1.0, 2.0)), pulse(azimuth=1.0)))
    assert (first.ellipticity, first.azimuth, first.turning) == (-pi / 4, 0.3, (-1.0, -2.0))
    assert second.azimuth == pytest.approx(2 * 0.3 - 1.0)


def test_probes_stay_in_every_kind():
    probe = pulse(in_kinds="same", direction="x")
    pulses = (probe, pulse())
    assert exposed(pulses) == pulses[1:]
    assert mirrored(pulses)[0] is probe and mirrored(pulses)[1].ellipticity == -pi / 4
    assert dark(pulses) == (probe,)
    assert mirrored((probe,)) == (probe,)


def test_a_probe_has_the_same_bits_in_every_kind():
    """Averaged beside the exposed pulse, where that is over; resolved, as a colour of its own."""
    pump = pulse(carrier=2000.0, ellipticity=0.5, azimuth=0.3, phase=0.8)
    probe = pulse(carrier=2004.0, in_kinds="same", centre=20.0, direction="x", phase=0.2)
    wave = pulse(in_kinds="same", coupling="resolved", centre=3.0)
    blocks = []
    for change in (lambda pulses: pulses, mirrored, dark):
        seen = change((pump, probe, wave))
        averaged = tuple(p for p in seen if p.coupling == "averaged")
        blocks.append(make_block(np.linspace(0, 25, 1001), (averaged,), ((seen[-1],),), None))
    plus, minus, unlit = blocks
    late = plus.times > 9.0  # the exposed pulse is over
    for other in (minus, unlit):
        np.testing.assert_array_equal(plus.coherency[late], other.coherency[late])
        np.testing.assert_array_equal(plus.wave, other.wave)
    assert plus.coherency[late].any() and plus.wave.any()
    assert not np.array_equal(plus.coherency, minus.coherency)


def test_only_resolved_carriers_are_shifted():
    averaged, resolved = pulse(phase=0.5), pulse(phase=0.5, coupling="resolved")
    shifted = with_phase((averaged, resolved), pi)
    assert shifted[0] is averaged
    np.testing.assert_allclose(resolved_field([shifted[1]], TIMES)[0],
                               -resolved_field([resolved], TIMES)[0], atol=1e-13)
