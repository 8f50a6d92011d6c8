"""The search for bodies near each other against the same written plainly, in NumPy."""

import itertools

import numpy as np
import pytest

from swirlight.compiled import numba
from swirlight.errors import InputError
from swirlight.forces.kernels import records, search
from swirlight.forces.kernels.lowlevel import _plain_pick, pick
from swirlight.forces.laws import CoulombLaw
from swirlight.forces.pairs import PairForces

from .plain_pairs import ATOM, FIVE, SPCE, TWO, rotation, sample

NONE = CoulombLaw("none", 0.9)
BOX = [3.0, 3.4, 2.7]


def listed(species, counts, precision="mixed", box=BOX):
    """Neighbours with their lists made, and where the bodies were."""
    system, position, orientation, box = sample(species, counts, box, precision=precision,
                                                electrostatics="none")
    pairs = PairForces(system, NONE, box)
    pairs.evaluate(position, orientation, box, *np.zeros((2, system.bodies, 3)))
    return pairs.neighbours, position, orientation, box


def least_bounds(own, other, reach, position, orientation, box):
    """(n, m) how far the test puts bodies apart, less `reach`: R² − S for their nearest images.

    Of own bodies and others: |R| less the furthest that sites reach along R.
    """
    apart = position[other.body][None] - position[own.body][:, None]
    apart -= box * np.rint(apart / box)
    distance = np.linalg.norm(apart, axis=-1)
    along = apart / np.where(distance > 0, distance, 1)[..., None]
    mine = np.einsum("nij,sj->nsi", rotation(orientation[own.body]), own.places)
    its = np.einsum("nij,sj->nsi", rotation(orientation[other.body]), other.places)
    near = np.einsum("nsi,nmi->nms", mine, along).max(axis=2)
    far = np.einsum("msi,nmi->nms", its, along).min(axis=2)
    return distance - near + far - reach


@pytest.mark.parametrize("precision", ["mixed", "double"])
@pytest.mark.parametrize(("species", "counts"), [((SPCE,), (700,)), ((ATOM,), (500,)),
                                                 ((FIVE, ATOM, TWO), (90, 150, 120))],
                         ids=["three sites", "atoms", "mixture"])
def test_lists_are_those_of_the_plain_test(species, counts, precision):
    neighbours, position, orientation, box = listed(species, counts, precision)
    assert (neighbours.repeat == 1).all()
    for (a, b), rows in neighbours.rows.items():
        own, other = neighbours.kinds[a], neighbours.kinds[b]
        excess = least_bounds(own, other, neighbours.cutoff + neighbours.skin, position,
                              orientation, box)
        if a == b:
            np.fill_diagonal(excess, np.inf)
        for i in range(own.count):
            entries = rows.entries[i, : rows.counts[i]]
            bodies = entries // other.words
            assert (entries == bodies * other.words).all()
            assert len(set(bodies)) == len(bodies)
            # in float, and with its slack: what is within 2e-5 nm may be listed or not
            assert excess[i, bodies].max(initial=-1) < 2e-5
            assert set(np.flatnonzero(excess[i] < -2e-6)) <= set(bodies)


@pytest.mark.parametrize(("species", "counts", "pair"), [((TWO, ATOM), (30, 30), (3, 41)),
                                                         ((SPCE,), (60,), (3, 41))])
def test_bodies_on_top_of_each_other_are_listed(species, counts, pair):
    system, position, orientation, box = sample(species, counts, BOX, electrostatics="none")
    position[pair[1]] = position[pair[0]]
    neighbours = PairForces(system, NONE, box).neighbours
    neighbours.make(position, orientation, box)
    for one, two in (pair, pair[::-1]):
        a, b = (next(k for k, kind in enumerate(neighbours.kinds) if body in kind.body)
                for body in (one, two))
        own, other, rows = neighbours.kinds[a], neighbours.kinds[b], neighbours.rows[a, b]
        i = int(np.flatnonzero(own.body == one)[0])
        assert two in other.body[rows.entries[i, : rows.counts[i]] // other.words]


def test_a_path_through_all_cells():
    """Stable, through every cell once, each next to the one before."""
    box, cells = np.array([2.0, 3.0, 4.0]), np.array([3, 4, 5])
    centres = (np.array(list(itertools.product(*map(range, cells)))) + 0.5) / cells * box
    position = np.concatenate([centres, centres]) + box * np.random.default_rng(1).integers(
        -2, 3, (120, 1))
    order = np.empty(120, np.int64)
    search.sort(position, box, cells, order)
    pairs = order.reshape(60, 2)
    assert (pairs[:, 1] == pairs[:, 0] + 60).all()
    step = np.abs(np.diff(centres[pairs[:, 0]] * cells / box, axis=0))
    assert np.allclose(step.sum(axis=1), 1.0)


@pytest.mark.parametrize("count", [5, 16, 100])
def test_boxes_hold_what_they_are_of(count):
    """Also where they reach round the edge."""
    rng, unit = np.random.default_rng(2), np.full(3, 3.0 / search.WHOLE, np.float32)
    wide = rng.integers(-(2**31), 2**31, (3, 1)) + rng.integers(0, 2**29, (3, count))
    place = (wide % 2**32).astype(np.uint32).view(np.int32)
    half = rng.uniform(0, 0.1, (3, count)).astype(np.float32)
    box, edges = np.zeros((3, 16), np.int32), np.empty((3, 16), np.float32)
    search.bound(place, half, count, unit, box, edges)
    for b in range(-(-count // 16)):
        inner = slice(16 * b, min(16 * b + 16, count))
        apart = np.int32(place[:, inner] - box[:, b:b + 1]) * unit[:, None].astype(float)
        low, high = (apart - half[:, inner]).min(axis=1), (apart + half[:, inner]).max(axis=1)
        assert (low >= -edges[:, b]).all() and (high <= edges[:, b]).all()
        assert np.abs(high - low - 2 * edges[:, b]).max() < 1e-5  # and no larger
    assert (edges[:, -(-count // 16):] < 0).all()


def test_columns_hold_the_records():
    rng = np.random.default_rng(3)
    for dtype in (np.float32, np.float64):
        kept = rng.random((7, 16)).astype(dtype)
        rows = np.array([4, 1, 6])
        word, place, arm = (np.zeros(16, np.int32), np.zeros((3, 16), np.int32),
                            np.zeros((9, 16), np.float32))
        search.lay_out(kept, kept.view(np.int32), 16, rows, word, place, arm)
        assert word.tolist() == [64, 16, 96] + 13 * [-1]
        assert (arm[:, :3] == kept[rows, 3:12].T.astype(np.float32)).all()
        expected = (kept.view(np.int32)[rows, :3] if dtype == np.float32
                    else (kept[rows, :3] * 2.0**32).astype(np.int64).astype(np.uint32)
                    .view(np.int32))
        assert (place[:, :3] == expected.T).all()


def test_picked_numbers_are_those_of_negative_values():
    @numba.njit
    def pick_all(source, value, target):
        count = 0
        for k in range(0, len(source), 16):
            count = pick(source, k, value, k, target, count)
        return count

    rng = np.random.default_rng(4)
    source, value = rng.integers(0, 10**6, 160).astype(np.int32), rng.normal(size=160)
    value = value.astype(np.float32)
    value[[3, 77]] = np.nan, 0.0
    expected = source[value < 0]
    target = np.zeros(176, np.int32)
    assert pick_all(source, value, target) == len(expected)
    assert (target[: len(expected)] == expected).all()
    target, count = np.zeros(176, np.int32), 0
    for k in range(0, 160, 16):  # what other processors compile
        count = _plain_pick(source, k, value, k, target, count)
    assert (target[:count] == expected).all()


@pytest.mark.parametrize("dtype", [np.float32, np.float64])
def test_records_hold_centres_and_arms(dtype):
    """Copies too, and how far sites have moved since they were placed anew."""
    rng, box, repeat = np.random.default_rng(5), np.array([1.5, 2.0, 2.5]), np.array([2, 1, 2])
    _, position, orientation, _ = sample([SPCE], [20], box)
    body, places = rng.permutation(20)[:13], SPCE.sites
    kept = np.zeros((13 * 4, records.record_words(3)), dtype)
    image, reference = np.empty((13, 3)), np.empty((13, 3, 3))

    def place(anew):
        return records.place(position, orientation, body, places, box, repeat, anew, image,
                             reference, kept, kept.view(np.int32))

    assert place(True) == 0.0
    first = position[body] + 0.0
    position[body[4]] += [0.03, 0.0, box[2]]  # across a face: the copies keep their places
    assert place(False) == pytest.approx(0.03**2 + box[2] ** 2, rel=1e-12)
    inside = position[body] / box - np.floor(first / box)
    shift = np.array([[x, y, z] for z in range(2) for y in range(1) for x in range(2)])
    share = (inside[None] + shift[:, None]) / repeat
    share = (share - np.floor(share)).reshape(-1, 3)
    got = kept[:, :3].astype(float) if dtype == np.float64 else (
        kept.view(np.uint32)[:, :3] / 2.0**32)
    wrong = (got - share + 0.5) % 1.0 - 0.5
    assert np.abs(wrong).max() < (1e-15 if dtype == np.float64 else 3e-10)
    arms = np.einsum("nij,sj->nsi", rotation(orientation[body]), places).reshape(13, 9)
    assert np.abs(kept[:, 3:12] - np.tile(arms, (4, 1))).max() < np.finfo(dtype).eps


def test_more_words_than_an_entry_can_name_are_refused():
    kind = listed((FIVE,), (90,))[0].kinds[0]
    with pytest.raises(InputError, match="too many for one box; at most"):
        kind.make_room(2**31 // (90 * kind.words) + 1, np.float32)
