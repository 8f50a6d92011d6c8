"""Which bodies have sites near each other.

Bodies are sorted along a path that fills the box, so that sixteen successive ones lie close
together: a block, which has a bounding box, as sixteen successive blocks have one. A body
looks for boxes in its reach and tests the sixteen bodies of a block at once, always in single
precision: places as int32 fractions of the box, whose differences wrap round, and lever arms
as floats.

The test  for sites a of one body and b of another, R from centre to centre, the distance is not
less than along R: |R + d_b − d_a| ≥ |R| − max_a d_a·R/|R| + min_b d_b·R/|R|. That costs a product
per site, not one per pair of sites, misses none, and lets few through that are apart.
"""

import numpy as np

from swirlight.compiled import CHUNKS, INNER, kernel, numba
from swirlight.forces.kernels.lowlevel import at, pick, streamlined16

WHOLE = 4294967296.0  # 2³²
LANES = 16
TINY2 = np.float32(1e-12)  # nm², what R² is lengthened by: centres may lie on each other
NOWHERE = np.float32(-1e30)  # half an edge of a box that nothing reaches


@kernel
def sort(position, edge, cells, order):
    """Order bodies along a path through all cells: to and fro along z, in columns to and fro
    along y. Stable.

    position : (n, 3) anywhere; edge : (3,) of the box that the `cells` (3,) divide.
    """
    nx, ny, nz = cells
    number, start = np.empty(position.shape[0], np.int32), np.zeros(nx * ny * nz, np.int32)
    for i in range(position.shape[0]):
        x, y, z = position[i, 0] / edge[0], position[i, 1] / edge[1], position[i, 2] / edge[2]
        x, y, z = x - np.floor(x), y - np.floor(y), z - np.floor(z)
        cx, cy, cz = min(int(x * nx), nx - 1), min(int(y * ny), ny - 1), min(int(z * nz), nz - 1)
        column = cx * ny + (cy if cx % 2 == 0 else ny - 1 - cy)
        number[i] = column * nz + (cz if column % 2 == 0 else nz - 1 - cz)
        start[number[i]] += 1
    for c in range(1, start.shape[0]):
        start[c] += start[c - 1]
    for i in range(position.shape[0] - 1, -1, -1):
        start[number[i]] -= 1
        order[start[number[i]]] = i


@kernel
def lay_out(records, centres, words, rows, word, place, arm):
    """Turn records into columns, in the order `rows`.

    word, place (3,), arm (3 sites,) : by columns; where records begin, −1 behind the last;
    int32 fractions of the box; lever arms.
    """
    for q in range(rows.shape[0]):
        r = rows[q]
        word[q] = r * words
        for k in range(3):
            if records.itemsize == 4:
                place[k, q] = centres[r, k]
            else:
                place[k, q] = np.int32(np.int64(records[r, k] * WHOLE))
        for k in range(arm.shape[0]):
            arm[k, q] = records[r, 3 + k]
    word[rows.shape[0]:] = -1


@kernel
def bound(inner_place, inner_half, count, unit, place, half):
    """Boxes, centre (3, n) and half the edges (3, n) [nm], of sixteen successive boxes each.

    count : of the inner boxes; outer ones without any are nowhere.
    Where a box is wider than half the whole it holds an image of everything in it.
    """
    half[:] = NOWHERE
    for b in range((count + LANES - 1) // LANES):
        for k in range(3):
            first, low, high = inner_place[k, LANES * b], np.inf, -np.inf
            for q in range(LANES * b, min(LANES * b + LANES, count)):
                apart = np.int32(inner_place[k, q] - first) * unit[k]
                low = min(low, apart - inner_half[k, q])
                high = max(high, apart + inner_half[k, q])
            place[k, b] = np.int32(first + np.int64(0.5 * (low + high) / unit[k]))
            half[k, b] = 0.5 * (high - low) * (1 + 1e-6) + 1e-6  # more than rounding


@kernel(fast=True, **INNER)
def _judge_boxes(place, half, begin, end, x, y, z, hx, hy, hz, unit, reach2, value):
    """value < 0 where boxes are within reach of the box at x, y, z with half edges hx, hy, hz.

    begin, end : which boxes, a whole number of vectors.
    """
    streamlined16()
    px, py, pz, gx, gy, gz = place[0], place[1], place[2], half[0], half[1], half[2]
    ux, uy, uz, nought = unit[0], unit[1], unit[2], np.float32(0.0)
    for k in range((end - begin) >> 4 << 4):
        dx = abs(np.float32(np.int32(at(px, begin, k) - x)) * ux) - (at(gx, begin, k) + hx)
        dy = abs(np.float32(np.int32(at(py, begin, k) - y)) * uy) - (at(gy, begin, k) + hy)
        dz = abs(np.float32(np.int32(at(pz, begin, k) - z)) * uz) - (at(gz, begin, k) + hz)
        dx = dx if dx > nought else nought
        dy = dy if dy > nought else nought
        dz = dz if dz > nought else nought
        value[k] = dx * dx + dy * dy + dz * dz - reach2


@kernel(fast=True, **INNER)
def _judge_centres(blocks, count, word, place, mine, x, y, z, unit, reach2, value):
    """value < 0 where a centre is within reach, of bodies in blocks other than `mine`."""
    streamlined16()
    px, py, pz = place[0], place[1], place[2]
    ux, uy, uz = unit[0], unit[1], unit[2]
    for b in range(count):
        first, out = 16 * blocks[b], value[16 * b:]
        for k in range(16):
            dx = np.float32(np.int32(at(px, first, k) - x)) * ux
            dy = np.float32(np.int32(at(py, first, k) - y)) * uy
            dz = np.float32(np.int32(at(pz, first, k) - z)) * uz
            excess = dx * dx + dy * dy + dz * dz - reach2
            j = at(word, first, k)
            out[k] = excess if (j != mine) & (j >= 0) else reach2


@kernel(fast=True, **INNER)
def _judge(blocks, count, word, place, arm, site, mine, x, y, z, three, unit, reach2, more,
           extent, value):
    """value < 0 where a site of three may be within reach of one of three of this body.

    site : (3,) rows of `arm` where those begin; three : (3, 3) arms of this body's sites.
    more : whether there were others before; extent : (2,) for what is found of each body.
    """
    streamlined16()
    px, py, pz = place[0], place[1], place[2]
    ux, uy, uz = unit[0], unit[1], unit[2]
    x0, y0, z0 = three[0, 0], three[0, 1], three[0, 2]
    x1, y1, z1 = three[1, 0], three[1, 1], three[1, 2]
    x2, y2, z2 = three[2, 0], three[2, 1], three[2, 2]
    ax, ay, az = arm[site[0]], arm[site[0] + 1], arm[site[0] + 2]
    bx, by, bz = arm[site[1]], arm[site[1] + 1], arm[site[1] + 2]
    cx, cy, cz = arm[site[2]], arm[site[2] + 1], arm[site[2] + 2]
    for b in range(count):
        first, out = 16 * blocks[b], value[16 * b:]
        own, other = extent[0, 16 * b:], extent[1, 16 * b:]
        for k in range(16):
            dx = np.float32(np.int32(at(px, first, k) - x)) * ux
            dy = np.float32(np.int32(at(py, first, k) - y)) * uy
            dz = np.float32(np.int32(at(pz, first, k) - z)) * uz
            r2 = dx * dx + dy * dy + dz * dz + TINY2
            p = dx * x0 + dy * y0 + dz * z0
            q = dx * x1 + dy * y1 + dz * z1
            r = dx * x2 + dy * y2 + dz * z2
            p = p if p > q else q
            p = p if p > r else r
            s = dx * at(ax, first, k) + dy * at(ay, first, k) + dz * at(az, first, k)
            t = dx * at(bx, first, k) + dy * at(by, first, k) + dz * at(bz, first, k)
            u = dx * at(cx, first, k) + dy * at(cy, first, k) + dz * at(cz, first, k)
            s = s if s < t else t
            s = s if s < u else u
            p = p if (not more) | (p > own[k]) else own[k]
            s = s if (not more) | (s < other[k]) else other[k]
            own[k], other[k] = p, s
            r = r2 - p + s
            r = r * abs(r) - reach2 * r2
            j = at(word, first, k)
            out[k] = r if (j != mine) & (j >= 0) else reach2


@kernel(**INNER)
def _near_blocks(x, y, z, hx, hy, hz, block, half, group, group_half, number, unit, far2, value,
                 near, near_half, near_number):
    """Copy the blocks within reach of a box to `near`, what they are to `near_number`; how many.

    The copies are filled up to whole vectors. Every block looks at all groups: N²/65536 tests for
    N bodies, which is little beside the rest up to some 10⁶.
    """
    begin, end, groups = np.int64(0), group.shape[1], 0
    _judge_boxes(group, group_half, begin, end, x, y, z, hx, hy, hz, unit, far2, value)
    for k in range(0, end, LANES):
        groups = pick(number, k, value, k, near_number, groups)
    count, waiting = 0, near_number[:groups].copy()
    for k in range(groups):
        begin = np.int64(LANES * waiting[k])
        end = begin + LANES
        _judge_boxes(block, half, begin, end, x, y, z, hx, hy, hz, unit, far2, value)
        count = pick(number, begin, value, 0, near_number, count)
    whole = (count + LANES - 1) // LANES * LANES
    for k in range(3):
        for m in range(count):
            near[k, m] = block[k, near_number[m]]
            near_half[k, m] = half[k, near_number[m]]
        for m in range(count, whole):
            near_half[k, m] = NOWHERE
    return whole


@kernel(**INNER)
def _choose_rows(begin, end, own_words, own_place, own_arm, word, place, arm, near, near_half,
                 near_number, whole, same, unit, reach2, far2, blocks, three, site, extent, value,
                 row, entries, counts):
    """Choose for successive bodies from blocks that are near to them all.

    This and `_near_blocks` are called for a block, not for each body: a call that takes arrays
    counts its references to them, which costs more than the search for one body.
    """
    own_sites, sites = own_arm.shape[0] // 3, arm.shape[0] // 3
    nought, none = np.float32(0.0), np.int64(0)
    for i in range(begin, end):
        x, y, z = own_place[0, i], own_place[1, i], own_place[2, i]
        mine = np.int32(i * own_words if same else -1)
        _judge_boxes(near, near_half, none, whole, x, y, z, nought, nought, nought, unit, far2,
                     value)
        count = none
        for k in range(0, whole, LANES):
            count = pick(near_number, k, value, k, blocks, count)
        if reach2 == far2:
            _judge_centres(blocks, count, word, place, mine, x, y, z, unit, reach2, value)
        for first in range(0, max(own_sites, sites) if reach2 < far2 else 0, 3):
            for s in range(3):
                site[s] = 3 * min(first + s, sites - 1)
                for k in range(3):
                    three[s, k] = own_arm[3 * min(first + s, own_sites - 1) + k, i]
            _judge(blocks, count, word, place, arm, site, mine, x, y, z, three, unit, reach2,
                   first > 0, extent, value)
        kept = 0
        for b in range(count):
            kept = pick(word, LANES * blocks[b], value, LANES * b, row, kept)
        counts[i] = kept
        for k in range(min(kept, entries.shape[1])):
            entries[i, k] = row[k]


@kernel(**INNER)
def _choose_some(begin, end, own_words, own_place, own_arm, own_block, own_half, word, place, arm,
                 block, half, group, group_half, number, same, unit, reach, margin, entries,
                 counts):
    blocks = block.shape[1]
    near, near_half = np.empty((3, blocks), np.int32), np.empty((3, blocks), np.float32)
    near_number, reached = np.empty(blocks, np.int32), np.empty(blocks, np.int32)
    value, row = np.empty(LANES * blocks, np.float32), np.empty(LANES * blocks, np.int32)
    extent = np.empty((2, LANES * blocks), np.float32)
    three, site = np.empty((3, 3), np.float32), np.empty(3, np.int64)
    reach2, far2 = np.float32(reach**2), np.float32((reach + margin) ** 2)
    for b in range(begin, end):
        whole = _near_blocks(own_block[0, b], own_block[1, b], own_block[2, b], own_half[0, b],
                             own_half[1, b], own_half[2, b], block, half, group, group_half,
                             number, unit, far2, value, near, near_half, near_number)
        _choose_rows(LANES * b, min(LANES * b + LANES, counts.shape[0]), own_words, own_place,
                     own_arm, word, place, arm, near, near_half, near_number, whole, same, unit,
                     reach2, far2, reached, three, site, extent, value, row, entries, counts)


@kernel(parallel=True)
def choose(own_words, own_place, own_arm, own_block, own_half, word, place, arm, block, half, group,
           group_half, number, same, unit, reach, margin, entries, counts):
    """List the bodies of one kind that have sites within reach of those of another.

    own_words : length of a record of the one; own_… : its columns, from `lay_out` and `bound`.
    word, … : columns of the other, or of its copies; number : 0, 1, 2, … for each block.
    same : whether both are one kind.
    unit : (3,) float32 nm per unit of place.
    reach, margin : of sites; how much further centres reach, 0 between sites in centres. [nm]
    entries : (n, capacity) int32 start words; counts : (n,) how many there are, which may be
        more than fit: then the list must be made again with more capacity.
    """
    blocks = (counts.shape[0] + LANES - 1) // LANES
    for chunk in numba.prange(CHUNKS):
        _choose_some(chunk * blocks // CHUNKS, (chunk + 1) * blocks // CHUNKS, own_words,
                     own_place, own_arm, own_block, own_half, word, place, arm, block, half, group,
                     group_half, number, same, unit, reach, margin, entries, counts)
