"""The body frame: origin at the centre of mass, axes along the principal moments.

Model   z is the axis of the moment that differs from the other two when two agree to 1e-6
        (for a linear body its axis), else of the largest moment; x and y are the remaining
        axes by increasing moment, and when those are equal the first listed site off z lies
        in the xz half-plane x > 0. With three equal moments z runs through the first listed
        site off the centre, x from the first further site off z. Signs: of the right-handed
        choices left, the one whose list (dipole z, x, y; then z, x, y of every site in
        listed order), entries below 1e-6 of the largest counted as 0, is lexicographically
        largest.
Arrays  one row per site, (s, 3) float64; lengths nm, masses u, charges e.
"""

from dataclasses import dataclass
from itertools import product

import numpy as np

from swirlight.errors import InputError
from swirlight.species.body import ATOM, GENERAL, LINEAR

EQUAL = 1e-6  # of the largest moment: two moments this close count as equal
ON_LINE = 1e-5  # of the body's extent: sites this close to an axis or a point are on it
POINT = 1e-9  # nm: a body no larger than this is an atom


@dataclass(frozen=True)
class BodyFrame:
    """Where a list of sites goes in its own frame.

    sites : (s, 3) body-frame positions. [nm]
    inertia : (3,) principal moments, exactly 0 along a linear body and for an atom, exactly
        equal where they agree to `EQUAL`. [u nm²]
    rotation, centre : (3, 3) and (3,) [nm] with ``sites = (position - centre) @ rotation.T``.
    freedom : ATOM, LINEAR or GENERAL.
    """

    sites: np.ndarray
    inertia: np.ndarray
    rotation: np.ndarray
    centre: np.ndarray
    freedom: int


def inertia_tensor(sites, mass):
    """(3, 3) inertia tensor about the origin. [u nm²]"""
    return (mass @ (sites**2).sum(axis=1)) * np.eye(3) - (mass[:, None] * sites).T @ sites


def body_frame(position, mass, charge):
    """Turn a list of sites into its body frame.

    position : (s, 3), any frame. [nm]
    mass, charge : (s,); a site may have no mass. [u], [e]
    Raises InputError when nothing has mass, or when sites lie off the line or the point that
    holds all the mass: a torque about it would meet no inertia.
    """
    total = mass.sum()
    if not total > 0:
        raise InputError("no site has a mass: a body needs one to move")
    centre = mass @ position / total
    arms = position - centre
    extent = np.sqrt((arms**2).sum(axis=1)).max()
    if extent <= POINT:
        return BodyFrame(np.zeros_like(arms), np.zeros(3), np.eye(3), centre, ATOM)

    moments, vectors = np.linalg.eigh(inertia_tensor(arms, mass))
    if moments[2] <= ON_LINE**2 * total * extent**2:
        raise InputError("all the mass is at one point but other sites lie off it: "
                         "a body that turns needs mass away from its centre")
    axis = vectors[:, 0]
    off_line = np.sqrt(((arms - np.outer(arms @ axis, axis)) ** 2).sum(axis=1)).max()
    if off_line <= ON_LINE * extent:
        return _linear(arms, axis, mass, charge, centre)
    if moments[0] <= EQUAL * moments[2]:
        raise InputError(f"the mass lies on a line but a site is {off_line:.2g} nm off it: put all"
                         " sites on the line, or give the sites off it enough mass to be turned")

    axes, inertia = _axes(arms, moments, vectors)
    rotation = max(axes, key=lambda turn: _sign_list(arms @ turn.T, charge))
    return BodyFrame(arms @ rotation.T, inertia, rotation, centre, GENERAL)


def _linear(arms, axis, mass, charge, centre):
    """The frame of a body whose sites lie on one line; rounding off the line is removed."""
    across = np.eye(3)[np.argmin(np.abs(axis))]
    choices = [_right_handed(across, sign * axis) for sign in (1.0, -1.0)]
    rotation = max(choices, key=lambda turn: _sign_list(arms @ turn.T, charge))
    sites = arms @ rotation.T
    sites[:, :2] = 0.0
    moment = mass @ sites[:, 2] ** 2
    return BodyFrame(sites, np.array([moment, moment, 0.0]), rotation, centre, LINEAR)


def _axes(arms, moments, vectors):
    """The right-handed frames left to choose from, and the moments along their axes."""
    low, middle, high = moments
    if high - low <= EQUAL * high:
        first = arms[_first_off(np.linalg.norm(arms, axis=1))]
        z = first / np.linalg.norm(first)
        inertia = np.full(3, moments.mean())
    elif min(high - middle, middle - low) <= EQUAL * high:
        unique = 0 if high - middle < middle - low else 2
        z = vectors[:, unique]
        equal = np.delete(moments, unique).mean()
        inertia = np.array([equal, equal, moments[unique]])
    else:
        x, y = vectors[:, 0], vectors[:, 1]
        signs = product((1.0, -1.0), repeat=2)
        frames = [np.array([a * x, b * y, np.cross(a * x, b * y)]) for a, b in signs]
        return frames, moments
    off = arms - np.outer(arms @ z, z)
    x = off[_first_off(np.linalg.norm(off, axis=1))]
    return [_right_handed(x, z), _right_handed(x, -z)], inertia


def _first_off(distance):
    """The first listed site whose distance is not just rounding."""
    return int(np.argmax(distance > ON_LINE * distance.max()))


def _right_handed(towards, z):
    """Rows x, y, z: z as given, x the part of `towards` across it."""
    x = towards - (towards @ z) * z
    x /= np.linalg.norm(x)
    return np.array([x, np.cross(z, x), z])


def _sign_list(sites, charge):
    """What the sign rule compares: dipole, then sites, each as z, x, y."""
    rows = np.vstack([charge @ sites, sites])[:, [2, 0, 1]].ravel()
    rows[np.abs(rows) < 1e-6 * np.abs(rows).max()] = 0.0
    return tuple(rows)
