"""Averaged or resolved, steps per cycle, which pulses beat, which response is used."""

from dataclasses import replace
from math import pi, sqrt

import numpy as np
import pytest

from swirlight.errors import InputError
from swirlight.light.envelope import Gaussian
from swirlight.light.pulse import Pulse
from swirlight.light.regime import (
    beating_groups,
    beats,
    check_steps,
    choose_coupling,
    rotation_rate,
)
from swirlight.light.response import choose_response, free_axes, optics_table
from swirlight.species.body import ATOM, GENERAL, LINEAR
from swirlight.units import BOLTZMANN, LIGHT_SPEED
from tests.light.bodies import response, sample, species

TOP = sample(species(response()))
ATOMS = sample(species(response(), freedom=ATOM))
RATE = sqrt(BOLTZMANN * 300.0 / 0.02)


def pulse(**parts):
    given = {"carrier": 2000.0, "amplitude": 3.0, "envelope": Gaussian(1.0), "centre": 2.0}
    return Pulse(**{**given, **parts})


def test_fastest_rotation_is_that_of_the_smallest_moment():
    assert rotation_rate(TOP) == pytest.approx(RATE)
    assert rotation_rate(ATOMS) == 0.0
    mixed = sample(species(freedom=LINEAR), species(freedom=ATOM))
    assert rotation_rate(mixed) == pytest.approx(sqrt(BOLTZMANN * 300.0 / 0.03))


def test_auto_averages_from_twenty_cycles_in_a_rotation():
    assert choose_coupling("auto", 20.001 * RATE, TOP)[0] == "averaged"
    kind, reason = choose_coupling("auto", 19.99 * RATE, TOP)
    assert kind == "resolved" and "thermal rotation" in reason and "fewer than 20" in reason
    assert choose_coupling("auto", 0.1, ATOMS)[0] == "averaged"
    kind, reason = choose_coupling("auto", 30 * RATE, TOP, libration=2 * RATE)
    assert kind == "resolved" and "libration" in reason
    assert choose_coupling("auto", 30 * RATE, TOP, libration=0.5 * RATE)[0] == "averaged"
    for asked in ("averaged", "resolved"):
        assert choose_coupling(asked, 1.0, TOP) == (asked, "as asked")
    with pytest.raises(InputError, match="there are auto"):
        choose_coupling("both", 1.0, TOP)


def test_steps_per_cycle():
    wave = pulse(carrier=2 * pi, coupling="resolved")  # 1 ps
    assert check_steps(wave, 0.025) is None
    assert "40" in check_steps(wave, 0.026)
    assert check_steps(wave, 0.05) is not None
    with pytest.raises(InputError, match=r"longest timestep is 50 fs"):
        check_steps(wave, 0.051)
    assert check_steps(pulse(), 99.0) is None


def test_pulses_beat_up_to_twenty_fastest_rotations():
    near, far = pulse(carrier=2000.0 + 19 * RATE), pulse(carrier=2000.0 + 50 * RATE)
    assert beating_groups((pulse(), far, near), TOP) == ((pulse(), near), (far,))
    # a third between two joins them
    between = pulse(carrier=2000.0 + 34 * RATE)
    assert len(beating_groups((pulse(), far, near, between), TOP)) == 1
    assert [b[3] for b in beats((pulse(), far, near), TOP)] == [False, True, False]
    assert beats((pulse(), far), TOP)[0][2] == pytest.approx(50 * RATE)
    # atoms do not turn: only equal carriers
    assert len(beating_groups((pulse(), near, pulse()), ATOMS)) == 2
    assert beating_groups((replace(near, coupling="resolved"),), TOP) == ()


def blocks(*wavelengths):
    at = [None if w is None else 2 * pi * LIGHT_SPEED / w for w in wavelengths]
    return species(*(response(seed=n, at=a) for n, a in enumerate(at)))


def carrier(wavelength):
    return 2 * pi * LIGHT_SPEED / wavelength


def test_response_is_chosen_by_its_wavelength():
    two = blocks(800.0, 532.0)
    assert choose_response(two, carrier(790.0)) == (two.responses[0], None)
    assert choose_response(two, carrier(500.0)) == (two.responses[1], None)
    block, warning = choose_response(two, carrier(620.0))
    assert block is two.responses[1] and "532 nm" in warning and "620 nm" in warning
    with pytest.raises(InputError, match="factor of 2"):
        choose_response(two, carrier(1700.0))
    fallback = blocks(800.0, None)
    block, warning = choose_response(fallback, carrier(1700.0))
    assert block is fallback.responses[1] and "names no wavelength" in warning
    assert choose_response(fallback, carrier(1000.0))[0] is fallback.responses[0]
    assert not choose_response(blocks(), carrier(800.0))[0].polarizability.any()


def test_resolved_light_takes_only_the_polarizability_of_a_far_wavelength():
    one = blocks(800.0)
    block, warning = choose_response(one, 2 * pi, resolved=True)
    np.testing.assert_array_equal(block.polarizability, one.responses[0].polarizability)
    assert not block.absorptive.any() and not block.gyration.any()
    assert "1 THz" in warning and "alone" in warning


def test_each_colour_has_its_own_rows():
    system = sample(blocks(800.0, 400.0), species(response(seed=5)))
    table, warnings = optics_table(system, [(pulse(carrier=carrier(400.0)),),
                                            (pulse(carrier=carrier(800.0)),)])
    assert table.shape == (2, 2, 24)
    np.testing.assert_array_equal(table[0, 0, :3],
                                  np.diag(system.species[0].responses[1].polarizability))
    np.testing.assert_array_equal(table[0, 1], table[1, 1])
    assert len(warnings) == 2  # the second species names no wavelength, for either colour


def test_axes_that_take_torque():
    kinds = [species(freedom=f) for f in (GENERAL, LINEAR, ATOM)]
    np.testing.assert_array_equal(free_axes(sample(*kinds)),
                                  [[1, 1, 1], [1, 1, 0], [0, 0, 0]])
