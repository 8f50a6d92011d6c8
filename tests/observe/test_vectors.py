"""Recorded vectors: definitions by hand, and the units of the file."""

import numpy as np
import pytest
from scipy import constants

from swirlight.light.light import Light
from swirlight.light.pulse import Bias
from swirlight.motion.step import Mover
from swirlight.observe.vectors import VECTORS, chosen, wrapped
from tests.motion.bodies import body, still, system, thermal
from tests.motion.sources import Springs
from tests.motion.test_light import MIXTURE, PULSES

BIAS = Bias((3.0, -8.0, 20.0))


@pytest.fixture(scope="module")
def scene():
    bodies = system(*MIXTURE)
    state = thermal(bodies)
    mover = Mover(bodies, Springs(bodies), Light(bodies, PULSES, BIAS), 0.002)
    mover.begin(state, 0.8)
    return bodies, state, mover.load


def test_every_vector_has_its_shape_and_is_a_copy(scene):
    bodies, state, load = scene
    for vector in VECTORS.values():
        value = vector.sample(bodies, state, load)
        assert value.shape == (bodies.bodies, *vector.shape)
        assert np.isfinite(value).all()
        assert value.dtype == (np.int32 if vector.integer else np.float64)
        for array in (state.position, state.velocity, state.orientation, state.angular_momentum):
            assert not np.shares_memory(value, array)


def test_units_of_the_file():
    """Names and units as the file format fixes them."""
    units = {name: vector.unit for name, vector in VECTORS.items()}
    assert units == {
        "position": "nm", "image": None, "velocity": "nm ps-1", "force": "kJ mol-1 nm-1",
        "torque": "kJ mol-1", "light_torque": "kJ mol-1",
        "angular_momentum": "g mol-1 nm+2 ps-1", "angular_velocity": "rad ps-1",
        "orientation": None, "axes": None, "dipole": "C m",
    }


def test_torques_and_forces_of_all_causes(scene):
    bodies, state, load = scene
    pair = Springs(bodies).evaluate(state.position, state.orientation, state.box)
    light = load.light
    # kJ/mol from u nm²/ps² by way of SI: 1 u (nm/ps)² = 1e6 u J
    kj = constants.atomic_mass * 1e6 * constants.N_A / 1e3
    torque = VECTORS["torque"].sample(bodies, state, load)
    assert np.allclose(torque, kj * (pair.torque + light.torque + light.bias_torque), rtol=1e-12)
    force = VECTORS["force"].sample(bodies, state, load)
    assert np.allclose(force, kj * (pair.force + light.force + light.bias_force), rtol=1e-12)
    own = VECTORS["light_torque"].sample(bodies, state, load)
    assert np.allclose(own, kj * light.torque, rtol=1e-12)
    assert np.abs(own).max() > 0.1


def test_axes_are_rows_and_turn_with_the_body():
    bodies = system((body((0.1, 0.2, 0.28)), 1))
    state = still(bodies)
    half = np.sqrt(0.5)
    state.orientation[0] = half, 0, 0, half  # 90° about z: body x along lab y
    axes = VECTORS["axes"].sample(bodies, state, None)[0]
    assert np.allclose(axes, [[0, 1, 0], [-1, 0, 0], [0, 0, 1]], atol=1e-15)


def test_dipole_in_coulomb_metres():
    bodies = system((body((0.1, 0.2, 0.28), dipole=(0.05, 0, 0)), 1))
    state = still(bodies)
    half = np.sqrt(0.5)
    state.orientation[0] = half, 0, 0, half
    dipole = VECTORS["dipole"].sample(bodies, state, None)[0]
    assert np.allclose(dipole, [0, 0.05e-9 * constants.e, 0], rtol=1e-12, atol=1e-40)


def test_angular_velocity_is_that_of_the_moving_axes():
    """ω×u is the rate of each axis, taken from two short free drifts."""
    bodies = system((body((0.1, 0.2, 0.28)), 6), (body((0.3, 0.3, 0)), 2))
    state = thermal(bodies)
    omega = VECTORS["angular_velocity"].sample(bodies, state, None)
    turned = []
    for h in (1e-5, -1e-5):
        later = state.copy()
        mover = Mover(bodies, None, None, h)
        mover.begin(later)
        mover.advance(later)
        turned.append(VECTORS["axes"].sample(bodies, later, None))
    rate = (turned[0] - turned[1]) / 2e-5
    axes = VECTORS["axes"].sample(bodies, state, None)
    expected = np.cross(omega[:, None, :], axes)
    assert np.allclose(rate[:6], expected[:6], atol=1e-5)
    assert np.allclose(rate[6:, 2], expected[6:, 2], atol=1e-5)  # linear: its axis


def test_wrapping_keeps_the_place():
    box = np.array([2.0, 3.0, 5.0])
    position = np.array([[0.5, -0.25, 12.0], [-1e-19, 3.0, -5.0], [2.0, 8.9999, 0.0]])
    inside, image = wrapped(position, box)
    assert (inside >= 0).all()
    assert (inside < box).all()
    assert np.allclose(inside + image * box, position, atol=1e-15)
    assert image.tolist() == [[0, -1, 2], [0, 1, -1], [1, 2, 0]]


def test_choice_brings_companions_and_keeps_order():
    names = [v.name for v in chosen(["torque", "position", "torque"])]
    assert names == ["torque", "position", "image"]
    with pytest.raises(KeyError):
        chosen(["colour"])
