"""A scene: one instant of a config, from Python."""

import numpy as np
import pytest

import swirlight as sw
from swirlight.errors import InputError
from swirlight.rotation import to_body
from swirlight.store.start import load_state
from tests.run.small import write_config


@pytest.fixture(scope="module")
def scene(tmp_path_factory):
    return sw.build(sw.load_config(write_config(tmp_path_factory.mktemp("config"))))


def test_arrays_may_be_assigned_and_the_box_too(scene):
    before = scene.evaluate()
    position, box = scene.state.position, scene.state.box
    scene.state.position, scene.state.box = position * 1.1, box * 1.1
    after = scene.evaluate()
    scene.state.position, scene.state.box = position, box
    assert after.energy != before.energy
    again = scene.evaluate()
    assert again.energy == before.energy and np.array_equal(again.force, before.force)


def test_energy_is_the_sum_of_its_terms_and_the_light_stays_outside(scene):
    dark, lit = scene.evaluate("0 ps"), scene.evaluate("0.25 ps")
    assert dark.energy == pytest.approx(sum(dark.terms.values()))
    assert lit.energy == dark.energy and lit.light_energy < 1e6 * dark.light_energy < 0
    np.testing.assert_allclose(lit.torque - lit.light_torque, dark.torque - dark.light_torque,
                               atol=1e-12)


def test_linear_bodies_may_be_turned_by_hand(scene, tmp_path):
    """Forces ask for no momenta; a start file keeps those that the new axes allow."""
    before = scene.state.orientation
    turned = np.roll(before, 1, axis=0)
    scene.state.orientation = turned
    try:
        assert np.isfinite(scene.evaluate().energy)
        scene.state.save(tmp_path / "turned.h5")
    finally:
        scene.state.orientation = before
    loaded = load_state(tmp_path / "turned.h5", scene.system)
    spin = to_body(turned, loaded.angular_momentum)
    expected = to_body(turned, scene.state.angular_momentum) * [1, 1, 0]  # z is the axis
    np.testing.assert_allclose(spin, expected, atol=1e-12)


def test_evaluating_moves_nothing(scene):
    before = {name: getattr(scene.state, name).copy() for name in scene.state.ARRAYS}
    scene.evaluate("0.1 ps")
    assert all(np.array_equal(before[name], getattr(scene.state, name)) for name in before)


def test_a_scene_saves_a_start_file_that_names_its_species(scene, tmp_path):
    scene.state.save(tmp_path / "mine.h5")
    loaded = load_state(tmp_path / "mine.h5", scene.system)
    assert np.array_equal(loaded.position, scene.state.position)


def test_a_box_made_too_small_is_refused(scene):
    box = scene.state.box
    scene.state.box = box * 0.5
    with pytest.raises(InputError, match="(?i)largest cutoff"):
        scene.evaluate()
    scene.state.box = box
