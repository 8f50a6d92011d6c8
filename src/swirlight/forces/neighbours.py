"""Which bodies are near which: two lists, one inside the other.

The outer list holds bodies whose centres were near when it was made; turning does not
matter to it. The inner list, which the pair kernels read, holds those of it with any two
sites within cutoff + skin. It is chosen anew when a site has moved by half its skin, and
the outer one when a centre has moved by half the gap between the two. So no pair of sites
within the cutoff is ever missed.

Both are full lists, a row per body, an entry per (body, image): where the box is too small
for one image per body it is repeated (see `kernels/records.py`).
"""

from dataclasses import dataclass

import numpy as np

from swirlight.compiled import CHUNKS
from swirlight.errors import RunError
from swirlight.forces.kernels import records as kernels
from swirlight.forces.sites import place_sites

LANES = 16  # rows are filled up to a multiple of this
SKINS = (0.02, 0.3)  # the least and the largest inner skin. [nm]
FIRST_SKIN, GAP = 0.08, 0.15  # inner skin to begin with; outer minus inner skin. [nm]
FLOAT_SLACK = 1e-5  # what distances in float may be wrong by, and more. [nm]
LOST = "positions or orientations are no longer finite numbers"
# Time of one choice of the inner list over that of one call of the forces (measured).
LIST_COST = 0.7


@dataclass
class Kind:
    """The bodies of one species as the kernels see them, in the order of their cells.

    first, count : which bodies; types, local : (sites,) the interacting sites, by type and by
    place in the body; radius : of the outermost [nm]; central : a single site in the centre.
    body : (count,) in the order of the records; site : (count, sites) rows of the lever arms;
    place : (count, 3) wrapped, when the outer list was made, and image : in which box that
    was; reference : (count, sites, 3)
    where the sites were when the inner list was made.
    """

    first: int
    count: int
    types: np.ndarray
    local: np.ndarray
    radius: float
    central: bool
    body: np.ndarray | None = None
    site: np.ndarray | None = None
    fractions: np.ndarray | None = None
    image: np.ndarray | None = None
    records: np.ndarray | None = None
    reference: np.ndarray | None = None

    @property
    def sites(self):
        return len(self.types)

    @property
    def words(self):
        """Length of a record."""
        return kernels.record_words(self.sites)

    @property
    def centres(self):
        """The records as int32."""
        return self.records.view(np.int32)


class Grid:
    """Cells of at least half the reach in the repeated box; places as int32 fractions of it."""

    def __init__(self, box, repeat, reach, bodies):
        self.box, self.repeat = box, repeat
        edge = box * repeat
        # More cells than bodies would only be empty.
        most = max(4, int(np.ceil((8 * bodies * np.prod(repeat)) ** (1 / 3))))
        self.cells = np.clip(np.floor(2 * edge / reach), 1, most).astype(int)
        self.width = np.minimum(self.cells, 5)
        self.unit = (edge / kernels.WHOLE).astype(np.float32)

    def fractions(self, position):
        """(n, 3) int32 fractions of the repeated box, in its first copy of the box."""
        share = position / self.box
        whole = (share - np.floor(share)) / self.repeat * kernels.WHOLE
        return whole.astype(np.int64).astype(np.uint32).view(np.int32)

    def copies(self, fractions):
        """Those of all images, copy by copy, x fastest."""
        x, y, z = (np.arange(n) for n in self.repeat)
        shift = np.stack(np.meshgrid(z, y, x, indexing="ij"), axis=-1).reshape(-1, 3)[:, ::-1]
        step = (shift * (2**32 // self.repeat)).astype(np.uint32).view(np.int32)
        return (fractions[None] + step[:, None]).reshape(-1, 3)

    def cell(self, fractions):
        """(n, 3) the cell of each place."""
        return (fractions.view(np.uint32).astype(np.int64) * self.cells) >> 32

    def number(self, fractions):
        """Cells numbered through, x fastest."""
        x, y, z = self.cell(fractions).T
        return (z * self.cells[1] + y) * self.cells[0] + x


def _whole_lanes(count):
    return (int(count) // LANES + 1) * LANES


class Rows:
    """The lists of one kind's bodies against another's."""

    def __init__(self):
        self.capacity = LANES
        self.entries = self.counts = None

    def find(self, own, other, grid, reach, same):
        """List the bodies of `other` within reach of those of `own`, centre to centre."""
        place = grid.copies(other.fractions)
        cell = grid.number(place)
        slot = np.argsort(cell, kind="stable").astype(np.int32)
        start = np.searchsorted(cell[slot], np.arange(np.prod(grid.cells) + 1))
        slot = np.concatenate([slot, np.zeros(LANES, np.int32)])
        sorted_place = np.ascontiguousarray(place[slot].T)
        expected = len(place) * 4.19 * reach**3 / np.prod(grid.box * grid.repeat)
        self.capacity = max(self.capacity, _whole_lanes(1.2 * expected))
        while True:
            self.found = np.zeros((own.count, self.capacity), np.int32)
            self.found_counts = np.zeros(own.count, np.int32)
            kernels.find_candidates(own.fractions, grid.cell(own.fractions), sorted_place, start,
                                    slot, grid.cells, grid.width, grid.unit,
                                    np.float32((reach + FLOAT_SLACK) ** 2), same,
                                    self.found, self.found_counts)
            most = int(self.found_counts.max())
            if most <= self.capacity:
                break
            self.capacity = _whole_lanes(1.1 * most)
        self.entries = np.zeros_like(self.found)
        self.counts = np.zeros_like(self.found_counts)

    def choose(self, own, other, unit, reach):
        """List, of those found, the bodies with any two sites within reach."""
        dtype, widest = own.records.dtype.type, reach + own.radius + other.radius
        kernels.keep_near(own.records.ravel(), own.centres.ravel(), other.records.ravel(),
                          other.centres.ravel(), own.sites, other.sites, own.words,
                          np.int32(other.words), self.found, self.found_counts, unit,
                          dtype((reach + FLOAT_SLACK) ** 2), dtype((widest + FLOAT_SLACK) ** 2),
                          self.entries, self.counts)


def interacting_kinds(system, interacting):
    """One `Kind` for each species that has interacting sites (a mask of the types)."""
    kinds, first = [], 0
    for k, count in enumerate(system.counts):
        types = np.arange(system.type_start[k], system.type_start[k + 1])
        local = np.flatnonzero(interacting[types])
        if len(local) and count:
            places = system.type_position[types[local]]
            radius = float(np.sqrt((places**2).sum(axis=1)).max())
            kinds.append(Kind(first, count, types[local], local, radius,
                              central=len(local) == 1 and radius == 0.0))
        first += count
    return kinds


class Neighbours:
    """The neighbour lists of a system: call `update` before the forces.

    kinds : the `Kind`s; rows : {(own, other): Rows} by their numbers.
    unit : (2, 3) nm per unit of a record's centre words, of the records' type, and what that
        type's rounding left of it.
    """

    def __init__(self, system, kinds, cutoff, dtype, repeat=None):
        """repeat : (3,) times to repeat the box; None: as few as one image per body allows."""
        self.system, self.kinds, self.cutoff = system, kinds, cutoff
        self.dtype, self.wanted_repeat = np.dtype(dtype), repeat
        self.rows = {(a, b): Rows() for a in range(len(kinds)) for b in range(len(kinds))}
        self.lever = np.empty((int(system.site_start[-1]), 3))
        self.radius = max((k.radius for k in kinds), default=0.0)
        self.skin, self.outer_skin, self.calls = FIRST_SKIN, None, 0
        self.last_moved = 0.0  # what the last call found the sites to have moved
        self.moved = np.zeros(CHUNKS)
        self.box = None  # that the lists were made for

    def update(self, position, orientation, box):
        """Bring records and lists up to date with where the bodies are.

        Raises RunError when that is no longer known (NaN).
        """
        place_sites(self.system, position, orientation, self.lever)
        if self.box is None or not np.array_equal(box, self.box):
            self.make_outer(position, box)
        else:
            moved = self._place(position, box)
            self.calls += moved != self.last_moved  # a call at the same places is no new one
            self.last_moved = moved
            if 2 * moved <= self.skin:
                return
            self._adapt_skin(2 * moved)
            drift = np.sqrt(((position - self.outer_position) ** 2).sum(axis=1).max())
            if self.skin + 2 * drift > self.outer_skin:
                self.make_outer(position, box)
        self.choose_inner(position, orientation)

    def memory(self):
        """What `restore` needs to make the same lists again: a dict of arrays."""
        if self.box is None:
            return {}
        return {
            "skins": np.array([self.skin, self.outer_skin, self.calls, self.last_moved]),
            "box": self.box,
            "outer_position": self.outer_position,
            "inner_position": self.inner_position,
            "inner_orientation": self.inner_orientation,
        }

    def restore(self, memory):
        """Make the lists again from what `memory` returned."""
        self.box = None
        if not memory:
            return
        self.skin, outer_skin, calls, last_moved = (float(value) for value in memory["skins"])
        position, orientation = memory["inner_position"], memory["inner_orientation"]
        place_sites(self.system, position, orientation, self.lever)
        self.make_outer(memory["outer_position"], memory["box"], outer_skin)
        self.choose_inner(position, orientation)
        self.calls, self.last_moved = int(calls), last_moved

    def _adapt_skin(self, moved):
        """Set the inner skin to what costs least at the speed sites were seen to move.

        A call costs in proportion to 1 + 3 skin/cutoff, and LIST_COST speed/skin more.
        """
        speed = moved / self.calls
        if self.calls > 1 or moved < 2 * self.skin:  # else bodies were moved, they did not move
            best = np.sqrt(LIST_COST * speed * self.cutoff / 3)
            self.skin = float(np.clip(0.5 * (self.skin + best), *SKINS))

    def _place(self, position, box):
        """Write all records; the largest distance of a site from the inner list's places."""
        furthest = 0.0
        for kind in self.kinds:
            kernels.place(position, self.lever, kind.body, kind.site, kind.image, box,
                          self.repeat, kind.records, kind.centres, kind.reference, self.moved)
            moved = float(self.moved.max())
            if not np.isfinite(moved):
                raise RunError(LOST)
            furthest = max(furthest, moved)
        return np.sqrt(furthest)

    def make_outer(self, position, box, outer_skin=None):
        """Sort the bodies into cells and list all with centres near each other."""
        if not np.isfinite(position).all():
            raise RunError(LOST)
        self.box, self.outer_position = np.array(box), np.array(position)
        self.outer_skin, self.repeat = self._images(outer_skin)
        reach = self.cutoff + 2 * self.radius + self.outer_skin
        grid = Grid(self.box, self.repeat, reach, self.system.bodies)
        for kind in self.kinds:
            self._sort(kind, grid)
        for (a, b), rows in self.rows.items():
            own, other = self.kinds[a], self.kinds[b]
            near = self.cutoff + own.radius + other.radius + self.outer_skin
            rows.find(own, other, grid, near, same=a == b)

    def _images(self, outer_skin):
        """The outer skin and how often the box is repeated along each edge.

        One image per body does while the edge is at least twice the reach; a skin a little
        thinner is cheaper than another image.
        """
        if outer_skin is None:
            outer_skin = self.skin + GAP
            room = self.box / 2 - self.cutoff - 2 * self.radius
            tight = room[(room < outer_skin) & (room >= self.skin + GAP / 2)]
            outer_skin = float(min([outer_skin, *tight]))
        if self.wanted_repeat is not None:
            return outer_skin, np.array(self.wanted_repeat)
        reach = self.cutoff + 2 * self.radius + outer_skin
        return outer_skin, 2 ** np.ceil(np.log2(np.maximum(2 * reach / self.box, 1))).astype(int)

    def _sort(self, kind, grid):
        """Order a kind's bodies by cells; make room for their records."""
        bodies = np.arange(kind.first, kind.first + kind.count)
        fractions = grid.fractions(self.outer_position[bodies])
        order = np.argsort(grid.number(fractions), kind="stable")
        kind.body = bodies[order]
        kind.site = self.system.site_start[kind.body][:, None] + kind.local
        kind.fractions = fractions[order]
        kind.image = np.floor(self.outer_position[kind.body] / self.box)
        shape = (kind.count * int(np.prod(self.repeat)), kind.words)
        kind.records = np.zeros(shape, self.dtype)
        kind.reference = np.zeros((*kind.site.shape, 3))

    def choose_inner(self, position, orientation):
        """List, of the outer list, the bodies that have sites near each other."""
        self.inner_position, self.inner_orientation = np.array(position), np.array(orientation)
        self.calls, self.last_moved = 0, 0.0
        for kind in self.kinds:
            kind.reference[:] = position[kind.body][:, None] + self.lever[kind.site]
        self._place(position, self.box)
        whole = kernels.WHOLE if self.dtype == np.float32 else 1.0
        unit = self.box * self.repeat / whole
        self.unit = np.array([unit, unit - unit.astype(self.dtype)], self.dtype)
        for (a, b), rows in self.rows.items():
            rows.choose(self.kinds[a], self.kinds[b], self.unit[0], self.cutoff + self.skin)
