"""Twins with several carrier phases: what their mean takes out of the response of lone dipoles."""

from types import SimpleNamespace

import numpy as np
import pytest

from swirlight.light.envelope import Gaussian
from swirlight.light.light import Light
from swirlight.light.pulse import Pulse
from swirlight.motion.step import Mover
from swirlight.run.exposures import list_exposures

from .bodies import body, system, thermal

CARRIER = 12.0  # rad/ps
TIMESTEP, STEPS = 0.005, 800
AMPLITUDE = 0.3  # u nm/ps²/e; μE is some 0.01 kT


def pulse(amplitude, **options):
    return Pulse(CARRIER, amplitude, Gaussian(0.6), centre=2.0, azimuth=0.3, phase=0.4,
                 coupling="resolved", **options)


def config(phases):
    return SimpleNamespace(exposures=SimpleNamespace(
        kinds=("plus", "minus", "dark"), starts=1, carrier_phases=phases))


def responses(amplitude, phases):
    """Kind -> (phases, steps, bodies, 3) angular momenta, lit less dark, of lone tops."""
    bodies = system((body((0.2, 0.3, 0.45), dipole=(0.03, 0.02, 0.05)), 12))
    start, light = thermal(bodies, seed=4), (pulse(amplitude),)
    start.angular_momentum *= 0.2  # turning slowly, none of them near twice the carrier
    found = {}
    for exposure in list_exposures(config(phases), light):
        state = start.copy()
        mover = Mover(bodies, None, Light(bodies, exposure.light(light)), TIMESTEP,
                      remove_momentum=False)
        mover.begin(state)
        rows = []
        for _ in range(STEPS):
            mover.advance(state)
            rows.append(state.angular_momentum.copy())
        found.setdefault(exposure.kind, []).append(rows)
    dark = np.array(found.pop("dark"))
    assert dark.shape[0] == 1  # no carrier, no phase
    return {kind: np.array(rows) - dark for kind, rows in found.items()}


def size(rows):
    return np.sqrt(np.mean(np.square(rows)))


@pytest.mark.parametrize("kind", ["plus", "minus"])
def test_opposite_phases_take_out_what_is_odd_in_the_field(kind):
    weak, strong = (responses(a, 2)[kind] for a in (AMPLITUDE, 2 * AMPLITUDE))
    assert size(strong[0]) / size(weak[0]) == pytest.approx(2, rel=0.02)  # first order
    assert np.allclose(weak[0], -weak[1], atol=0.05 * np.abs(weak[0]).max())
    means = weak.mean(axis=0), strong.mean(axis=0)
    assert size(means[1]) / size(means[0]) == pytest.approx(4, rel=0.02)  # second order
    assert size(means[0]) < 0.02 * size(weak[0])


def test_four_phases_take_out_the_terms_at_twice_the_carrier():
    """The torque at second order swings at 2ω; its mean over a quarter turn of phase does not."""
    found = responses(AMPLITUDE, 4)["plus"]
    pair, four = found[::2].mean(axis=0), found.mean(axis=0)
    assert np.allclose(found[1::2].mean(axis=0) - four, -(pair - four), atol=1e-15)
    spectrum = {}
    for name, rows in (("pair", pair), ("four", four)):
        torque = np.diff(rows, axis=0)  # in light of a Gaussian shape: no window is needed
        waves = np.exp(2j * CARRIER * TIMESTEP * np.arange(len(torque)))
        spectrum[name] = np.abs(np.einsum("t,tnk->nk", waves, torque))
    assert size(spectrum["four"]) < 0.05 * size(spectrum["pair"])
