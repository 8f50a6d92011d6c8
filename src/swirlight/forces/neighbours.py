"""Which bodies are near which.

The list holds the bodies with any two sites within cutoff + skin. It is made anew when a site
has moved by half the skin since (see `kernels/search.py`), so no pair of sites within the
cutoff is ever missed. It is a full list, a row per body, an entry per (body, image): where the
box is too small for one image per body it is repeated (see `kernels/records.py`).
"""

from dataclasses import dataclass

import numpy as np

from swirlight.errors import RunError
from swirlight.forces.kernels import records, search
from swirlight.forces.kinds import aligned

SKINS = (0.01, 0.3)  # the least and the largest skin. [nm]
FIRST_SKIN = 0.07  # to begin with. [nm]
FLOAT_SLACK = 1e-5  # what distances in float may be wrong by, and more. [nm]
LOST = "positions or orientations are no longer finite numbers"
# Time of making the list over that of one call of the forces (measured).
LIST_COST = 0.8


@dataclass
class Rows:
    """The list of one kind's bodies against another's: start words of records, a row a body."""

    entries: np.ndarray
    counts: np.ndarray

    def choose(self, own, other, unit, reach):
        """List the bodies of `other` with any site within reach of one of those of `own`."""
        margin = own.radius + other.radius
        while True:
            search.choose(own.words, *own.own.arrays[1:5], *other.copies.arrays, own is other,
                          unit, reach, margin, self.entries, self.counts)
            most = int(self.counts.max())
            if most <= self.entries.shape[1]:
                break
            capacity = (int(1.1 * most) // search.LANES + 1) * search.LANES
            self.entries = aligned((own.count, capacity), np.int32)


class Neighbours:
    """The neighbour lists of a system: call `update` before the forces.

    kinds : the `Kind`s; rows : {(own, other): Rows} by their numbers.
    unit : (2, 3) nm per unit of a record's centre words, of the records' type, and what that
        type's rounding left of it.
    made : how many times the lists were made.
    """

    def __init__(self, system, kinds, cutoff, dtype, repeat=None):
        """repeat : (3,) times to repeat the box; None: as few as one image per body allows."""
        self.system, self.kinds, self.cutoff = system, kinds, cutoff
        self.dtype, self.wanted_repeat = np.dtype(dtype), repeat
        self.rows, self.repeat = {}, None
        self.radius = max((k.radius for k in kinds), default=0.0)
        self.skin, self.calls = FIRST_SKIN, 0
        self.last_moved = 0.0  # what the last call found the sites to have moved
        self.made, self.box = 0, None  # the box that the lists were made for
        self._box_bytes = b""

    def update(self, position, orientation, box):
        """Bring records and lists up to date with where the bodies are.

        Raises RunError when that is no longer known (NaN).
        """
        if box.tobytes() == self._box_bytes:
            moved = self._place(position, orientation)
            self.calls += moved != self.last_moved  # a call at the same places is no new one
            self.last_moved = moved
            if 2 * moved <= self.skin:
                return
            self._adapt_skin(2 * moved)
        self.make(position, orientation, box)

    def memory(self):
        """What `restore` needs to make the same lists again: a dict of arrays."""
        if self.box is None:
            return {}
        return {"list": np.array([self.skin, self.calls, self.last_moved]), "box": self.box,
                "position": self.position, "orientation": self.orientation}

    def restore(self, memory):
        """Make the lists again from what `memory` returned."""
        self.box, self._box_bytes = None, b""
        if not memory:
            return
        self.skin, calls, last_moved = (float(value) for value in memory["list"])
        self.make(memory["position"], memory["orientation"], memory["box"])
        self.calls, self.last_moved = int(calls), last_moved

    def _adapt_skin(self, moved):
        """Set the skin to what costs least at the speed sites were seen to move.

        A call costs in proportion to 1 + 3 skin/cutoff, and LIST_COST speed/skin more.
        """
        speed = moved / self.calls
        if self.calls > 1 or moved < 2 * self.skin:  # else bodies were moved, they did not move
            best = np.sqrt(LIST_COST * speed * self.cutoff / 3)
            self.skin = float(np.clip(0.5 * (self.skin + best), *SKINS))

    def _place(self, position, orientation, anew=False):
        """Write all records; the largest distance of a site from where it was listed."""
        furthest = 0.0
        for kind in self.kinds:
            moved = records.place(position, orientation, kind.body, kind.places, self.box,
                                  self.repeat, anew, kind.image, kind.reference, kind.records,
                                  kind.centres)
            if not np.isfinite(moved):
                raise RunError(LOST)
            furthest = max(furthest, moved)
        return np.sqrt(furthest)

    def make(self, position, orientation, box):
        """Sort the bodies into cells and list those that have sites near each other."""
        if not (np.isfinite(position).all() and np.isfinite(orientation).all()):
            raise RunError(LOST)
        self.box, self._box_bytes = np.array(box), box.tobytes()
        self.position, self.orientation = np.array(position), np.array(orientation)
        self.calls, self.last_moved = 0, 0.0
        self.skin, repeat = self._images()
        if not np.array_equal(repeat, self.repeat):
            # New rows: what fills old ones up to whole vectors may point behind fewer copies.
            self.rows, self.repeat = self._empty_rows(), repeat
        edge, copies = self.box * self.repeat, int(np.prod(self.repeat))
        unit = (edge / search.WHOLE).astype(np.float32)
        for kind in self.kinds:
            kind.make_room(copies, self.dtype)
            kind.sort(position, self.box, self.repeat)
        self._place(position, orientation, anew=True)
        for kind in self.kinds:
            kind.own.fill(kind, unit)
            if kind.copies is not kind.own:
                kind.copies.fill(kind, unit)
        for (a, b), rows in self.rows.items():
            rows.choose(self.kinds[a], self.kinds[b], unit, self.cutoff + self.skin + FLOAT_SLACK)
        unit = edge / (search.WHOLE if self.dtype == np.float32 else 1.0)
        self.unit = np.array([unit, unit - unit.astype(self.dtype)], self.dtype)
        self.made += 1

    def _empty_rows(self):
        return {(a, b): Rows(np.zeros((own.count, 0), np.int32), np.zeros(own.count, np.int32))
                for a, own in enumerate(self.kinds) for b in range(len(self.kinds))}

    def _images(self):
        """The skin and how often the box is repeated along each edge.

        One image per body does while the edge is at least twice the reach; a skin a little
        thinner is cheaper than another image. Of the skin found, the same is found again: a
        restored list has the same images.
        """
        skin, room = self.skin, self.box / 2 - self.cutoff - 2 * self.radius - FLOAT_SLACK
        if self.wanted_repeat is not None:
            return skin, np.array(self.wanted_repeat)
        for width in np.sort(room)[::-1]:
            if skin / 2 <= width < skin:
                skin = float(width)
        reach = self.cutoff + 2 * self.radius + skin + FLOAT_SLACK
        repeat = 2 ** np.ceil(np.log2(np.maximum(2 * reach / self.box, 1))).astype(int)
        return skin, np.where(room >= skin, 1, repeat)  # rounding must not add an image
