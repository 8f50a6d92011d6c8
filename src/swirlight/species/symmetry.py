"""The point group of a rigid body.

Model   An operation is an orthogonal matrix Q, proper or not, that maps every site onto one
        of equal mass, charge and Lennard-Jones parameters.
Arrays  body frame; operations (n, 3, 3). Infinite groups stand as a few operations that
        generate a dense part of them, enough for tensors of rank two.
"""

from dataclasses import dataclass
from itertools import product

import numpy as np

from swirlight.species.body import ATOM, LINEAR
from swirlight.species.frame import ON_LINE

_FLIP_X, _FLIP_Z, _INVERSION = np.diag([-1.0, 1, 1]), np.diag([1.0, 1, -1]), -np.eye(3)
_SAME_CLASS = 1e-6  # relative: two sites alike in mass, charge and Lennard-Jones
_SAME = 1e-4  # of matrices whose entries are of order one


def _turn(axis, angle):
    """Rotation matrix by `angle` about a body axis, 0 to 2."""
    c, s = np.cos(angle), np.sin(angle)
    turn = np.eye(3)
    j, k = (axis + 1) % 3, (axis + 2) % 3
    turn[j, j], turn[j, k], turn[k, j], turn[k, k] = c, -s, s, c
    return turn


# One radian is no simple fraction of a turn: what it leaves alone, every angle does.
_ABOUT_Z, _ABOUT_X = _turn(2, 1.0), _turn(0, 1.0)


@dataclass(frozen=True)
class PointGroup:
    """Symmetry of a body.

    name : Schoenflies symbol, such as "C2v" or "D∞h"; "Kh" is that of an atom.
    operations : (n, 3, 3) all of a finite group; generators of an infinite one.
    held : those that hold whatever the sites: rotations about the axis of a linear body and
        all rotations of an atom, since such a body has no orientation that could tell.
    """

    name: str
    operations: np.ndarray
    held: np.ndarray


def point_group(sites, freedom, *properties):
    """The `PointGroup` of sites in the body frame.

    sites : (s, 3) [nm]; freedom : as in `Species`.
    properties : (s,) arrays in which sites must agree to be alike.
    """
    alike = _classes(sites, properties)
    if freedom == ATOM:
        return PointGroup("Kh", np.array([_ABOUT_Z, _ABOUT_X, _INVERSION]),
                          np.array([_ABOUT_Z, _ABOUT_X]))
    if freedom == LINEAR:
        ends = _is_symmetric(_FLIP_Z, sites, alike)
        operations = [_ABOUT_Z, _FLIP_X] + ([_FLIP_Z] if ends else [])
        return PointGroup("D∞h" if ends else "C∞v", np.array(operations), _ABOUT_Z[None])
    operations = _finite_group(sites, alike)
    return PointGroup(_schoenflies(operations), operations, np.eye(3)[None])


def _classes(sites, properties):
    """(s, s) bool: sites that some operation might exchange."""
    alike = np.ones((len(sites), len(sites)), bool)
    for values in properties:
        spread = np.abs(values[:, None] - values[None, :])
        alike &= spread <= _SAME_CLASS * np.abs(values).max()
    return alike


def _is_symmetric(operation, sites, alike):
    """Whether every site is mapped onto one like it."""
    images = sites @ operation.T
    gap = np.sqrt(((images[:, None, :] - sites[None, :, :]) ** 2).sum(axis=2))
    near = gap <= 2 * ON_LINE * np.sqrt((sites**2).sum(axis=1)).max()
    return bool((near & alike).any(axis=1).all())


def _finite_group(sites, alike):
    """(n, 3, 3) every operation of sites that do not lie on one line.

    Two sites a, b off one line through the centre fix an operation but for a reflection in
    their plane, so trying all images of a and b finds every operation.
    """
    distance = np.sqrt((sites**2).sum(axis=1))
    a = int(np.argmax(distance))
    b = int(np.argmax(np.linalg.norm(np.cross(sites[a], sites), axis=1)))
    slack = 4 * ON_LINE * distance[a]
    start = _triad(sites[a], sites[b])
    found = []
    for i, j in product(range(len(sites)), repeat=2):
        if not (alike[a, i] and alike[b, j] and i != j):
            continue
        gap = np.linalg.norm(sites[i] - sites[j]) - np.linalg.norm(sites[a] - sites[b])
        radii = np.abs([distance[i] - distance[a], distance[j] - distance[b], gap])
        if radii.max() > slack:
            continue
        image = _triad(sites[i], sites[j])
        for handed in (1.0, -1.0):
            operation = image.T @ np.diag([1.0, 1.0, handed]) @ start
            if _is_symmetric(operation, sites, alike):
                found.append(operation)
    distinct = []
    for operation in found:  # sites at one point give the same operation twice
        if all(np.abs(operation - other).max() > 10 * _SAME for other in distinct):
            distinct.append(operation)
    return np.array(distinct)


def _triad(a, b):
    """Rows: unit vectors along a, across it towards b, and across both."""
    first, second = a / np.linalg.norm(a), np.cross(np.cross(a, b), a)
    second /= np.linalg.norm(second)
    return np.array([first, second, np.cross(first, second)])


# --- naming ---------------------------------------------------------------------------------


def _schoenflies(operations):
    """Schoenflies symbol of a finite group given in full."""
    proper = [q for q in operations if np.linalg.det(q) > 0]
    mirrors = [_axis(-q) for q in operations if abs(np.trace(q) - 1) < _SAME
               and np.linalg.det(q) < 0]
    inverted = any(np.trace(q) < -3 + _SAME for q in operations)
    orders = [_order(q) for q in proper]
    top = max(orders)
    if top == 1:
        return "Ci" if inverted else "Cs" if mirrors else "C1"
    axes = [_axis(q) for q, n in zip(proper, orders, strict=True) if n == top]
    improper = len(operations) > len(proper)
    if top > 2 and any(not _parallel(axes[0], other) for other in axes):
        family = {12: "T", 24: "O", 60: "I"}[len(proper)]
        return family + (("h" if inverted else "d") if improper else "")
    across = any(_parallel(axis, normal) for axis in axes for normal in mirrors)
    if len(proper) == 2 * top:
        return f"D{top}" + (("h" if across else "d") if improper else "")
    if not improper:
        return f"C{top}"
    if across:
        return f"C{top}h"
    return f"C{top}v" if mirrors else f"S{2 * top}"


def _order(rotation):
    """How many times a rotation must be applied to do nothing."""
    power, n = rotation, 1
    while np.abs(power - np.eye(3)).max() > 100 * _SAME:
        power, n = power @ rotation, n + 1
    return n


def _axis(rotation):
    """Unit vector that a rotation (or minus a reflection) leaves alone."""
    values, vectors = np.linalg.eig(rotation)
    axis = np.real(vectors[:, np.argmin(np.abs(values - 1))])
    return axis / np.linalg.norm(axis)


def _parallel(a, b):
    return abs(abs(a @ b) - 1) < _SAME
