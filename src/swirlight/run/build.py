"""From a validated config to the things a run calculates with: system, state, field, light."""

from dataclasses import dataclass

import numpy as np

from swirlight import units
from swirlight.forces.box import check_box
from swirlight.forces.field import ForceField
from swirlight.light.build import bias_from_config, pulses_from_config
from swirlight.light.light import Light
from swirlight.motion.draw import draw_motion, draw_orientations
from swirlight.motion.step import Mover, stray_spins
from swirlight.rotation import to_body, to_laboratory
from swirlight.run.arrange import lattice_positions, remove_overlaps
from swirlight.run.sample import box_edges
from swirlight.sample import build_system
from swirlight.state import State
from swirlight.store.start import load_state, save_state


def lattice_start(config, system, box):
    """A drawn first state: lattice, orientations, overlaps removed, thermal momenta."""
    random = np.random.Generator(np.random.PCG64(np.random.SeedSequence(config.seed)))
    zeros = np.zeros((system.bodies, 3))
    state = State(
        position=lattice_positions(system.counts, box, random),
        orientation=draw_orientations(system.bodies, random),
        velocity=zeros, angular_momentum=zeros.copy(), box=box, random=random,
    )
    remove_overlaps(system, state, ForceField(system, box))
    draw_motion(system, state)
    return state


def first_state(config, system):
    """Where a run begins: a start file, or a drawn arrangement.

    Raises InputError when the box is too small or the start file holds other bodies.
    """
    if config.sample.begin_from is not None:
        state = load_state(config.sample.begin_from, system)
        check_box(state.box, system.interactions.cutoff, system.bodies)
        return state
    box = box_edges(config, system)
    check_box(box, system.interactions.cutoff, system.bodies)
    return lattice_start(config, system, box)


@dataclass
class Evaluation:
    """Forces on every body at one instant.

    energy : potential energy, bias field included. [kJ/mol]
    terms : its parts by name. [kJ/mol]
    virial : molecular virial −dU/dlnλ. [kJ/mol]
    force, torque : (N, 3) of all causes, laboratory frame. [kJ/mol/nm], [kJ/mol]
    light_torque, light_force : (N, 3) the light's own part.
    light_energy : energy of the bodies in the light, never part of `energy`. [kJ/mol]
    absorbed_power : [kJ/mol/ps]
    """

    energy: float
    terms: dict
    virial: float
    force: np.ndarray
    torque: np.ndarray
    light_torque: np.ndarray
    light_force: np.ndarray
    light_energy: float
    absorbed_power: float


class SceneState(State):
    """The state of a scene, which can save itself."""

    def save(self, path):
        """Write a start file, which `sample.begin_from` reads. Raises OSError if it cannot.

        A linear body that was turned in hand loses the angular momentum about its new axis.
        """
        save_state(path, _in_place(self.system, self), self.system)


def _in_place(system, state):
    """The state, without angular momenta that orientations assigned by hand rule out."""
    orientation = np.asarray(state.orientation, np.float64)
    momentum = np.asarray(state.angular_momentum, np.float64)
    shapes = (system.bodies, 4), (system.bodies, 3)
    if (orientation.shape, momentum.shape) != shapes:
        return state  # what is wrong with it is said when it is used
    rows = stray_spins(system, orientation, momentum)
    if not len(rows):
        return state
    fields = {**{name: getattr(state, name) for name in State.ARRAYS}, "step": state.step,
              "random": state.random, "angular_momentum": momentum.copy()}
    own = np.where(system.inertia[rows] > 0, to_body(orientation[rows], momentum[rows]), 0.0)
    fields["angular_momentum"][rows] = to_laboratory(orientation[rows], own)
    return State(**fields)


class Scene:
    """A config brought to life without running it.

    system : what does not change; state : what does, arrays may be assigned.
    """

    def __init__(self, config):
        self.config = config
        self.system = build_system(config)
        self.state = SceneState(**vars(first_state(config, self.system)))
        self.state.system = self.system
        stage = config.stages[-1]
        pulses = pulses_from_config(config.light, self.system, stage)
        self.light = Light(self.system, pulses, bias_from_config(config.bias_field))

    def evaluate(self, time="0 ps"):
        """Energies, forces and torques of the state as it is now, lit as at `time`.

        time : since the start of the lit stage, a quantity with its unit.
        Returns an Evaluation. Raises InputError for a time that cannot be read, or a box
        that is too small for the cutoff.
        """
        state = _in_place(self.system, self.state)
        check_box(state.box, self.system.interactions.cutoff, self.system.bodies)
        mover = Mover(self.system, ForceField(self.system, state.box), self.light, 1e-3, None,
                      remove_momentum=False)
        mover.begin(state, units.parse_quantity(time, "time"), energies=True)
        load, out = mover.load, 1.0 / units.KJ_PER_MOL
        terms = {name: out * value for name, value in load.field.terms.items()}
        terms["bias"] = out * load.bias_energy
        return Evaluation(
            energy=float(sum(terms.values())),
            terms=terms,
            virial=float(out * load.field.virial),
            force=out * load.force,
            torque=out * load.torque,
            light_torque=out * load.light_torque,
            light_force=out * load.light_force,
            light_energy=float(out * load.light_energy),
            absorbed_power=float(out * load.absorbed_power),
        )


def build(config):
    """A Scene of the config: ``scene.system``, ``scene.state``, ``scene.evaluate(time)``.

    Raises InputError for a sample that cannot be built.
    """
    return Scene(config)
