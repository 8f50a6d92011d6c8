"""Small bodies of known symmetry: (positions [nm], masses [u], charges [e])."""

import numpy as np

_TETRAHEDRON = 0.08 * np.array([[1, 1, 1], [1, -1, -1], [-1, 1, -1], [-1, -1, 1.0]])


def _body(positions, masses, charges=None):
    charges = np.zeros(len(masses)) if charges is None else charges
    return np.array(positions, float), np.array(masses, float), np.array(charges, float)


def water():
    half = np.radians(109.47 / 2)
    s, c = 0.1 * np.sin(half), 0.1 * np.cos(half)
    return _body([[0, 0, 0], [s, c, 0], [-s, c, 0]], [15.999, 1.008, 1.008],
                 [-0.8476, 0.4238, 0.4238])


def ring(count, radius=0.1, height=0.0, turned=0.0):
    angles = turned + 2 * np.pi * np.arange(count) / count
    return np.stack([radius * np.cos(angles), radius * np.sin(angles),
                     np.full(count, height)], axis=1)


def icosahedron():
    golden = (1 + np.sqrt(5)) / 2
    corners = [np.roll([0, a, b], k) for a in (1, -1) for b in (golden, -golden) for k in range(3)]
    return _body(0.1 * np.array(corners), np.ones(12))


def _two_rings(count, turned, masses=(2.0, 2.0)):
    points = np.vstack([ring(count, 0.1, 0.08, 0.0), ring(count, 0.1, -0.08, turned)])
    return _body(points, np.repeat(masses, count))


BODIES = {
    "Kh": _body([[0.1, 0.2, 0.3]], [40.0]),
    "C∞v": _body([[0.0, 0, 0], [0.1, 0.1, 0.05]], [12.0, 16.0], [0.1, -0.1]),
    "D∞h": _body([[0.0, 0, 0], [0.1, 0.1, 0.05]], [14.0, 14.0]),
    "C2v": water(),
    "C3v": _body(np.vstack([[0, 0, 0.05], ring(3)]), [14, 1, 1, 1], [-0.9, 0.3, 0.3, 0.3]),
    "C1": _body(np.vstack([[0, 0, 0], _TETRAHEDRON]), [12, 1, 2, 3, 4]),
    "Ci": _body([[0.1, 0.02, 0.03], [-0.1, -0.02, -0.03], [0.04, 0.1, -0.05],
                 [-0.04, -0.1, 0.05], [0.02, -0.03, 0.09], [-0.02, 0.03, -0.09]],
                [1, 1, 2, 2, 3, 3]),
    "Cs": _body([[0.1, 0.02, 0], [-0.07, 0.05, 0], [0.02, -0.1, 0]], [1, 2, 3]),
    "C2": _body([[0.1, 0.02, 0.03], [-0.1, -0.02, 0.03], [0.03, 0.08, -0.02],
                 [-0.03, -0.08, -0.02]], [1, 1, 2, 2]),
    "C2h": _body([[0.1, 0.02, 0], [-0.1, -0.02, 0], [0.03, 0.08, 0], [-0.03, -0.08, 0]],
                 [1, 1, 2, 2]),
    "D2h": _body([[0.1, 0.05, 0], [-0.1, 0.05, 0], [0.1, -0.05, 0], [-0.1, -0.05, 0]],
                 [1, 1, 1, 1]),
    "D2d": _two_rings(2, np.pi / 2),
    "D2": _two_rings(2, 0.5),
    "S4": _body([[0.1, 0, 0.08], [-0.1, 0, 0.08], [0, 0.1, -0.08], [0, -0.1, -0.08],
                 [0.07, 0.03, 0.1], [-0.07, -0.03, 0.1], [-0.03, 0.07, -0.1],
                 [0.03, -0.07, -0.1]], [1] * 4 + [2] * 4),
    "D3": _two_rings(3, 0.4),
    "D3h": _two_rings(3, 0.0),
    "D3d": _two_rings(3, np.pi / 3),
    "C3": _body(np.vstack([ring(3, 0.1, 0.03), ring(3, 0.07, -0.05, 0.3)]), [1] * 3 + [2] * 3),
    "C3h": _body(np.vstack([ring(3), ring(3, 0.07, 0.0, 0.3)]), [1] * 3 + [2] * 3),
    "D6h": _body(ring(6), np.ones(6)),
    "Td": _body(np.vstack([[0, 0, 0], _TETRAHEDRON]), [12, 1, 1, 1, 1]),
    "Th": _body([np.roll([0.1 * a, 0.2 * b, 0], k) for a in (1, -1) for b in (1, -1)
                 for k in range(3)], np.ones(12)),
    "Oh": _body(0.1 * np.vstack([np.eye(3), -np.eye(3)]), np.ones(6)),
    "Ih": icosahedron(),
}
