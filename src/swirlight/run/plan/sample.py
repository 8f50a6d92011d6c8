"""Parts of `check` about the bodies and their box: sizes, thermal rotation, quantum limits."""

import math

import numpy as np

from swirlight.run.plan.figures import kinetic_heat_capacity, quantum_rotation, rotation_periods
from swirlight.run.plan.page import Notice, Row, Section, quantity
from swirlight.species.body import ATOM
from swirlight.units import HBAR, LIGHT_SPEED

QUANTUM = 0.05  # of ħ²/(2IkT), warned of above


def sample(subject):
    """The box and what is in it."""
    system, box = subject.system, subject.box
    cutoff, volume = system.interactions.cutoff, float(np.prod(box))
    rows = [Row(s.name, n, "bodies", s.source) for s, n in subject.counted_species]
    rows += [Row("note", text) for s in system.species for text in s.notes]
    rows += [
        Row("bodies", system.bodies),
        Row("sites", len(system.type_of_site)),
        *(quantity(f"edge {a}", edge, "length") for a, edge in zip("xyz", box, strict=True)),
        quantity("density", system.mass.sum() / volume, "density"),
        Row("number density", system.bodies / volume, "/nm^3", "bodies"),
        quantity("temperature", system.temperature, "temperature"),
        quantity("kT", subject.energy, "energy"),
        quantity("cutoff", cutoff, "length", "between sites"),
        quantity("largest cutoff", 0.5 * min(box), "length", "half the shortest edge"),
        Row("smallest count", smallest_count(system.bodies, box, cutoff), "bodies",
            "for this cutoff at this density, in a box of this shape"),
    ]
    yield Section("sample", tuple(rows))
    if not (system.freedom > 0).any():
        yield Notice("only-atoms", "sample.species: only atoms, which have no orientation: light"
                                   " cannot turn anything here")


def smallest_count(bodies, box, cutoff):
    """Fewest bodies whose box, of the same shape and density, has no edge below 2 cutoffs."""
    return math.ceil(bodies * (2.0 * cutoff / min(box)) ** 3 * (1.0 - 1e-12))


def bodies(subject):
    """Each species as a rotor: moments, thermal periods, quantum rotation, dipole, heat."""
    for species, count in subject.counted_species:
        if count:
            yield from _body(species, subject.system.temperature)
    yield Section("limits of classical rotation", (
        Row("kT/h", subject.energy / HBAR / (2.0 * math.pi), "THz",
            "librations and carriers faster than this are quantum: classical torques and spectra"
            " are qualitative there. Librations are known after the run"),
        Row("kT/hc", subject.energy / (HBAR * 2.0 * math.pi * LIGHT_SPEED) * 1e7, "cm^-1"),
    ))


def _body(species, temperature):
    periods = rotation_periods(species.inertia, temperature)
    quanta = quantum_rotation(species.inertia, temperature)
    heat, heat_source = heat_capacity(species)
    rows = [quantity("mass", species.total_mass, "mass")]
    for axis, moment, period, quantum in zip("xyz", species.inertia, periods, quanta, strict=True):
        if moment > 0.0:
            rows += [
                quantity(f"moment {axis}", moment, "inertia"),
                quantity(f"thermal period {axis}", period, "time", "2π√(I/kT)"),
                Row(f"ħ²/2IkT {axis}", float(quantum), "", f"classical rotation wants < {QUANTUM}"),
            ]
    rows += [
        quantity("charge", species.total_charge, "charge"),
        quantity("dipole", np.linalg.norm(species.dipole), "dipole",
                 "about the centre of mass" if abs(species.total_charge) > 1e-9 else ""),
        quantity("heat capacity", heat, "heat capacity", heat_source),
    ]
    yield Section(f"body: {species.name}", tuple(rows))
    if species.freedom != ATOM and quanta.max() > QUANTUM:
        axes = ", ".join(f"{a} {q:.2g}" for a, q in zip("xyz", quanta, strict=True) if q > QUANTUM)
        yield Notice("quantum-rotation", f"{species.name}: ħ²/(2IkT) is {axes}, above {QUANTUM}:"
                                         " its rotation is only roughly classical")


def heat_capacity(species):
    """(C_V of a body [u nm²/ps²/K], its source in words)."""
    if species.heat_capacity is not None:
        return species.heat_capacity, species.heat_capacity_source
    return (kinetic_heat_capacity(species.freedom),
            "not given: the kinetic part alone, so that heating figures are upper bounds")

