"""What can be correlated: recorded vectors of bodies, body axes, sums over bodies.

A vector is read in blocks of bodies along all of time, so that a trajectory may be larger than
memory. Everything that carries no physics is refused here, by name.
"""

from dataclasses import dataclass

import numpy as np

from swirlight.errors import InputError
from swirlight.rotation import to_body
from swirlight.store.trajectory import AXES

BLOCK = 8_000_000  # numbers in a block
CHUNK = 16  # bodies that lie together in a file
FRAMES = ("lab", "body")
TOTAL = "total_"
UNFIT = {
    "orientation": "is a quaternion; correlate axis_x, axis_y or axis_z",
    "axes": "are three vectors; correlate axis_x, axis_y or axis_z",
    "position": "jumps at the walls of the box; correlate velocity or position_unwrapped",
    "image": "counts boxes; correlate position_unwrapped",
}


@dataclass(frozen=True)
class Vectors:
    """One vector of a trajectory, of every body of a selection or of the box as a whole.

    name : recorded vector, axis_x, axis_y, axis_z, recorded total with three components, or
        "total_" and the name of a vector: its sum over bodies.
    frame : "lab" or "body". bodies : (n,) indices, None for a total.
    summed : whether the total has to be summed from the bodies' vectors.
    """

    trajectory: object
    name: str
    frame: str
    bodies: np.ndarray | None
    summed: bool = False

    @property
    def series(self):
        """The `Series` that is read."""
        return self.trajectory[self.name.removeprefix(TOTAL) if self.summed else self.name]

    @property
    def unit(self):
        """H5MD unit string, None if it has none."""
        return self.series.unit

    def block(self, chosen, components, stride=1):
        """(frames, bodies, components) of some of the bodies; of a total (frames, 1, ...).

        chosen : (n,) indices of bodies, ignored for a total. components : list of 0, 1, 2.
        """
        # Whole chunks are read and thinned here: the file library is slow at strides.
        if self.summed:
            whole = sum(self.series[:, some].sum(axis=1, dtype=np.float64)
                        for some in _parted(self.series))[:, None]
        elif self.bodies is None:
            whole = self.series[:][:, None]
        else:
            whole = self.series[:, chosen]
        whole = whole[::stride]
        if self.frame == "body":
            whole = to_body(self.trajectory["orientation"][:, chosen][::stride], whole)
        return whole if list(components) == [0, 1, 2] else whole[..., components]


def _parted(series, bodies=None):
    """Parts of as many bodies as make a block: slices, or indices where bodies are apart."""
    bodies = np.arange(series.shape[1]) if bodies is None else bodies
    some = max(1, BLOCK // (len(series) * 3))
    some = some // CHUNK * CHUNK or some
    for start in range(0, len(bodies), some):
        part = bodies[start : start + some]
        together = part[-1] - part[0] == len(part) - 1
        yield slice(int(part[0]), int(part[-1]) + 1) if together else part


def blocks(first, second, components, stride=1):
    """Pairs of arrays (frames, bodies, p), (frames, bodies, q), block by block of bodies.

    first, second : `Vectors` of one trajectory; where both are the same the two arrays are one.
    components : (list of p, list of q) of 0, 1, 2.
    """
    parts = [None] if first.bodies is None else _parted(first.series, first.bodies)
    for part in parts:
        a = first.block(part, components[0], stride)
        same = first.name == second.name and components[0] == components[1]
        yield a, a if same else second.block(part, components[1], stride)


def find_vectors(trajectory, name, frame="lab", species=None, components=(0, 1, 2)):
    """`Vectors` of that name. Raises InputError for what is not there or carries no physics.

    species : name of one of the sample, None: all bodies. components : those that will be used.
    """
    if frame not in FRAMES:
        raise InputError(f"frame {frame!r}: expected lab or body")
    if name in UNFIT:
        raise InputError(f"{name} {UNFIT[name]}")
    known = trajectory.readable
    summed = name not in known and name.startswith(TOTAL) and name.removeprefix(TOTAL) in known
    if not summed and name not in known:
        raise InputError(f"{trajectory.name} has no {name!r}; there are "
                         f"{', '.join(_correlatable(trajectory))}, and total_ with one of the "
                         "bodies' vectors")
    base = name.removeprefix(TOTAL) if summed else name
    if base in UNFIT:
        raise InputError(f"{name}: {base} {UNFIT[base]}")
    series = trajectory[base]
    if series.dimensions[-1] != "component" or series.ndim > 3:
        raise InputError(f"{name} is no vector; there are {', '.join(_correlatable(trajectory))}")
    if "body" not in series.dimensions or summed:
        if frame == "body":
            raise InputError(f"{name} belongs to the box, which has no body frame")
        if species is not None:
            raise InputError(f"{name} belongs to the whole box, not to {species} alone")
        if summed:
            _refuse_axes(trajectory, base, "lab", trajectory.species_names, components)
        return Vectors(trajectory, name, frame, None, summed)
    bodies, names = _selected(trajectory, species)
    _refuse_axes(trajectory, base, frame, names, components)
    return Vectors(trajectory, name, frame, bodies)


def _correlatable(trajectory):
    return [name for name in trajectory.readable if name not in UNFIT
            and trajectory[name].ndim in (2, 3) and trajectory[name].dimensions[-1] == "component"]


def _selected(trajectory, species):
    names = trajectory.species_names
    if species is None:
        return np.arange(len(trajectory.mass)), names
    if species not in names:
        raise InputError(f"no species {species!r} in the sample; there are {', '.join(names)}")
    return np.flatnonzero(trajectory.species == names.index(species)), (species,)


def _refuse_axes(trajectory, name, frame, names, components):
    """Rows x, y of a linear body's axes, and all of an atom's, are kept but mean nothing."""
    if name not in AXES and frame == "lab":
        return
    if name in AXES and frame == "body":
        raise InputError(f"{name} in the body frame never changes; take frame lab")
    if "orientation" not in trajectory.names and frame == "body":
        raise InputError("the body frame needs the orientation, which was not recorded: add it to "
                         "record.vectors")
    others = "; select another species" if len(trajectory.species_names) > 1 else ""
    for each in names:
        moments = np.asarray(trajectory.parameters["species"][each]["inertia"])
        if not moments.any():
            raise InputError(f"{each} is an atom: its axes carry no physics{others}")
        if moments[2] == 0.0 and name in ("axis_x", "axis_y"):
            raise InputError(f"{each} is linear: its {name} carries no physics; "
                             f"take axis_z{others}")
        if moments[2] == 0.0 and frame == "body" and set(components) & {0, 1}:
            raise InputError(f"{each} is linear: x and y of its body frame carry no physics; take "
                             f"components zz or frame lab{others}")
