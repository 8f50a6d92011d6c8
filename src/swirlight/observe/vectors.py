"""Vectors that can be recorded for every body: name, shape, unit in the file, and how to read.

Units and names are those of the run's files; everything else in this package is in internal
units, so each entry carries the factor between the two. One entry here makes a new vector.
"""

from collections.abc import Callable
from dataclasses import dataclass, field

import numpy as np

from swirlight import units
from swirlight.motion.energy import angular_velocity
from swirlight.rotation import body_axes, to_laboratory


@dataclass(frozen=True)
class Vector:
    """One recordable vector.

    name : also of the element in the file.
    shape : of one body's value.
    unit : text of the `unit` attribute; None: no unit.
    factor : value in the file = factor · internal value.
    read : (system, state, load) -> (N, *shape) in internal units; a new array.
    attributes : further attributes of the element.
    companions : names recorded along with it.
    integer : whether it is stored as int32.
    """

    name: str
    shape: tuple[int, ...]
    unit: str | None
    factor: float
    read: Callable
    attributes: dict = field(default_factory=dict)
    companions: tuple[str, ...] = ()
    integer: bool = False

    def sample(self, system, state, load):
        """(N, *shape) in the unit of the file."""
        value = self.read(system, state, load)
        return value if self.factor == 1.0 else value * self.factor


def wrapped(position, box):
    """Positions in [0, edge) of each axis, and the (N, 3) int32 count of boxes away.

    position = wrapped + image · box up to rounding. [nm]
    """
    image = np.floor(position / box)
    inside = position - image * box
    # rounding may put a point a hair below zero on the far face
    over = inside >= box
    inside[over] = 0.0
    return inside, (image + over).astype(np.int32)


KJ = 1.0 / units.KJ_PER_MOL
LABORATORY = {"frame": "laboratory"}

VECTORS = {
    v.name: v
    for v in (
        Vector("position", (3,), "nm", 1.0, lambda y, s, f: wrapped(s.position, s.box)[0],
               companions=("image",)),
        Vector("image", (3,), None, 1.0, lambda y, s, f: wrapped(s.position, s.box)[1],
               integer=True),
        Vector("velocity", (3,), "nm ps-1", 1.0, lambda y, s, f: s.velocity.copy()),
        Vector("force", (3,), "kJ mol-1 nm-1", KJ, lambda y, s, f: f.force),
        Vector("torque", (3,), "kJ mol-1", KJ, lambda y, s, f: f.torque,
               {**LABORATORY, "causes": "interactions, light and bias field"}),
        Vector("light_torque", (3,), "kJ mol-1", KJ, lambda y, s, f: f.light_torque, LABORATORY),
        Vector("angular_momentum", (3,), "g mol-1 nm+2 ps-1", 1.0,
               lambda y, s, f: s.angular_momentum.copy(),
               {**LABORATORY, "about": "the body's centre of mass"}),
        Vector("angular_velocity", (3,), "rad ps-1", 1.0,
               lambda y, s, f: angular_velocity(y, s), LABORATORY),
        Vector("orientation", (4,), None, 1.0, lambda y, s, f: s.orientation.copy(),
               {"convention": "unit quaternion, scalar first, body to laboratory"}),
        Vector("axes", (3, 3), None, 1.0,
               lambda y, s, f: body_axes(s.orientation).copy(),
               {"convention": "row k is body axis k in the laboratory"}),
        Vector("dipole", (3,), "C m", 1.0 / units.COULOMB_METRE,
               lambda y, s, f: to_laboratory(s.orientation, y.dipole),
               {**LABORATORY, "about": "the body's centre of mass", "part": "permanent"}),
    )
}


def chosen(names):
    """The Vectors of these names and their companions, each once, in order.

    Raises KeyError for an unknown name.
    """
    wanted = {}
    for name in names:
        for each in (name, *VECTORS[name].companions):
            wanted[each] = VECTORS[each]
    return tuple(wanted.values())
