"""Water run backwards: 1000 steps, momenta reversed, 1000 steps, and it is where it began.

What keeps it from the last bit is rounding, which the liquid's own chaos multiplies by some
exp(10 t/ps): with steps of 1 fs it comes back to 1e-10 nm, with 2 fs, twice as long, to 1e-6.
"""

from dataclasses import replace

import numpy as np
import pytest

from swirlight.forces.field import ForceField
from swirlight.light.envelope import Gaussian
from swirlight.light.light import Light
from swirlight.light.pulse import Pulse, amplitude_of_intensity
from swirlight.motion.draw import draw_motion, draw_orientations
from swirlight.motion.step import Mover
from swirlight.motion.thermostats import make_thermostat
from swirlight.run.arrange import lattice_positions, remove_overlaps
from swirlight.species.library import load_species
from swirlight.state import State
from swirlight.system import Interactions, System

from .bodies import response
from .test_light import ALPHA_S

STEPS, TIMESTEP = 1000, 0.001
LENGTH = STEPS * TIMESTEP
SIZES = [pytest.param(64, 0.6, id="64"),
         pytest.param(216, 0.9, id="216", marks=pytest.mark.slow)]


def water(count, cutoff):
    """Liquid water at 0.998 g/cm³ and 298 K, settled for half a picosecond."""
    # an anisotropic polarizability, invented: light that acts, and neither αD nor g
    kind = replace(load_species("water"), responses=(response(ALPHA_S),))
    system = System((kind,), (count,), Interactions(cutoff, precision="double"), 298.0)
    box, random = np.full(3, (count / 33.36) ** (1 / 3)), np.random.default_rng(6)
    still = np.zeros((count, 3))
    state = State(lattice_positions(count, box, random), draw_orientations(count, random), still,
                  still.copy(), box, random=random)
    field = ForceField(system, box)
    remove_overlaps(system, state, field)
    draw_motion(system, state)
    mover = Mover(system, field, None, 0.001, make_thermostat(system, "langevin", friction=10.0))
    mover.begin(state)
    for _ in range(500):
        mover.advance(state, energies=False)
    return system, state


def pulses():
    """Two averaged pulses that beat, one of them turning, and a terahertz one."""
    given = {"envelope": Gaussian(0.2), "azimuth": 0.3}
    strong, weak = amplitude_of_intensity(8e12), amplitude_of_intensity(2e11)
    return (
        Pulse(2354.6, strong, centre=0.4, ellipticity=0.5, turning=(4.0, 3.0), **given),
        Pulse(2360.0, strong, centre=0.65, ellipticity=-0.2, phase=1.0, **given),
        Pulse(40.0, weak, centre=0.6, ellipticity=0.6, phase=0.7, coupling="resolved",
              direction=(0.6, 0.0, 0.8), **given),
    )


def reversed_in_time(pulse):
    """The pulse whose 𝓔 is 𝓔*(LENGTH − t), so that E(t) runs backwards."""
    rate, acceleration = pulse.turning
    return replace(pulse, centre=LENGTH - pulse.centre, ellipticity=-pulse.ellipticity,
                   phase=-pulse.phase, turning=(-rate, acceleration))


def travel(system, state, light):
    mover = Mover(system, ForceField(system, state.box), light, TIMESTEP)
    mover.begin(state)
    for _ in range(STEPS):
        mover.advance(state, energies=False)
    return mover


@pytest.mark.parametrize("count, cutoff", SIZES)
@pytest.mark.parametrize("lit, mesh_every", [(False, 1), (True, 1), (True, 2)],
                         ids=["dark", "lit", "lit, mesh every other step"])
def test_water_runs_backwards(count, cutoff, lit, mesh_every):
    system, start = water(count, cutoff)
    system = replace(system, interactions=replace(system.interactions, mesh_every=mesh_every))
    there, back = ((Light(system, light) if lit else None) for light in (
        pulses(), tuple(map(reversed_in_time, pulses()))))
    state = start.copy()
    mover = travel(system, state, there)
    start_velocity = start.velocity - system.mass @ start.velocity / system.mass.sum()
    assert np.abs(state.position - start.position).max() > 0.05
    if lit:
        assert abs(mover.ledger.light_work) > 1.0 * count  # of 7.4 kJ/mol of kinetic energy
    state.velocity *= -1
    state.angular_momentum *= -1
    travel(system, state, back)
    assert np.abs(state.position - start.position).max() <= 1e-8  # nm
    assert np.abs(state.orientation - start.orientation).max() <= 1e-7
    assert np.abs(state.velocity + start_velocity).max() <= 1e-6
    assert np.abs(state.angular_momentum + start.angular_momentum).max() <= 1e-7
