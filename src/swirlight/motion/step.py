"""One step of motion: half kick, free drift, half kick, with the thermostat amid the drift.

    NVE       kick ½ · drift 1 · kick ½                      symplectic, time-reversible
    with bath kick ½ · drift ½ · bath · drift ½ · kick ½

Fields act with their values at the times of the kicks, which keeps second order for light
that changes in time.

The mesh part of the forces may act at every n-th step only, n times as strongly (impulse form
of multiple timesteps: Tuckerman, Berne & Martyna, J. Chem. Phys. 97, 1990 (1992); Grubmüller,
Heller, Windemuth & Schulten, Mol. Simul. 6, 121 (1991)):

    kick ½ (pairs + n mesh) · drift 1 · kick 1 (pairs) · … · drift 1 · kick ½ (pairs + n mesh)

which stays symplectic and time-reversible over n steps. Momenta in between carry half of the
impulse, so that energies mean something only at whole multiples of n steps.

Times are counted in whole steps since the stage began, and schedules
of the light are made in blocks that start at multiples of `BLOCK` steps: a run that was
interrupted meets the same numbers.
"""

import numpy as np

from swirlight.errors import RunError
from swirlight.motion.energy import kinetic_energies
from swirlight.motion.freedom import (
    conserves_momentum,
    degrees_of_freedom,
    remove_total_momentum,
    spares_momentum,
)
from swirlight.motion.kernels import Workspace, drift, kick
from swirlight.motion.ledger import ABSORBED, OPENING, Ledger
from swirlight.motion.load import Load
from swirlight.motion.rotor import rotor_kinds
from swirlight.rotation import to_body
from swirlight.units import BOLTZMANN

BLOCK = 256  # steps whose fields are calculated together


class Mover:
    """Moves a state under forces, light and a thermostat, and keeps the ledger.

    system : System.
    force_field : has `evaluate(position, orientation, box, energies) -> Forces`, and takes
        `mesh` where the system's `interactions.mesh_every` > 1; None: no interactions.
    light : Light, or None.
    timestep : [ps]
    thermostat : of `thermostats.make_thermostat`, or None.
    remove_momentum : take out the total momentum when a stage begins, if the stage keeps it.

    load : what acts at the current state.
    ledger : may be replaced, after `begin`, by one restored from a checkpoint.
    freedom : degrees of freedom of this stage.
    """

    def __init__(self, system, force_field, light, timestep, thermostat=None,
                 remove_momentum=True):
        self.system, self.force_field, self.thermostat = system, force_field, thermostat
        self.light = light if light is not None and light.active else None
        self.timestep = float(timestep)
        self.momentum_conserved = remove_momentum and conserves_momentum(
            system, thermostat, self.light)
        # Removed in lit kinds too where light pushes: twins begin alike.
        self._stilled = remove_momentum and spares_momentum(thermostat)
        self.freedom = degrees_of_freedom(system, self.momentum_conserved)
        self.ledger = Ledger()
        self.load = Load(system.bodies)
        self._mesh_every = system.interactions.mesh_every
        self._push = self.load.of_pairs()
        self._light_load = self.light and self.light.new_load()
        lit = Load(system.bodies, light=self._light_load)  # the same rows at every step
        self._of_light, self._of_bias = lit.of_light(), lit.of_bias()
        self._kinds = rotor_kinds(system.inertia)
        self._work = Workspace(system.bodies)
        self._count, self._offset = 0, 0.0  # time since the stage began: whole steps and a rest
        self._block = None  # fields of the present BLOCK steps

    def begin(self, state, time=0.0, energies=True):
        """Find what acts at a state, without motion.

        time : since the stage began. [ps] At 0 the total momentum is removed from the state
            where the thermostat, if any, leaves it alone.
        Raises ValueError for arrays of a wrong shape, or angular momentum that a body cannot
        have.
        """
        self._count = round(time / self.timestep)
        self._offset = time - self._count * self.timestep
        if abs(self._offset) < 1e-6 * self.timestep:
            self._offset = 0.0  # a whole number of steps: the time an unbroken run would have
        self._block = None
        _check(self.system, state)
        if time == 0 and self._stilled:
            remove_total_momentum(self.system, state)
        self._evaluate(state, energies)
        if energies and np.isnan(self.ledger.opening_energy):
            self.ledger.values[OPENING] = self.total_energy(state)

    def advance(self, state, energies=True):
        """Move the state by one step, in place; `load` and `ledger` follow.

        energies : whether this step's energies and virial will be read; they belong to whole
            multiples of `mesh_every` steps.
        Raises RunError, naming step and body, when a force or momentum is no longer finite.
        """
        self._kick(state)
        if self.thermostat is None:
            self._drift(state, self.timestep)
        else:
            self._drift(state, 0.5 * self.timestep)
            self.thermostat.act(state, self.system, self.timestep, self._work, self.ledger)
            self._drift(state, 0.5 * self.timestep)
        state.step += 1
        self._count += 1
        self._evaluate(state, energies)
        self._kick(state)

    def total_energy(self, state):
        """H0 = K + U of the current state, without field energies. [u nm²/ps²]

        The energies of this step must have been asked for.
        """
        return sum(kinetic_energies(self.system, state)) + self.load.energy

    def field_at_present(self, name):
        """(3,) row of the present FieldBlock: amplitude, conjugate_product, field or bias.

        Zero without light and bias field.
        """
        if self.light is None:
            return np.zeros(3)
        return getattr(self._block, name)[self._count % BLOCK]

    def energy_residual(self, state):
        """ΔH0 since the ledger was opened, less all work entered there. [u nm²/ps²]"""
        return self.total_energy(state) - self.ledger.opening_energy - self.ledger.work

    def _drift(self, state, interval):
        drift(state, self.system, self._kinds, interval, self._work.parallel)

    def _kick(self, state):
        load, half = self.load, 0.5 * self.timestep
        if load.light is not None:
            self.ledger.values[ABSORBED] += half * load.light.absorbed_power
        broken = kick(state, self.system, self._push, self._of_light, self._of_bias, half,
                      self._work, self.ledger)
        if broken >= 0:
            raise RunError(_what_broke(self.system, state, load, int(broken)))

    def _evaluate(self, state, energies):
        self.load = load = Load(self.system.bodies, self._time())
        if self.force_field is not None:
            load.field = self._interactions(state, energies)
            self._push = self._weighted(load)
        if self.light is not None:
            index = self._count % BLOCK
            if self._block is None or index == 0:
                steps = self._count - index + np.arange(BLOCK)
                self._block = self.light.schedule(self._offset + steps * self.timestep)
            self.light.apply(self._block, index, state.orientation, self._light_load)
            load.light = self._light_load
            load.sum_light = lambda: self.light.energies(
                self._block, index, state.orientation, state.position)

    def _interactions(self, state, energies):
        where = state.position, state.orientation, state.box
        if self._mesh_every == 1:
            return self.force_field.evaluate(*where, energies)
        return self.force_field.evaluate(*where, energies, mesh=self._mesh_weight > 0)

    def _weighted(self, load):
        """(force, torque) with which the interactions enter the kicks at this instant."""
        mesh = getattr(load.field, "mesh_force", None), getattr(load.field, "mesh_torque", None)
        if mesh[0] is None:
            return load.of_pairs()
        more = self._mesh_weight - 1  # they are in the forces once
        return tuple(a + more * b for a, b in zip(load.of_pairs(), mesh, strict=True))

    @property
    def _mesh_weight(self):
        """How strongly the mesh part acts at the present step."""
        return self._mesh_every if self._count % self._mesh_every == 0 else 0

    def _time(self):
        return self._offset + self._count * self.timestep


def stray_spins(system, orientation, angular_momentum):
    """Indices of bodies that have angular momentum about an axis without moment of inertia.

    orientation : (N, 4); angular_momentum : (N, 3) laboratory frame. Rounding does not count.
    """
    spin = np.abs(to_body(orientation, angular_momentum))
    thermal = np.sqrt(BOLTZMANN * system.temperature * system.inertia.max(axis=1))
    stray = np.where(system.inertia > 0, 0.0, spin).max(axis=1)
    return np.flatnonzero(stray > 1e-6 * np.maximum(spin.max(axis=1), thermal))


def _check(system, state):
    """Shapes, unit quaternions, no angular momentum where there is no moment of inertia."""
    for name, width in (("position", 3), ("orientation", 4), ("velocity", 3),
                        ("angular_momentum", 3)):
        array = np.ascontiguousarray(getattr(state, name), dtype=np.float64)
        if array.shape != (system.bodies, width):
            raise ValueError(f"state.{name} has shape {array.shape},"
                             f" expected {(system.bodies, width)}")
        setattr(state, name, array)
    length = np.linalg.norm(state.orientation, axis=1)
    if not np.all(np.abs(length - 1) < 1e-6):
        worst = int(np.argmax(np.abs(length - 1)))
        raise ValueError(f"orientation of body {worst} has length {length[worst]:.9g}, not 1")
    wrong = stray_spins(system, state.orientation, state.angular_momentum)
    if len(wrong):
        raise ValueError(f"body {wrong[0]} ({_name(system, wrong[0])}) has angular momentum about"
                         " an axis without moment of inertia")


def _name(system, body):
    return system.species[system.species_of[body]].name


def _what_broke(system, state, load, body):
    parts = {
        "force of the interactions": load.of_pairs()[0],
        "torque of the interactions": load.of_pairs()[1],
        "force of the light": load.of_light()[0],
        "torque of the light": load.of_light()[1],
        "force of the bias field": load.of_bias()[0],
        "torque of the bias field": load.of_bias()[1],
        "position": state.position,
        "momentum": state.velocity,
    }
    found = [what for what, rows in parts.items()
             if len(rows) and not np.isfinite(rows[body]).all()]
    return (f"step {state.step}: the {found[0] if found else 'angular momentum'} of body {body}"
            f" ({_name(system, body)}) is no longer a finite number; a shorter timestep or a"
            " gentler start may help")
