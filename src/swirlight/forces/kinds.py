"""The bodies of one species as the kernels see them, and as the search for neighbours does."""

from dataclasses import dataclass, field

import numpy as np

from swirlight.errors import InputError
from swirlight.forces.kernels import records, search

CACHE_LINE = 64  # bytes


class Columns:
    """Bodies, or all their copies, as the search reads them.

    order : the rows of the records in the order of the columns.
    arrays : word, place, arm of each, box and half edges of blocks, and of groups of blocks,
        as `kernels.search` has them, and the numbers of the blocks.
    """

    def __init__(self, count, sites):
        lanes = search.LANES
        self.order = np.arange(count)
        blocks = _whole(count, lanes**2) // lanes
        groups = _whole(blocks // lanes, lanes)
        # An odd number of blocks: rows of a power of two would share a set of the cache.
        columns = (-(-count // lanes) | 1) * lanes
        self.arrays = (aligned(columns, np.int32), aligned((3, columns), np.int32),
                       aligned((3 * sites, columns), np.float32),
                       aligned((3, blocks), np.int32), aligned((3, blocks), np.float32),
                       aligned((3, groups), np.int32), aligned((3, groups), np.float32),
                       np.arange(blocks, dtype=np.int32))

    def fill(self, kind, unit):
        """Bring them up to date with the records of a kind."""
        word, place, arm, block, half, group, group_half, _ = self.arrays
        search.lay_out(kind.records, kind.centres, kind.words, self.order, word, place, arm)
        points = np.zeros((3, len(self.order)), np.float32)
        search.bound(place, points, len(self.order), unit, block, half)
        search.bound(block, half, -(-len(self.order) // search.LANES), unit, group, group_half)


def aligned(shape, dtype):
    """Zeros that begin with a line of the cache, or vectors would straddle two."""
    size = int(np.prod(shape)) * np.dtype(dtype).itemsize
    memory = np.zeros(size + CACHE_LINE, np.uint8)
    first = -memory.ctypes.data % CACHE_LINE
    return memory[first:first + size].view(dtype).reshape(shape)


def _whole(count, size):
    """The least multiple of `size` that is not less than `count`."""
    return -(-count // size) * size


@dataclass
class Kind:
    """The bodies of one species as the kernels see them, in the order of their cells.

    first, count : which bodies; types : (sites,) of the interacting sites; places : (sites, 3)
    of them in the body [nm]; radius : of the outermost [nm]; central : a single site in
    the centre.
    body : (count,) in the order of the records; image : in which box each was when the list was
    made; reference : (count, sites, 3) where the sites were then.
    own, copies : `Columns` of the bodies, and of them with all their copies.
    """

    first: int
    count: int
    types: np.ndarray
    places: np.ndarray
    radius: float
    central: bool
    body: np.ndarray = field(init=False, default=None)
    image: np.ndarray = field(init=False, default=None)
    records: np.ndarray = field(init=False, default=None)
    reference: np.ndarray = field(init=False, default=None)
    own: Columns = field(init=False, default=None)
    copies: Columns = field(init=False, default=None)

    @property
    def sites(self):
        return len(self.types)

    @property
    def words(self):
        """Length of a record."""
        return records.record_words(self.sites)

    @property
    def centres(self):
        """The records as int32."""
        return self.records.view(np.int32)

    def make_room(self, copies, dtype):
        """Arrays for so many copies of each body.

        Raises InputError where there are more words than an entry of a list can name.
        """
        rows = self.count * copies
        if self.records is not None and len(self.records) == rows:
            return
        if rows * self.words >= 2**31:
            raise InputError(f"{rows} bodies (or images of them) of {self.sites} interacting sites"
                             f" are too many for one box; at most {2**31 // self.words} go in")
        self.records = aligned((rows, self.words), dtype)
        self.image = np.empty((self.count, 3))
        self.reference = np.empty((self.count, self.sites, 3))
        self.own = self.copies = Columns(self.count, self.sites)
        if copies > 1:
            self.copies = Columns(rows, self.sites)

    def sort(self, position, box, repeat):
        """Order the bodies along a path through the box, and all copies along another."""
        order, edge = np.empty(self.count, np.int64), box * repeat
        cells = _cells(edge, len(self.records))
        place = position[self.first:self.first + self.count]
        if self.copies is self.own:
            search.sort(place, edge, cells, order)
        else:
            place = place - box * np.floor(place / box)
            search.sort(place, edge, cells, order)
            z, y, x = np.indices(repeat[::-1]).reshape(3, -1)
            images = place[order] + (np.array([x, y, z]).T * box)[:, None]
            search.sort(images.reshape(-1, 3), edge, cells, self.copies.order)
        self.body = self.first + order


def _cells(edge, bodies):
    """How many cells along each edge: columns along z that hold a block in a cube."""
    density = bodies / edge.prod()
    width = (search.LANES / density) ** (1 / 3) * np.array([1.0, 1.0, 1 / search.LANES])
    return np.maximum(np.rint(edge / width), 1).astype(np.int64)


def interacting_kinds(system, interacting):
    """One `Kind` for each species that has interacting sites (a mask of the types)."""
    kinds, first = [], 0
    for k, count in enumerate(system.counts):
        types = np.arange(system.type_start[k], system.type_start[k + 1])
        types = types[interacting[types]]
        if len(types) and count:
            places = system.type_position[types]
            radius = float(np.sqrt((places**2).sum(axis=1)).max())
            kinds.append(Kind(first, count, types, places, radius,
                              central=len(types) == 1 and radius == 0.0))
        first += count
    return kinds
