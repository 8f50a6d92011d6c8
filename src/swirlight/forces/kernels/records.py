"""The records pair kernels read.

A record is one row of words: the centre as three fractions of the box edge, then the lever
arms of the interacting sites. In single precision the fractions are int32 in units of the
edge / 2³², so that a difference that overflows is the nearest image and no digits of the
position are lost; in double precision they are plain fractions in [0, 1).

A box that is too small for one image per body is repeated along each edge, a power of two
times; the records of the copies follow those of the bodies, and fractions are of the whole.
"""

import numpy as np

from swirlight.compiled import CHUNKS, INNER, kernel, numba
from swirlight.forces.kernels.search import WHOLE
from swirlight.rotation_kernels import matrix_entries


def record_words(sites):
    """Length of a record, rounded up so that it begins well in a cache line."""
    return -(-(3 + 3 * sites) // 8) * 8


@kernel(**INNER)
def _set_centre(records, centres, row, k, fraction):
    if records.itemsize == 4:
        centres[row, k] = np.int32(np.int64(fraction * WHOLE))
    else:
        records[row, k] = fraction


@kernel(**INNER)
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


@kernel(**INNER)
def _place_some(begin, end, position, orientation, body, site, edge, repeat, anew, image,
                reference, records, centres):
    n, sites, furthest = body.shape[0], site.shape[0], 0.0
    per_edge = 1.0 / edge[0], 1.0 / edge[1], 1.0 / edge[2]
    per_copy = 1.0 / repeat[0], 1.0 / repeat[1], 1.0 / repeat[2]  # exact
    turns = np.any(site != 0.0)  # an atom's only site is its centre
    turn = matrix_entries(1.0, 0.0, 0.0, 0.0)
    for i in range(begin, end):
        b = body[i]
        if turns:
            turn = matrix_entries(orientation[b, 0], orientation[b, 1], orientation[b, 2],
                                  orientation[b, 3])
        for s in range(sites):
            distance2 = 0.0
            for k in range(3):
                d = (turn[3 * k] * site[s, 0] + turn[3 * k + 1] * site[s, 1]
                     + turn[3 * k + 2] * site[s, 2])
                records[i, 3 + 3 * s + k] = d
                if anew:
                    reference[i, s, k] = position[b, k] + d
                distance2 += (position[b, k] + d - reference[i, s, k]) ** 2
            if distance2 > furthest or distance2 != distance2:  # NaN must come through
                furthest = distance2
        for k in range(3):
            share = position[b, k] * per_edge[k]
            if anew:
                image[i, k] = np.floor(share)
            fraction = (share - image[i, k]) * per_copy[k]
            _set_centre(records, centres, i, k, fraction - np.floor(fraction))
        copy = i
        for z in range(repeat[2]):
            for y in range(repeat[1]):
                for x in range(repeat[0]):
                    if copy > i:
                        _copy(records, centres, i, copy, x, y, z, repeat)
                    copy += n
    return furthest


@kernel(parallel=True)
def place(position, orientation, body, site, edge, repeat, anew, image, reference, records,
          centres):
    """Write the records of bodies `body` (n,); the largest squared distance of a site from
    `reference`.

    position, orientation : (N, 3), (N, 4) of all bodies; site : (sites, 3) in the body's frame.
    edge : (3,) of the unrepeated box; repeat : (3,).
    anew : whether a list is being made, and image and reference are to be set.
    image : (n, 3) box of each body when the list was made: a body that has since crossed
        a face keeps its place among the copies that the list's entries mean.
    reference : (n, sites, 3) where the sites were then.
    records : (n repeat_x repeat_y repeat_z, words); centres : the same memory as int32.
    """
    n = body.shape[0]
    moved = np.empty(CHUNKS)
    for chunk in numba.prange(CHUNKS):
        moved[chunk] = _place_some(chunk * n // CHUNKS, (chunk + 1) * n // CHUNKS, position,
                                   orientation, body, site, edge, repeat, anew, image, reference,
                                   records, centres)
    furthest = 0.0
    for chunk in range(CHUNKS):
        if moved[chunk] > furthest or moved[chunk] != moved[chunk]:
            furthest = moved[chunk]
    return furthest
