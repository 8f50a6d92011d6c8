"""From config sections to pulses."""

from math import pi, sqrt
from types import SimpleNamespace

import numpy as np
import pytest

from swirlight.errors import InputError
from swirlight.light.build import bias_from_config, pulses_from_config
from swirlight.light.envelope import FlatTop, Gaussian, RampedRectangle, SmoothTable, Table
from tests.light.bodies import response, sample, species

SYSTEM = sample(species(response()))


def one(**parts):
    """The pulse of one section with the required keys filled in."""
    given = {"carrier": 2350.0, "peak_intensity": 1e10, "duration": 1.0}
    section = SimpleNamespace(**{**given, **parts})
    return pulses_from_config([section], SYSTEM)[0]


def test_defaults():
    p = one()
    assert p.envelope == Gaussian(1.0) and p.centre == 2.5
    assert (p.ellipticity, p.azimuth, p.turning, p.phase) == (pi / 4, 0.0, (0.0, 0.0), 0.0)
    assert (p.direction, p.count, p.in_kinds) == ((0.0, 0.0, 1.0), 1, "exposed")
    assert p.coupling == "averaged" and p.refractive_index == 1.0 and p.local_factor == 1.0
    assert p.intensity == pytest.approx(1e10)
    assert pulses_from_config(None, SYSTEM) == ()


def test_every_key_arrives():
    p = one(
        envelope="flat-top", rise=0.2, centre=3.0, helicity=-1, azimuth=0.1, phase=0.2,
        turning=SimpleNamespace(rate=1.0, acceleration=-2.0), direction=(0.0, 3.0, 4.0),
        train=SimpleNamespace(count=3, period=10.0), refractive_index=1.4, in_kinds="same",
        local_field="lorentz", coupling="averaged",
    )
    assert p.envelope == FlatTop(1.0, 0.2) and p.centre == 3.0 and p.ellipticity == -pi / 4
    assert (p.azimuth, p.phase, p.turning) == (0.1, 0.2, (1.0, -2.0))
    np.testing.assert_allclose(p.direction, (0.0, 0.6, 0.8))
    assert (p.count, p.period, p.in_kinds, p.reason) == (3, 10.0, "same", "as asked")
    assert p.local_factor == pytest.approx((1.96 + 2) / 3)
    assert one(direction="-y").direction == (0.0, -1.0, 0.0)
    assert one(ellipticity=0.3).ellipticity == 0.3


def test_three_ways_to_say_how_strong():
    p = one(refractive_index=1.5)
    same = one(refractive_index=1.5, peak_intensity=None, fluence=p.fluence)
    assert same.amplitude == pytest.approx(p.amplitude, rel=1e-12)
    same = one(refractive_index=1.5, peak_intensity=None, peak_field=p.amplitude / sqrt(2))
    assert same.amplitude == pytest.approx(p.amplitude, rel=1e-12)
    for wrong in ({"peak_field": 1.0}, {"peak_intensity": None}):
        with pytest.raises(InputError, match=r"light\[0\]: one of peak_intensity"):
            one(**wrong)


def test_coupling_decides_the_form_of_the_envelope():
    assert isinstance(one(carrier=6.3, envelope="rectangle").envelope, RampedRectangle)
    table = ((0.0, 1.0, 2.0), (0.0, 1.0, 0.0))
    averaged = one(envelope="table", table=table)
    assert isinstance(averaged.envelope, Table) and averaged.centre == pytest.approx(1.0)
    resolved = one(envelope="table", table=table, carrier=6.3)
    assert isinstance(resolved.envelope, SmoothTable) and resolved.coupling == "resolved"
    assert resolved.centre == pytest.approx(1.0)


def test_fluence_of_a_resolved_rectangle_counts_its_ramps():
    p = one(carrier=6.3, envelope="rectangle", peak_intensity=None, fluence=0.01, duration=3.0)
    assert p.fluence == pytest.approx(0.01)


@pytest.mark.parametrize(
    ("parts", "message"),
    [
        ({"carrier": 6.3, "local_field": "lorentz"}, r"local_field: lorentz; only averaged"),
        ({"ellipticity": 0.8}, "between -45 deg and 45 deg"),
        ({"envelope": "flat-top"}, "rise: a flat-top"),
        ({"direction": "up"}, "direction: 'up'"),
        ({"coupling": "maybe"}, "there are auto"),
    ],
)
def test_what_does_not_go_together_is_refused_by_name(parts, message):
    with pytest.raises(InputError, match=r"light\[0\]: .*" + message):
        one(**parts)


def test_timestep_is_held_against_resolved_carriers():
    section = SimpleNamespace(carrier=2 * pi, peak_intensity=1e9, duration=1.0)
    stage = SimpleNamespace(timestep=0.06)
    with pytest.raises(InputError, match=r"light\[0\]: .*longest timestep is 50 fs"):
        pulses_from_config([section], SYSTEM, stage)
    stage.timestep = 0.002
    assert len(pulses_from_config([section], SYSTEM, stage)) == 1


def test_bias_field():
    assert bias_from_config(None) is None
    always = bias_from_config(SimpleNamespace(vector=(0, 0, 2.0), from_=None, to=None))
    assert always.always and always.vector == (0.0, 0.0, 2.0)
    timed = bias_from_config(SimpleNamespace(vector=(0, 0, 2.0), from_=1.0, to=5.0))
    assert (timed.begin, timed.end) == (1.0, 5.0)
