"""Light on a sample: the fields of a whole block of times, and what they do to the bodies.

    light = Light(system, pulses, bias)
    block = light.schedule(times)
    load = light.apply(block, index, state.orientation)
    sums = light.energies(block, index, state.orientation, state.position)

Everything in internal units, laboratory frame. The light never enters the potential energy:
its work, impulse and absorbed energy are ledgers of their own.
"""

from dataclasses import dataclass

import numpy as np

from swirlight.light.coupling import (
    averaged_torque,
    collective,
    dipole_torque,
    rectified,
    resolved_torque,
    turned_sum,
)
from swirlight.light.regime import beating_groups
from swirlight.light.response import RECTIFICATION, colour_of, free_axes, optics_table
from swirlight.light.schedule import make_block


@dataclass
class LightLoad:
    """What the fields do to each body at one instant; buffers that `apply` overwrites.

    torque : (N, 3) of the light: averaged, resolved, and rectified dipoles in the bias field.
    force : (N, 3) of resolved light on net charges, or None when it can have none.
    bias_torque, bias_force : (N, 3) of the static field, or None likewise.
    absorbed_power : Σ ½ω e*·α_D e over the bodies. [u nm²/ps³]
    [u nm²/ps²], [u nm/ps²]
    """

    torque: np.ndarray
    force: np.ndarray | None
    bias_torque: np.ndarray | None
    bias_force: np.ndarray | None
    absorbed_power: float = 0.0


@dataclass(frozen=True)
class LightEnergies:
    """Sums over the sample at one instant.

    light_energy : −¼Σ(α_S:S + g·G) of averaged light, −M·E − ½ΣE·α_S·E of resolved light;
        reported, never part of the potential energy. [u nm²/ps²]
    bias_energy : −M·F. [u nm²/ps²] With ions M needs unwrapped positions.
    absorbed_power : [u nm²/ps³]
    rectified_dipole : (3,) Σ p0. [e nm]
    """

    light_energy: float
    bias_energy: float
    absorbed_power: float
    rectified_dipole: np.ndarray


class Light:
    """Pulses and a static field acting on the bodies of one system.

    system : System.
    pulses : Pulse objects, any mixture of averaged and resolved ones.
    bias : Bias or None.

    active : whether there is anything to apply.
    warnings : what the choice of optical responses has to say.
    Raises InputError when a species' response lies a factor of 2 from an averaged carrier.
    """

    def __init__(self, system, pulses, bias=None):
        self.system, self.pulses, self.bias = system, tuple(pulses), bias
        self.active = bool(self.pulses) or bias is not None
        self.groups = beating_groups(self.pulses, system)
        self.colours = _by_carrier(p for p in self.pulses if p.coupling == "resolved")
        self._averaged, first = optics_table(system, self.groups)
        self._resolved, second = optics_table(system, self.colours, resolved=True)
        self.warnings = (*first, *second)
        self._averaged_omega = np.array([colour_of(g) for g in self.groups], float)
        self._resolved_omega = np.array([colour_of(c) for c in self.colours], float)
        self._first = np.concatenate([[0], np.cumsum(system.counts)]).astype(np.int64)
        self._free = free_axes(system)
        self._dipole = np.array([s.dipole for s in system.species])
        self._charged = bool(np.any(system.charge != 0.0))
        self._rectifies = bool(self._averaged[..., RECTIFICATION].any())

    def schedule(self, times):
        """The FieldBlock at `times`, (T,) in ps from the start of the lit stage."""
        return make_block(times, self.groups, self.colours, self.bias)

    def new_load(self):
        """A LightLoad of the right size for `apply`, all zero."""
        shape = (self.system.bodies, 3)
        biased, forced = self.bias is not None, bool(self.colours) and self._charged
        return LightLoad(
            torque=np.zeros(shape),
            force=np.zeros(shape) if forced else None,
            bias_torque=np.zeros(shape) if biased else None,
            bias_force=np.zeros(shape) if biased and self._charged else None,
        )

    def apply(self, block, index, orientation, out=None):
        """Fill `out` (a LightLoad, made when None) with the load at time `index` of the block.

        orientation : (N, 4) unit quaternions, float64. Returns out.
        """
        out = self.new_load() if out is None else out
        out.torque[:] = 0.0
        power = 0.0
        if block.averaged_on[index]:
            rows = block.coherency[index]
            power += averaged_torque(orientation, self._first, self._free, self._averaged,
                                     self._averaged_omega, rows, out.torque)
            if self._rectifies and out.bias_torque is not None:
                rectified(orientation, self._first, self._free, self._averaged, rows,
                          block.bias[index], out.torque, np.zeros(3))
        if block.resolved_on[index]:
            power += resolved_torque(orientation, self._first, self._free, self._resolved,
                                     self._resolved_omega, self._dipole, block.wave[index],
                                     out.torque)
        out.absorbed_power = power
        if out.force is not None:
            np.multiply.outer(self.system.charge, block.field[index], out=out.force)
        if out.bias_torque is not None:
            out.bias_torque[:] = 0.0
            dipole_torque(orientation, self._first, self._free, self._dipole, block.bias[index],
                          out.bias_torque)
        if out.bias_force is not None:
            np.multiply.outer(self.system.charge, block.bias[index], out=out.bias_force)
        return out

    def energies(self, block, index, orientation, position):
        """The LightEnergies at time `index` of the block.

        position : (N, 3) unwrapped centres, used by net charges only. [nm]
        """
        light, power = 0.0, 0.0
        total_p0, sums, dipole = np.zeros(3), np.zeros(9), np.zeros(3)
        scratch = np.zeros((self.system.bodies, 3))
        if block.averaged_on[index]:
            rows = block.coherency[index]
            for c, row in enumerate(rows):
                collective(orientation, self._first, self._averaged[c], sums)
                light -= 0.25 * (_contract(sums[:6], row[:6]) + sums[6:] @ row[6:])
            power += averaged_torque(orientation, self._first, self._free, self._averaged,
                                     self._averaged_omega, rows, scratch)
            if self._rectifies:
                rectified(orientation, self._first, self._free, self._averaged, rows,
                          block.bias[index], scratch, total_p0)
        turned_sum(orientation, self._first, self._dipole, dipole)
        if self._charged:
            dipole += self.system.charge @ position
        if block.resolved_on[index]:
            rows, field = block.wave[index], block.field[index]
            light -= float(dipole @ field)
            for c, row in enumerate(rows):
                collective(orientation, self._first, self._resolved[c], sums)
                light -= 0.5 * _bilinear(sums[:6], field, row[:3])
            power += resolved_torque(orientation, self._first, self._free, self._resolved,
                                     self._resolved_omega, self._dipole, rows, scratch)
        return LightEnergies(light, -float(dipole @ block.bias[index]), power, total_p0)


def _by_carrier(pulses):
    """Pulses of equal carrier together, first come first; each is one colour."""
    colours = {}
    for pulse in pulses:
        colours.setdefault(pulse.carrier, []).append(pulse)
    return tuple(tuple(c) for c in colours.values())


def _contract(a, b):
    """a:b of two symmetric tensors given as xx yy zz xy xz yz."""
    return float(a[:3] @ b[:3] + 2.0 * (a[3:] @ b[3:]))


def _bilinear(tensor, u, v):
    """u·t·v of a symmetric tensor given as xx yy zz xy xz yz."""
    xx, yy, zz, xy, xz, yz = tensor
    return float(u @ np.array([[xx, xy, xz], [xy, yy, yz], [xz, yz, zz]]) @ v)
