"""SPC/E water in bulk: energy that stays, energy per molecule. Long; `pytest -m slow -s`.

Drift is the slope of the total energy per molecule over time in NVE, by least squares over
blocks; its error comes from the scatter of the blocks about the line.
"""

from dataclasses import replace

import numpy as np
import pytest

from swirlight.forces.field import ForceField
from swirlight.light.build import pulses_from_config
from swirlight.light.light import Light
from swirlight.motion.draw import draw_motion, draw_orientations
from swirlight.motion.energy import kinetic_energies
from swirlight.motion.step import Mover
from swirlight.motion.thermostats import make_thermostat
from swirlight.run.arrange import lattice_positions, remove_overlaps
from swirlight.species.library import load_species
from swirlight.state import State
from swirlight.system import Interactions, System
from swirlight.units import BOLTZMANN, KJ_PER_MOL
from tests.motion.bodies import response
from tests.motion.test_light import ALPHA_S, optical

DENSITY = 0.998 / 18.015 * 602.214076  # molecules per nm³ at 0.998 g/cm³
TEMPERATURE = 298.0
KT = BOLTZMANN * TEMPERATURE
SIZES = {216: 0.9, 1000: 0.9}  # molecules: cutoff [nm]
FORMS = {"double": {"precision": "double", "tolerance": 1e-6}, "default": {}}


def water(molecules, **settings):
    interactions = Interactions(SIZES[molecules], **settings)
    return System((load_species("water"),), (molecules,), interactions, TEMPERATURE)


@pytest.fixture(scope="session")
def settled():
    """Number of molecules -> an equilibrated State, made once."""
    made = {}

    def get(molecules):
        if molecules not in made:
            made[molecules] = equilibrate(molecules)
        return made[molecules].copy()

    return get


def equilibrate(molecules, length=30.0, timestep=0.002):
    system = water(molecules)
    box = np.full(3, (molecules / DENSITY) ** (1 / 3))
    random = np.random.default_rng(2024)
    state = State(lattice_positions(molecules, box, random), draw_orientations(molecules, random),
                  np.zeros((molecules, 3)), np.zeros((molecules, 3)), box, random=random)
    field = ForceField(system, box)
    remove_overlaps(system, state, field)
    draw_motion(system, state)
    mover = Mover(system, field, None, timestep, make_thermostat(system, "langevin", 5.0))
    mover.begin(state)
    for _ in range(round(length / timestep)):
        mover.advance(state, energies=False)
    return state


def residuals(system, state, timestep, length, every=0.02, light=None):
    """Energy residual per molecule [kT] and its times [ps] along an NVE trajectory."""
    mover = Mover(system, ForceField(system, state.box), light, timestep)
    mover.begin(state)
    stride = round(every / timestep)
    rows = []
    for step in range(1, round(length / timestep) + 1):
        mover.advance(state, energies=step % stride == 0)
        if step % stride == 0:
            rows.append(mover.energy_residual(state))
    times = every * np.arange(1, len(rows) + 1)
    return times, np.array(rows) / (KT * system.bodies)


def drift(times, energy, blocks=20):
    """(slope, standard error) of block means against time. [per unit of time]"""
    size = len(times) // blocks
    t = times[: size * blocks].reshape(blocks, size).mean(axis=1)
    e = energy[: size * blocks].reshape(blocks, size).mean(axis=1)
    t0 = t - t.mean()
    slope = (t0 @ e) / (t0 @ t0)
    rest = e - e.mean() - slope * t0
    return slope, np.sqrt(rest @ rest / (blocks - 2) / (t0 @ t0))


@pytest.mark.slow
@pytest.mark.parametrize("form", FORMS)
@pytest.mark.parametrize("molecules", SIZES)
def test_total_energy_does_not_drift(settled, table, molecules, form):
    system = water(molecules, **FORMS[form])
    times, energy = residuals(system, settled(molecules), 0.002, 120.0)
    slope, error = (1000.0 * x for x in drift(times, energy))  # per ns
    table(f"NVE drift, {molecules} SPC/E, {form}, 2 fs, 120 ps",
          f"{slope:+.4f} ± {error:.4f} kT/molecule/ns", "|drift| ≤ 0.01, error ≤ 0.005")
    assert error <= 0.005 and abs(slope) <= 0.01


@pytest.mark.slow
@pytest.mark.parametrize("mesh_every", [2, 3])
@pytest.mark.parametrize("lit", [False, True], ids=["dark", "lit"])
def test_energy_with_a_mesh_that_acts_less_often(settled, table, mesh_every, lit):
    """Dark, and in an averaged pulse that acts through an invented polarizability."""
    kind = replace(load_species("water"), responses=(response(ALPHA_S),))
    system = replace(water(216, mesh_every=mesh_every), species=(kind,))
    light = Light(system, (optical(3e12, 0.5, 2.0),)) if lit else None
    times, energy = residuals(system, settled(216), 0.002, 120.0, every=0.024, light=light)
    slope, error = (1000.0 * x for x in drift(times, energy))
    table(f"NVE drift, 216 SPC/E, mesh every {2 * mesh_every} fs, {'lit' if lit else 'dark'}",
          f"{slope:+.4f} ± {error:.4f} kT/molecule/ns, rms {energy.std():.1e} kT",
          "|drift| ≤ 0.01, error ≤ 0.005")
    assert error <= 0.005 and abs(slope) <= 0.01


@pytest.mark.slow
def test_fluctuation_falls_with_the_square_of_the_step(settled, table):
    system, rms = water(216, **FORMS["double"]), {}
    for timestep in (0.004, 0.002, 0.001):
        _, energy = residuals(system, settled(216), timestep, 12.0)
        rms[timestep] = energy.std()
    steps = np.log(list(rms))
    exponent = np.polyfit(steps, np.log(list(rms.values())), 1)[0]
    table("rms of the total energy, 216 SPC/E, 4 to 1 fs",
          f"{', '.join(f'{x:.2e}' for x in rms.values())} kT/molecule: exponent {exponent:.3f}",
          "2 ± 0.2")
    assert abs(exponent - 2.0) <= 0.2


class Pulse:
    """A resolved terahertz pulse, as a config's section gives it."""

    carrier, duration, peak_intensity, helicity = 2 * np.pi, 1.0, 3e9, 1
    centre = 3.0


@pytest.mark.slow
def test_ledger_holds_in_a_pulse(settled, table):
    system = water(216, **FORMS["double"])
    light = Light(system, pulses_from_config([Pulse], system))
    times, energy = residuals(system, settled(216), 0.002, 120.0, light=light)
    slope, error = (1000.0 * x for x in drift(times, energy))
    table("ledger residual in a 1 THz pulse, 216 SPC/E, double",
          f"{slope:+.4f} ± {error:.4f} kT/molecule/ns, rms {energy.std():.1e} kT",
          "|drift| ≤ 0.01, error ≤ 0.005")
    assert error <= 0.005 and abs(slope) <= 0.01


@pytest.mark.slow
@pytest.mark.published
def test_pair_energy_of_liquid_water(settled, table):
    """−46.6 kJ/mol (from memory): −41.4 of Berendsen, Grigera & Straatsma, J. Phys. Chem. 91,
    6269 (1987), at 306 K, less their polarisation correction of 5.22. Here 298 K, mesh Ewald
    (conducting), Lennard-Jones switched over 0.81–0.90 nm with its tail."""
    system, state = water(216), settled(216)
    mover = Mover(system, ForceField(system, state.box), None, 0.002,
                  make_thermostat(system, "langevin", 2.0))
    mover.begin(state)
    energies, kelvin = [], []
    for step in range(1, 100_001):
        sampled = step % 25 == 0
        mover.advance(state, energies=sampled)
        if sampled:
            energies.append(mover.load.energy / KJ_PER_MOL / 216)
            kelvin.append(2 * sum(kinetic_energies(system, state)) / BOLTZMANN
                          / mover.freedom.total)
    blocks = np.array(energies).reshape(20, -1).mean(axis=1)
    mean, error = blocks.mean(), blocks.std(ddof=1) / np.sqrt(20)
    table("pair energy of SPC/E, 216, 298 K, 0.998 g/cm³, 200 ps",
          f"{mean:.3f} ± {error:.3f} kJ/mol at {np.mean(kelvin):.1f} K", "-46.6 ± 0.3")
    assert abs(mean + 46.6) <= 0.3
