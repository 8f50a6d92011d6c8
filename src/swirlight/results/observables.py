"""Collective observables whose response is asked for: name, unit, and how a trajectory gives it.

Everything is per body, or a property of the whole such as temperature and polarisation. Angular
momentum and impulses are in ħ. One entry here makes a new observable.
"""

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np

from swirlight.errors import InputError
from swirlight.units import HBAR

FRAMES = 256  # read at once of what is recorded for every body


@dataclass(frozen=True)
class Observable:
    """One collective observable.

    source : name in the trajectory. read : trajectory -> (T,) or (T, 3). unit : "" if none.
    symmetry : "scalar", "axial" (angular momentum, torque) or "polar" (dipole) vector; the
    projection of a vector on the beam comes first.
    """

    name: str
    label: str
    unit: str
    source: str
    read: Callable
    symmetry: str = "scalar"


def _total(name, label, unit, source=None, symmetry="scalar", per_body=False, factor=1.0):
    source = source or name

    def read(trajectory):
        bodies = len(trajectory.mass) if per_body else 1
        return np.asarray(trajectory[source], float) * (factor / bodies)

    return Observable(name, label, unit, source, read, symmetry)


def _spin(name, label, source=None):
    return _total(name, label, "hbar", source, "axial", True, 1.0 / HBAR)


def _energy(name, label):
    return _total(name, label, "kJ mol-1", per_body=True)


def _of_bodies(name, label):
    def read(trajectory):
        series = trajectory[name]
        return np.concatenate([series[k : k + FRAMES].mean(axis=1, dtype=float)
                               for k in range(0, len(series), FRAMES)])

    return Observable(name, label, "kJ mol-1", name, read, "axial")


def _polarisation(trajectory):
    return np.asarray(trajectory["total_dipole"], float) / (np.prod(trajectory.box) * 1e-27)


OBSERVABLES = {
    o.name: o
    for o in (
        _spin("light_impulse", "angular impulse of the light"),
        _spin("angular_momentum", "angular momentum", "total_angular_momentum"),
        _spin("pair_impulse", "angular impulse of the neighbours"),
        _spin("bath_impulse", "angular impulse of the thermostat"),
        _of_bodies("torque", "torque of all causes"),
        _of_bodies("light_torque", "torque of the light"),
        _total("alignment", "alignment ⟨P2⟩", ""),
        _total("orientation", "orientation ⟨P1⟩", "", "orientation_along_beam"),
        Observable("polarisation", "polarisation", "C m-2", "total_dipole", _polarisation,
                   "polar"),
        _total("temperature", "temperature", "K"),
        _total("temperature_translation", "temperature of translation", "K"),
        _total("temperature_rotation", "temperature of rotation", "K"),
        _energy("potential_energy", "potential energy"),
        _energy("total_energy", "kinetic and potential energy"),
        _energy("light_work", "mechanical work of the light"),
        _energy("absorbed_energy", "energy absorbed by electrons"),
        _total("pressure", "pressure", "bar"),
    )
}
_ALIASES = {o.source: o.name for o in OBSERVABLES.values()}


def find_observable(name):
    """The Observable of that name, or of that name in the files.

    Raises InputError listing what there is.
    """
    key = name if name in OBSERVABLES else _ALIASES.get(name)
    if key is None:
        raise InputError(f"no observable {name!r}; there are {', '.join(OBSERVABLES)}")
    return OBSERVABLES[key]
