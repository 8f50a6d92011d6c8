"""The neighbour list misses no pair, keeps up with motion, and is made again bit for bit."""

import itertools

import numpy as np
import pytest

from swirlight.errors import InputError, RunError
from swirlight.forces.box import check_box
from swirlight.forces.laws import CoulombLaw
from swirlight.forces.neighbours import FLOAT_SLACK
from swirlight.forces.pairs import PairForces

from .plain_pairs import ATOM, SPCE, TWO, plain_forces, rotation, sample

NONE, EWALD = CoulombLaw("none", 0.9), CoulombLaw("ewald", 0.9, alpha=3.4)


def forces(pairs, position, orientation, box):
    force, torque = np.zeros((2, len(position), 3))
    pairs.evaluate(position, orientation, box, force, torque)
    return force, torque


def relative(got, expected):
    return np.sqrt(((got - expected) ** 2).mean() / (expected**2).mean())


def plain_rows(system, neighbours, position, orientation, box):
    """Of every body of the first kind, the (body, image) set with sites within reach."""
    reach = 0.9 + neighbours.skin
    sites = np.einsum("nij,sj->nsi", rotation(orientation), system.species[0].sites)
    centre = position - box * np.floor(position / box)
    place = centre[:, None] + sites
    expected = [set() for _ in position]
    for image in itertools.product(range(-2, 3), repeat=3):
        shifted = place + np.array(image) * box
        for i in range(len(position)):
            near = (((shifted[:, :, None] - place[i]) ** 2).sum(-1) < reach**2).any(axis=(1, 2))
            near[i] &= any(image)
            expected[i] |= {(int(j), image) for j in np.flatnonzero(near)}
    return expected


@pytest.mark.parametrize("box", [[1.82, 1.9, 2.3], [2.9, 1.85, 4.4]])
def test_lists_hold_every_image_within_reach(box):
    """Also where one body meets two images of another."""
    system, position, orientation, box = sample([TWO], [60], box, precision="double")
    pairs = PairForces(system, NONE, box)
    forces(pairs, position, orientation, box)
    neighbours = pairs.neighbours
    kind, rows = neighbours.kinds[0], neighbours.rows[0, 0]
    expected = plain_rows(system, neighbours, position, orientation, box)
    spare = 0
    for i, body in enumerate(kind.body):
        slots = rows.entries[i, : rows.counts[i]] // kind.words
        listed = kind.body[slots % kind.count].tolist()
        for other, _ in expected[body]:
            listed.remove(other)  # ValueError: an image is missing
        spare += len(listed)
    # What is left is near along the line of centres only, by less than d²/reach, d < 0.1 nm
    # across it: 0.01 nm, or 3 % of the volume.
    assert spare < 0.03 * rows.counts.sum()


def walk(rng, position, orientation, stride):
    """Every body moved and turned a little."""
    orientation = orientation + 3 * stride * rng.normal(size=orientation.shape)
    return (position + stride * rng.normal(size=position.shape),
            orientation / np.linalg.norm(orientation, axis=1)[:, None])


@pytest.mark.parametrize("box", [[2.0, 1.9, 2.1], [2.8, 2.7, 2.9]])
def test_list_keeps_up_with_motion(box):
    """Forces along a walk are those of a list made on the spot."""
    system, position, orientation, box = sample([TWO, ATOM], [70, 20], box, precision="double")
    pairs = PairForces(system, NONE, box)
    rng = np.random.default_rng(7)
    for _ in range(60):
        got = forces(pairs, position, orientation, box)
        expected = forces(PairForces(system, NONE, box), position, orientation, box)
        assert relative(got[0], expected[0]) < 1e-12
        assert relative(got[1], expected[1]) < 1e-12
        position, orientation = walk(rng, position, orientation, 0.006)
    assert 2 < pairs.neighbours.made < 50  # the list was made anew, and really used again


def test_restored_list_gives_the_same_bits():
    system, position, orientation, box = sample([SPCE], [125], [1.9] * 3, seed=3)
    pairs, rng, memory = PairForces(system, EWALD, box), np.random.default_rng(8), None
    path = []
    for step in range(30):
        path.append((position, orientation, forces(pairs, position, orientation, box)))
        if step == 13:
            memory = {name: np.array(value) for name, value in pairs.memory().items()}
        position, orientation = walk(rng, position, orientation, 0.002)
    resumed = PairForces(system, EWALD, box)
    resumed.restore(memory)
    fresh = PairForces(system, EWALD, box)
    differs = False
    for position, orientation, expected in path[14:]:
        got = forces(resumed, position, orientation, box)
        assert np.array_equal(got[0], expected[0]) and np.array_equal(got[1], expected[1])
        differs |= not np.array_equal(forces(fresh, position, orientation, box)[0], expected[0])
    assert differs  # without the memory the order of the sums is another
    for name, value in pairs.memory().items():
        assert np.array_equal(value, resumed.memory()[name])


def sample_with_room(*room):
    """Bodies in a box with so much room [nm] along its edges beyond one image each."""
    radius = np.linalg.norm(TWO.sites, axis=1).max()
    edges = 2 * (0.9 + 2 * radius + FLOAT_SLACK + np.array(room))
    return sample([TWO], [70], edges)


def test_a_thinner_skin_spares_images_and_is_the_same_when_restored():
    for room, skin in (((0.06, 0.034, 0.5), 0.034), ((0.06, 0.02, 0.5), 0.06),
                       ((0.0357, 0.0357, 0.0357), 0.0357), ((0.01, 0.5, 0.04), 0.04)):
        system, position, orientation, box = sample_with_room(*room)
        pairs, again = PairForces(system, NONE, box), PairForces(system, NONE, box)
        expected = forces(pairs, position, orientation, box)
        near = pairs.neighbours
        assert near.skin == pytest.approx(skin, abs=1e-12)
        assert (near.repeat == np.where(np.array(room) < near.skin - 1e-12, 2, 1)).all()
        again.restore(pairs.memory())
        assert again.neighbours.skin == near.skin
        assert np.array_equal(forces(again, position, orientation, box)[0], expected[0])


def test_rows_point_into_the_records_when_a_box_grows():
    """Also what fills them up to whole vectors: it is read, though it does not count."""
    system, position, orientation, box = sample_with_room(-0.05, -0.05, -0.05)
    pairs = PairForces(system, NONE, box)
    forces(pairs, position, orientation, box)
    assert (pairs.neighbours.repeat == 2).all()
    forces(pairs, position, orientation, 1.5 * box)
    kind, entries = pairs.neighbours.kinds[0], pairs.neighbours.rows[0, 0].entries
    assert len(kind.records) == 70 and entries.max() < kind.records.size


def test_one_image_per_pair_of_bodies_and_one_per_pair_of_sites():
    """216 water molecules at 0.9 nm need more than one image per pair of bodies."""
    system, position, orientation, box = sample([SPCE], [216], [1.8643] * 3, precision="double")
    expected = plain_forces(system, EWALD, position, orientation, box)
    assert relative(forces(PairForces(system, EWALD, box), position, orientation, box)[0],
                    expected[0]) < 1e-11
    single = forces(PairForces(system, EWALD, box, repeat=(1, 1, 1)), position, orientation, box)
    assert relative(single[0], expected[0]) > 1e-6
    # Site pairs that the nearest images of the centres miss.
    apart = position[None] - position[:, None]
    apart -= box * np.rint(apart / box)
    sites = np.einsum("nij,sj->nsi", rotation(orientation), SPCE.sites)
    r2 = ((apart[:, :, None, None] + sites[None, :, None] - sites[:, None, :, None]) ** 2).sum(-1)
    r2[np.diag_indices(216)] = np.inf
    missed = 1 - (r2 < 0.81).sum() / 2 / expected[4]
    assert 0.012 < missed < 0.015  # 1.35 %, from a design note's own count; ours differs by ~0.1 %


def test_repeating_a_large_box_changes_nothing():
    system, position, orientation, box = sample([TWO], [120], [2.8, 2.9, 2.7], precision="double")
    once = PairForces(system, NONE, box)
    got = forces(once, position, orientation, box)
    assert (once.neighbours.repeat == 1).all()
    twice = forces(PairForces(system, NONE, box, repeat=(2, 2, 2)), position, orientation, box)
    assert relative(got[0], twice[0]) < 1e-13 and relative(got[1], twice[1]) < 1e-13


def test_positions_that_are_not_numbers_are_refused():
    system, position, orientation, box = sample([TWO], [60], [1.9] * 3)
    pairs = PairForces(system, NONE, box)
    forces(pairs, position, orientation, box)
    position[17, 1] = np.nan
    with pytest.raises(RunError, match="no longer finite"):
        forces(pairs, position, orientation, box)
    with pytest.raises(RunError, match="no longer finite"):
        forces(PairForces(system, NONE, box), position, orientation, box)


def test_a_box_below_twice_the_cutoff_is_refused_with_the_remedy():
    check_box([1.8, 1.9, 2.0], 0.9, 100)
    with pytest.raises(InputError) as refused:
        check_box([1.7, 1.9, 2.0], 0.9, 100)
    assert "0.8500 nm" in str(refused.value)
    # 100 (1.8/1.7)³ = 118.7
    assert "density: 119" in str(refused.value)
    grown = np.array([1.7, 1.9, 2.0]) * (119 / 100) ** (1 / 3)
    check_box(grown, 0.9, 119)
    check_box([1.7, 1.9, 2.0], 0.85, 100)
    system, *_ = sample([TWO], [60], [1.9] * 3)
    with pytest.raises(InputError, match="Largest cutoff for this box: 0.7500 nm"):
        PairForces(system, NONE, np.array([1.9, 1.9, 1.5]))
