"""A chiral liquid and its mirror image in mirrored light: one physics, seen in a mirror."""

from dataclasses import replace

import numpy as np
import pytest

from swirlight.forces.field import ForceField
from swirlight.light.envelope import Gaussian
from swirlight.light.exposure import mirrored
from swirlight.light.light import Light
from swirlight.light.pulse import Bias, Pulse
from swirlight.motion.draw import draw_motion
from swirlight.motion.step import Mover
from swirlight.rotation import rotation_matrix
from swirlight.species.body import OpticalResponse
from swirlight.species.library import load_species
from swirlight.state import State
from swirlight.system import Interactions, System
from tests.reference.samples import lattice, without_overlap

COUNT, EDGE = 18, 2.0
MIRROR = np.diag([1.0, -1.0, 1.0])  # the plane of the beam, z, and the azimuth axis, x
SCALE = 2e-6  # e² ps²/u, of the invented responses


def response():
    """Everything there is, without any symmetry."""
    a, d, k = np.random.default_rng(3).normal(size=(3, 3, 3))
    return OpticalResponse(None, SCALE * (a + a.T), 0.3 * SCALE * d @ d.T,
                           SCALE * np.array([0.6, -0.9, 1.2]), 1e-6 * SCALE * k)


def image_of(species):
    """The mirror image, y of its frame turned over: true tensors keep, axial ones change sign."""
    flip = MIRROR
    own = species.responses[0]
    seen = OpticalResponse(
        None, flip @ own.polarizability @ flip, flip @ own.absorptive @ flip,
        -flip @ own.gyration, -flip @ own.rectification @ flip)
    return replace(species, sites=species.sites @ flip, responses=(seen,))


def reflected(state):
    """State of the images: orientation M R M, polar vectors M v, axial ones −M v."""
    return State(
        position=state.position @ MIRROR,
        # M R M with M = diag(1, −1, 1) turns the axis of a rotation as an axial vector
        orientation=state.orientation * [1.0, -1.0, 1.0, -1.0],
        velocity=state.velocity @ MIRROR, angular_momentum=-state.angular_momentum @ MIRROR,
        box=state.box,
    )


def pulses():
    """Averaged and resolved, along two beams, elliptic, turning; the first gives the plane."""
    given = {"amplitude": 1e3, "envelope": Gaussian(0.05), "centre": 0.02, "azimuth": 0.0}
    return (
        Pulse(2000.0, ellipticity=0.5, turning=(5.0, 2.0), **given),
        Pulse(2003.0, ellipticity=-0.3, **{**given, "azimuth": 0.9, "centre": 0.03}),
        Pulse(60.0, ellipticity=0.6, coupling="resolved", phase=0.4,
              **{**given, "amplitude": 300.0, "azimuth": 2.0}),
        Pulse(2900.0, ellipticity=0.4, direction=(0.48, 0.6, -0.64),
              **{**given, "azimuth": 0.3}),
    )


BIAS = (150.0, -80.0, 120.0)


@pytest.fixture(scope="module")
def pair():
    """(system, state, light) of a chiral liquid, and of its image in mirrored light."""
    kind = replace(load_species("corkscrew"), responses=(response(),))
    # splitting and mesh by hand: chosen ones follow draws that are not the image's images
    settings = Interactions(0.9, precision="double", splitting=3.5, mesh_order=6,
                            mesh_spacing=0.12)
    system, image = (System((s,), (COUNT,), settings, 300.0) for s in (kind, image_of(kind)))
    random, box = np.random.default_rng(8), EDGE * np.array([1.0, 1.05, 0.97])
    place = lattice(random, COUNT, box, 0.05)
    state = State(place, without_overlap(random, system, place, box), np.zeros((COUNT, 3)),
                  np.zeros((COUNT, 3)), box, random=random)
    draw_motion(system, state)
    return (
        (system, state, Light(system, pulses(), Bias(BIAS))),
        (image, reflected(state), Light(image, mirrored(pulses()), Bias(tuple(MIRROR @ BIAS)))),
    )


def begun(system, state, light):
    mover = Mover(system, ForceField(system, state.box), light, 0.001)
    mover.begin(state)
    for _ in range(20):
        mover.advance(state)
    return mover


def test_the_reflected_state_is_the_reflection(pair):
    (system, state, _), (image, seen, _) = pair
    assert np.allclose(rotation_matrix(seen.orientation),
                       MIRROR @ rotation_matrix(state.orientation) @ MIRROR, atol=1e-14)
    # chiral: no rotation brings the sites of the image onto those of the body
    a, b = system.species[0].sites, image.species[0].sites
    u, _, v = np.linalg.svd(a.T @ b)
    turn = u @ np.diag([1, 1, np.linalg.det(u @ v)]) @ v
    assert np.abs(a @ turn - b).max() > 0.02


def test_same_energies_and_mirrored_forces_and_torques(pair):
    found = [begun(system, state.copy(), light).load for system, state, light in pair]
    load, seen = found
    scale = {name: np.abs(getattr(load, name)).max() for name in ("force", "torque")}
    assert np.allclose(seen.force, load.force @ MIRROR, rtol=0, atol=1e-10 * scale["force"])
    assert np.allclose(seen.torque, -load.torque @ MIRROR, rtol=0, atol=1e-10 * scale["torque"])
    light = load.light_torque
    assert np.abs(light).max() > 0.1 * scale["torque"]
    assert np.allclose(seen.light_torque, -light @ MIRROR, rtol=0,
                       atol=1e-10 * np.abs(light).max())
    for name, value in load.field.terms.items():
        assert seen.field.terms[name] == pytest.approx(value, rel=1e-10), name
    for name in ("energy", "virial", "light_energy", "bias_energy", "absorbed_power"):
        assert getattr(seen, name) == pytest.approx(getattr(load, name), rel=1e-9), name
    assert np.allclose(seen.light_sums.rectified_dipole,
                       MIRROR @ load.light_sums.rectified_dipole, rtol=1e-9)


def test_the_motion_stays_mirrored(pair):
    ends = []
    for system, start, light in pair:
        state = start.copy()
        ends.append((state, begun(system, state, light).ledger, start))
    (state, ledger, start), (seen, seen_ledger, _) = ends
    assert np.abs(state.angular_momentum - start.angular_momentum).max() > 0.1
    mirror = reflected(state)
    for name in ("position", "orientation", "velocity", "angular_momentum"):
        own, other = getattr(mirror, name), getattr(seen, name)
        assert np.allclose(other, own, rtol=0, atol=1e-10 * np.abs(own).max()), name
    for name in ("light_work", "bias_work", "absorbed_energy"):
        assert getattr(seen_ledger, name) == pytest.approx(getattr(ledger, name), rel=1e-8)
    for name in ("light_impulse", "pair_impulse", "bias_impulse"):
        own = -MIRROR @ getattr(ledger, name)
        assert np.allclose(getattr(seen_ledger, name), own, atol=1e-8 * np.abs(own).max())


def test_unmirrored_light_tells_the_two_apart(pair):
    (system, state, _), (image, seen, _) = pair
    light = Light(image, pulses(), Bias(tuple(MIRROR @ BIAS)))
    load, other = (begun(s, x.copy(), y).load for s, x, y in
                   ((system, state, pair[0][2]), (image, seen, light)))
    assert not np.allclose(other.light_torque, -load.light_torque @ MIRROR,
                           rtol=0, atol=1e-2 * np.abs(load.light_torque).max())
