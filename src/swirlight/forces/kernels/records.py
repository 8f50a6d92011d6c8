"""The records pair kernels read, and which of their rows are near each other.

A record is one row of words: the centre as three fractions of the box edge, then the lever
arms of the interacting sites. In single precision the fractions are int32 in units of the
edge / 2³², so that a difference that overflows is the nearest image and no digits of the
position are lost; in double precision they are plain fractions in [0, 1).

A box that is too small for one image per body is repeated along each edge, a power of two
times; the records of the copies follow those of the bodies, and fractions are of the whole.
"""

import numpy as np

from swirlight.compiled import CHUNKS, kernel, numba
from swirlight.forces.kernels.lowlevel import at, streamlined16

WHOLE = 4294967296.0  # 2³²


def record_words(sites):
    """Length of a record, rounded up so that it begins well in a cache line."""
    return -(-(3 + 3 * sites) // 8) * 8


@kernel(parallel=True)
def place(position, lever, body, site, image, edge, repeat, records, centres, reference, moved):
    """Write the records of bodies `body` (n,), and how far their sites are from `reference`.

    site : (n, sites) rows of `lever`; edge : (3,) of the unrepeated box; repeat : (3,).
    image : (n, 3) box of each body when the outer list was made: a body that has since crossed
        a face keeps its place among the copies that the list's entries mean.
    records : (n repeat_x repeat_y repeat_z, words); centres : the same memory as int32.
    reference : (n, sites, 3) places of the sites; moved : (CHUNKS,) largest squared distance.
    """
    n, sites = site.shape
    for chunk in numba.prange(CHUNKS):
        furthest = 0.0
        for i in range(chunk * n // CHUNKS, (chunk + 1) * n // CHUNKS):
            b = body[i]
            for s in range(sites):
                distance2 = 0.0
                for k in range(3):
                    d = lever[site[i, s], k]
                    records[i, 3 + 3 * s + k] = d
                    distance2 += (position[b, k] + d - reference[i, s, k]) ** 2
                if distance2 > furthest or distance2 != distance2:  # NaN must come through
                    furthest = distance2
            for k in range(3):
                fraction = (position[b, k] / edge[k] - image[i, k]) / repeat[k]
                _set_centre(records, centres, i, k, fraction - np.floor(fraction))
            copy = i
            for z in range(repeat[2]):
                for y in range(repeat[1]):
                    for x in range(repeat[0]):
                        if copy > i:
                            _copy(records, centres, i, copy, x, y, z, repeat)
                        copy += n
        moved[chunk] = furthest


@kernel
def _set_centre(records, centres, row, k, fraction):
    if records.itemsize == 4:
        centres[row, k] = np.int32(np.int64(fraction * WHOLE))
    else:
        records[row, k] = fraction


@kernel
def _copy(records, centres, row, copy, x, y, z, repeat):
    """A copy of a record, x, y, z edges along."""
    for word in range(3, records.shape[1]):
        records[copy, word] = records[row, word]
    shift = (x, y, z)
    for k in range(3):
        if records.itemsize == 4:
            step = np.int64(shift[k]) * (4294967296 // repeat[k])
            centres[copy, k] = np.int32(np.int64(centres[row, k]) + step)
        else:
            records[copy, k] = records[row, k] + shift[k] / repeat[k]


@kernel(parallel=True)
def find_candidates(own, other, cell_start, slot, cells, span, edge, reach2, same, found, counts):
    """Bodies of one kind within reach of those of another, centre to centre.

    own : (n, 3) places in the box. [nm]
    other : (3, m) places in the repeated box, cell by cell, x fastest; cell_start : (cells + 1,)
    slot : (m,) their rows of the records; same : whether row i is body i itself.
    cells, span : (3,) numbers of cells, and how many of them on either side are searched.
    found : (n, capacity) int32 rows of the records; counts : (n,) how many there are, which
        may be more than fit: then the list must be made again with more capacity.
    """
    n, capacity = found.shape
    for chunk in numba.prange(CHUNKS):
        for i in range(chunk * n // CHUNKS, (chunk + 1) * n // CHUNKS):
            x, y, z = own[i]
            cx = int(x / edge[0] * cells[0])
            cy = int(y / edge[1] * cells[1])
            cz = int(z / edge[2] * cells[2])
            count = 0
            for kz in range(min(2 * span[2] + 1, cells[2])):
                for ky in range(min(2 * span[1] + 1, cells[1])):
                    line = (((cz - span[2] + kz) % cells[2]) * cells[1]
                            + (cy - span[1] + ky) % cells[1]) * cells[0]
                    # The cells along x are contiguous, in one stretch or in two.
                    width = min(2 * span[0] + 1, cells[0])
                    first = (cx - span[0]) % cells[0]
                    ends = min(first + width, cells[0])
                    for part in range(2):
                        begin, end = (first, ends) if part == 0 else (0, first + width - ends)
                        for m in range(cell_start[line + begin], cell_start[line + end]):
                            dx, dy, dz = other[0, m] - x, other[1, m] - y, other[2, m] - z
                            dx -= edge[0] * np.rint(dx / edge[0])
                            dy -= edge[1] * np.rint(dy / edge[1])
                            dz -= edge[2] * np.rint(dz / edge[2])
                            near = dx * dx + dy * dy + dz * dz < reach2
                            if near and not (same and slot[m] == i):
                                if count < capacity:
                                    found[i, count] = slot[m]
                                count += 1
            counts[i] = count


@kernel(fast=True)
def _separations(own, own_centre, other, other_centre, mine, words, found, count, edge, apart):
    """Centre to nearest image, apart[0:3], and room for the closest approach, apart[3]."""
    streamlined16()
    edge0, edge1, edge2 = edge[0], edge[1], edge[2]
    if own.itemsize == 4:
        c0, c1, c2 = own_centre[mine], own_centre[mine + 1], own_centre[mine + 2]
        for k in range(((count + 15) >> 4) << 4):
            j = found[k] * words
            apart[0, k] = np.float32(np.int32(at(other_centre, 0, j) - c0)) * edge0
            apart[1, k] = np.float32(np.int32(at(other_centre, 1, j) - c1)) * edge1
            apart[2, k] = np.float32(np.int32(at(other_centre, 2, j) - c2)) * edge2
            apart[3, k] = np.float32(1e30)
    else:
        x, y, z = own[mine], own[mine + 1], own[mine + 2]
        for k in range(((count + 15) >> 4) << 4):
            j = found[k] * words
            dx, dy, dz = at(other, 0, j) - x, at(other, 1, j) - y, at(other, 2, j) - z
            apart[0, k] = (dx - np.rint(dx)) * edge0
            apart[1, k] = (dy - np.rint(dy)) * edge1
            apart[2, k] = (dz - np.rint(dz)) * edge2
            apart[3, k] = 1e30


@kernel(fast=True)
def _approach(other, site, words, found, count, sites, apart):
    """Lower apart[3] to the squared distance of one site to any of four, (4, 3)."""
    streamlined16()
    x0, y0, z0 = sites[0, 0], sites[0, 1], sites[0, 2]
    x1, y1, z1 = sites[1, 0], sites[1, 1], sites[1, 2]
    x2, y2, z2 = sites[2, 0], sites[2, 1], sites[2, 2]
    x3, y3, z3 = sites[3, 0], sites[3, 1], sites[3, 2]
    for k in range(((count + 15) >> 4) << 4):
        j = found[k] * words
        x = apart[0, k] + at(other, site, j)
        y = apart[1, k] + at(other, site + 1, j)
        z = apart[2, k] + at(other, site + 2, j)
        a = (x - x0) * (x - x0) + (y - y0) * (y - y0) + (z - z0) * (z - z0)
        b = (x - x1) * (x - x1) + (y - y1) * (y - y1) + (z - z1) * (z - z1)
        c = (x - x2) * (x - x2) + (y - y2) * (y - y2) + (z - z2) * (z - z2)
        d = (x - x3) * (x - x3) + (y - y3) * (y - y3) + (z - z3) * (z - z3)
        a = a if a < b else b
        c = c if c < d else d
        a = a if a < c else c
        least = apart[3, k]
        apart[3, k] = a if a < least else least


@kernel(parallel=True)
def keep_near(own, own_centre, other, other_centre, own_sites, other_sites, own_words, words,
              found, found_counts, edge, reach2, entries, counts):
    """Of the candidates, those with any pair of sites within reach.

    own, other : flat records of own_words and `words` (an int32) words, with own_sites and
        other_sites lever arms each.
    found, found_counts : from `find_candidates`; edge : nm per unit of the centre's words.
    entries : (n, capacity) int32 starts of records, as many as found or more; counts : (n,).
    """
    n, capacity = entries.shape
    for chunk in numba.prange(CHUNKS):
        apart = np.empty((4, capacity), own.dtype)
        four = np.empty((4, 3), own.dtype)
        for i in range(chunk * n // CHUNKS, (chunk + 1) * n // CHUNKS):
            mine = i * own_words
            row, total = found[i], found_counts[i]
            _separations(own, own_centre, other, other_centre, mine, words, row, total, edge,
                         apart)
            for first in range(0, own_sites, 4):
                for s in range(4):
                    word = mine + 3 + 3 * min(first + s, own_sites - 1)
                    for k in range(3):
                        four[s, k] = own[word + k]
                for b in range(other_sites):
                    _approach(other, 3 + 3 * b, words, row, total, four, apart)
            count = 0
            for k in range(total):
                entries[i, count] = row[k] * words
                count += apart[3, k] < reach2
            counts[i] = count
