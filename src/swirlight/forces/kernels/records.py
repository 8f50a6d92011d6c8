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
from swirlight.forces.kernels.lowlevel import at, pick, streamlined16

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


@kernel(fast=True)
def _distances(other, first, count, x, y, z, unit, distance2):
    """Squared distances [nm²] of a stretch of places to one place, all given in fractions."""
    streamlined16()
    ux, uy, uz = unit[0], unit[1], unit[2]
    for m in range(((count + 15) >> 4) << 4):
        dx = np.float32(np.int32(other[0, first + m] - x)) * ux
        dy = np.float32(np.int32(other[1, first + m] - y)) * uy
        dz = np.float32(np.int32(other[2, first + m] - z)) * uz
        distance2[m] = dx * dx + dy * dy + dz * dz


@kernel
def _near_one(place, cell, other, cell_start, slot, cells, width, unit, reach2, distance2, row):
    """Rows of the records near one place, written to `row`; how many they are."""
    nought, one, count = np.float32(0.0), np.int32(1), 0
    # The cells along x are contiguous, in one stretch or in two.
    begin = (cell[0] - 2) % cells[0]
    end = min(begin + width[0], cells[0])
    for zy in range(width[2] * width[1]):
        z = (cell[2] - 2 + zy // width[1]) % cells[2]
        y = (cell[1] - 2 + zy % width[1]) % cells[1]
        line = (z * cells[1] + y) * cells[0]
        for part in range(2):
            start = cell_start[line + (begin if part == 0 else 0)]
            stop = cell_start[line + (end if part == 0 else begin + width[0] - end)]
            _distances(other, start, stop - start, place[0], place[1], place[2], unit, distance2)
            stretch = slot[start:]
            for m in range(0, stop - start, 16):
                count = pick(stretch, m, stop - start, distance2, nought, reach2, one, row, count)
    return count


@kernel(parallel=True)
def find_candidates(own, own_cell, other, cell_start, slot, cells, width, unit, reach2, same,
                    found, counts):
    """Bodies of one kind within reach of those of another, centre to centre.

    own : (n, 3), other : (3, m) int32 fractions of the repeated box, `other` cell by cell, x
    fastest; own_cell : (n, 3); cell_start : (cells + 1,); cells : (3,), of half the reach;
    width : (3,) how many of them are searched, two on either side but none twice.
    slot : (m,) the rows of the records of `other`; same : whether row i is body i itself.
    Both `other` and `slot` go on for 16 more, never listed, for the sake of whole vectors.
    unit : (3,) float32 nm per unit of the fractions.
    found : (n, capacity) int32 rows of the records; counts : (n,) how many there are, which
        may be more than fit: then the list must be made again with more capacity.
    """
    n, capacity = found.shape
    for chunk in numba.prange(CHUNKS):
        distance2 = np.empty(slot.shape[0], np.float32)
        row = np.empty(slot.shape[0], np.int32)
        for i in range(chunk * n // CHUNKS, (chunk + 1) * n // CHUNKS):
            count = _near_one(own[i], own_cell[i], other, cell_start, slot, cells, width, unit,
                              reach2, distance2, row)
            kept = 0
            for k in range(count):
                if kept < capacity:
                    found[i, kept] = row[k]
                kept += not (same and row[k] == i)
            counts[i] = kept


@kernel(fast=True)
def _separations(own, own_centre, other, other_centre, mine, words, found, count, edge, apart):
    """Centre to nearest image, apart[0:3], and the square of the distance, apart[3]."""
    streamlined16()
    edge0, edge1, edge2 = edge[0], edge[1], edge[2]
    if own.itemsize == 4:
        c0, c1, c2 = own_centre[mine], own_centre[mine + 1], own_centre[mine + 2]
        for k in range(((count + 15) >> 4) << 4):
            j = found[k] * words
            dx = np.float32(np.int32(at(other_centre, 0, j) - c0)) * edge0
            dy = np.float32(np.int32(at(other_centre, 1, j) - c1)) * edge1
            dz = np.float32(np.int32(at(other_centre, 2, j) - c2)) * edge2
            apart[0, k], apart[1, k], apart[2, k] = dx, dy, dz
            apart[3, k] = dx * dx + dy * dy + dz * dz
    else:
        x, y, z = own[mine], own[mine + 1], own[mine + 2]
        for k in range(((count + 15) >> 4) << 4):
            j = found[k] * words
            dx, dy, dz = at(other, 0, j) - x, at(other, 1, j) - y, at(other, 2, j) - z
            dx = (dx - np.floor(dx + 0.5)) * edge0
            dy = (dy - np.floor(dy + 0.5)) * edge1
            dz = (dz - np.floor(dz + 0.5)) * edge2
            apart[0, k], apart[1, k], apart[2, k] = dx, dy, dz
            apart[3, k] = dx * dx + dy * dy + dz * dz


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


@kernel
def _keep_one(own, own_centre, other, other_centre, mine, own_sites, other_sites, words, row,
              total, edge, near2, far2, apart, four, unsure, entries):
    """The part of a row that is near, written to `entries`; how many they are."""
    nought, one = own.dtype.type(0.0), np.int32(1)
    distance2 = apart[3]
    _separations(own, own_centre, other, other_centre, mine, words, row, total, edge, apart)
    count = left = 0
    for k in range(0, total, 16):
        count = pick(row, k, total, distance2, nought, near2, words, entries, count)
        left = pick(row, k, total, distance2, near2, far2, one, unsure, left)
    _separations(own, own_centre, other, other_centre, mine, words, unsure, left, edge, apart)
    for first in range(0, own_sites, 4):
        for s in range(4):
            word = mine + 3 + 3 * min(first + s, own_sites - 1)
            for k in range(3):
                four[s, k] = own[word + k]
        for b in range(other_sites):
            _approach(other, 3 + 3 * b, words, unsure, left, four, apart)
    for k in range(0, left, 16):
        count = pick(unsure, k, left, distance2, nought, near2, words, entries, count)
    return count


@kernel(parallel=True)
def keep_near(own, own_centre, other, other_centre, own_sites, other_sites, own_words, words,
              found, found_counts, edge, near2, far2, entries, counts):
    """Of the candidates, those with any pair of sites, or the centres, within reach.

    own, other : flat records of own_words and `words` (an int32) words, with own_sites and
        other_sites lever arms each.
    found, found_counts : from `find_candidates`; edge : nm per unit of the centre's words.
    near2 : reach²; far2 : of centres too far apart for any pair of sites to be within reach.
    entries : (n, capacity) int32 starts of records, capacity as of `found`; counts : (n,).
    """
    n, capacity = entries.shape
    for chunk in numba.prange(CHUNKS):
        apart = np.empty((4, capacity), own.dtype)
        four = np.empty((4, 3), own.dtype)
        unsure = np.zeros(capacity, np.int32)
        for i in range(chunk * n // CHUNKS, (chunk + 1) * n // CHUNKS):
            counts[i] = _keep_one(own, own_centre, other, other_centre, i * own_words, own_sites,
                                  other_sites, words, found[i], found_counts[i], edge, near2,
                                  far2, apart, four, unsure, entries[i])
