"""All forces between bodies: pairs, wave vectors, and the constants that go with them."""

from dataclasses import dataclass

import numpy as np

from swirlight.errors import InputError
from swirlight.forces import accuracy, corrections, sites
from swirlight.forces.ewald import DirectEwald
from swirlight.forces.laws import CoulombLaw
from swirlight.forces.mesh import MeshEwald
from swirlight.forces.pairs import PairForces

# A mesh of floats errs by 5e-7 of the rms force: too much below this tolerance.
FLOAT_MESH_TOLERANCE = 1e-5
NET_CHARGE = 1e-8  # of Σ|q|, what rounding may leave of a neutral box

TERMS = ("lennard_jones", "lennard_jones_tail", "coulomb_real", "coulomb_mesh", "coulomb_self",
         "coulomb_intramolecular", "reaction_field")


@dataclass
class Forces:
    """What the bodies feel. The arrays are the field's own and overwritten by its next call.

    force, torque : (N, 3), laboratory frame, torques about the centres.
    mesh_force, mesh_torque : (N, 3) what of it comes from the mesh, where
        `Interactions.mesh_every` > 1 and the mesh part was not left out; else None.
    energy : Σ of `terms`, or None where energies were not asked for.
    terms : name -> energy, the names of TERMS. [u nm²/ps²]
    virial : W = −dU/dlnλ when the centres scale with the box and bodies keep their size, with
        the tails; the pressure is N k T/V + W/3V. [u nm²/ps²]
    """

    force: np.ndarray
    torque: np.ndarray
    energy: float | None = None
    terms: dict[str, float] | None = None
    virial: float | None = None
    mesh_force: np.ndarray | None = None
    mesh_torque: np.ndarray | None = None


class ForceField:
    """Everything that acts between the bodies of a system in a periodic box.

    system : swirlight.system.System
    box : (3,) edges from which splitting and mesh are chosen; `evaluate` may be given another,
        for which both are kept. [nm]
    Raises InputError for an Ewald sum in a box that is not neutral, and what the pair forces
    refuse: a box too small for the cut-off.
    """

    def __init__(self, system, box):
        self.system = system
        box = np.array(box, float)
        self._charged = np.flatnonzero(system.site_charge)
        self.law = coulomb_law(system, box)
        self.pairs = PairForces(system, self.law, box)
        self.reciprocal = self._reciprocal(box) if self.law.kind == "ewald" else None
        self._type = system.type_of_site[self._charged].astype(np.int32)
        # Body i has charges first[i] … first[i + 1] − 1; none where only pairs count.
        self._first = np.searchsorted(self._charged, system.site_start).astype(np.int32)
        self._no_charges = np.zeros_like(self._first)
        self._place, self._push = np.empty((2, len(self._charged), 3))
        self._force, self._torque = np.empty((2, system.bodies, 3))
        # The part of the wave vectors has rows of its own where it does not act at every step.
        apart = self.reciprocal is not None and system.interactions.mesh_every > 1
        self._apart = np.empty((2, system.bodies, 3)) if apart else None
        self._freedom = system.freedom
        self._own = corrections.self_energy(system, self.law)
        self._inner = corrections.intramolecular_energy(system, self.law)
        # Both go as 1/V when only the box changes.
        self._tail_energy = corrections.tail_energy(system, box) * box.prod()
        self._tail_virial = corrections.tail_virial(system, box) * box.prod()
        self._drifts = (isinstance(self.reciprocal, MeshEwald)
                        or system.interactions.precision == "mixed")

    def _reciprocal(self, box):
        interactions, charge = self.system.interactions, self.system.site_charge[self._charged]
        alpha = self.law.alpha
        if interactions.electrostatics == "direct-ewald":
            return DirectEwald(charge, box, alpha,
                               accuracy.longest_wave(self.system, box, alpha))
        order, mesh = accuracy.choose_mesh(self.system, box, alpha)
        small = (interactions.precision == "mixed"
                 and interactions.tolerance >= FLOAT_MESH_TOLERANCE)
        return MeshEwald(charge, box, alpha, order, mesh, np.float32 if small else np.float64)

    def evaluate(self, position, orientation, box, energies=True, mesh=True):
        """Forces, torques and, if asked for, energies and virial of one configuration -> Forces.

        position : (N, 3), wrapped or not. [nm]
        orientation : (N, 4) unit quaternions, scalar first, body to laboratory.
        box : (3,) [nm]
        mesh : False leaves the mesh part out, unless energies are asked for.
        Forces with and without energies may differ in their last bits.
        """
        force, torque = self._force, self._torque
        sums = self.pairs.evaluate(position, orientation, box, force, torque, energies)
        parts, waves = [(self._no_charges, force, torque)], None
        if self.reciprocal is not None and (mesh or energies):
            if self._apart is None:
                parts = [(self._first, force, torque)]
            else:
                self._apart[:] = 0.0
                parts.append((self._first, *self._apart))
            sites.place_charges(position, orientation, self._first, self._type,
                                self.system.type_position, self._place)
            waves = self.reciprocal.evaluate(self._place, box, self._push, energies)
        for part in parts:
            lever_work = sites.add_to_bodies(position, orientation, self._freedom,
                                             self.system.mass, self._drifts, self._place,
                                             self._push, *part)
        found = Forces(force, torque)
        if len(parts) > 1:
            found.mesh_force, found.mesh_torque = self._apart
            force += found.mesh_force
            torque += found.mesh_torque
        if energies:
            wave_energy, wave_virial = waves or (0.0, 0.0)
            found.terms = self._terms(sums, wave_energy, box)
            found.energy = sum(found.terms.values())
            found.virial = (float(np.sum(sums.virial)) + wave_virial - lever_work
                            + self._tail_virial / np.prod(box))
        return found

    def _terms(self, sums, wave_energy, box):
        own, inner = self._own, self._inner
        continuum = self.law.kind == "reaction-field"
        return dict(zip(TERMS, (
            float(sums.lennard_jones), float(self._tail_energy / np.prod(box)),
            float(sums.coulomb), wave_energy, 0.0 if continuum else own,
            0.0 if continuum else inner, own + inner if continuum else 0.0,
        ), strict=True))

    def memory(self):
        """What a checkpoint needs so that a restored field goes on bit for bit."""
        return self.pairs.memory()

    def restore(self, memory):
        """Take up what `memory` returned."""
        self.pairs.restore(memory)


def coulomb_law(system, box):
    """The law that the pairs of charges follow, with the splitting chosen where it is open.

    Raises InputError for an Ewald sum in a box that is not neutral.
    """
    wanted, charge = system.interactions, system.site_charge
    rc, method = wanted.cutoff, wanted.electrostatics
    if method == "none" or not np.any(charge):
        return CoulombLaw("none", rc)
    if method == "reaction-field":
        return CoulombLaw("reaction-field", rc, epsilon_rf=wanted.reaction_permittivity)
    if method == "damped-shifted":
        return CoulombLaw("damped-shifted", rc, alpha=wanted.damping)
    net = charge.sum()
    if abs(net) > NET_CHARGE * np.abs(charge).sum():
        bodies = ", ".join(f"{n} {s.name} of {s.total_charge:+.6g} e" for s, n in
                           zip(system.species, system.counts, strict=True) if s.total_charge)
        raise InputError(f"an Ewald sum needs a neutral box; this one carries {net:+.6g} e"
                         f" ({bodies}): change the counts, or use reaction-field or damped-shifted")
    alpha = accuracy.splitting(system, box) if wanted.splitting is None else wanted.splitting
    return CoulombLaw("ewald", rc, alpha=alpha)
