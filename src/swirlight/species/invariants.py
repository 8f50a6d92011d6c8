"""What a point group leaves of the tensors that describe the response to light.

Model   For every operation Q of the sites
            α = Q α Qᵀ,   κ = det(Q) Q κ Qᵀ,   Q g = g or −g.
        The gyration g is axial and odd under time reversal: an operation with
        Q g ≠ det(Q) g turns the state that carries g into its time reverse, so that g and
        −g are two equally populated states, and both signs are allowed.
Source  Neumann's principle, with time reversal; J. F. Nye, Physical Properties of Crystals
        (Oxford 1957), for the first two (from memory).
"""

from itertools import product

import numpy as np

_ROUNDING = 1e-3  # typed coordinates are rounded, so an operation is off by about 1e-5
AXES = "xyz"
PAIRS = [a + b for a in AXES for b in AXES]


def invariant_tensors(operations, axial=False):
    """Orthonormal basis (k, 3, 3) of the rank-two tensors that every operation leaves alone.

    axial : True for the rectification, whose sign follows det(Q); False for the
        polarizabilities, which are symmetric besides.
    """
    transpose = np.eye(9).reshape(3, 3, 9).swapaxes(0, 1).reshape(9, 9)
    rows = [] if axial else [np.eye(9) - transpose]
    for q in operations:
        sign = np.linalg.det(q) if axial else 1.0
        rows.append(sign * np.kron(q, q) - np.eye(9))
    return _null_space(np.vstack(rows)).reshape(-1, 3, 3)


def gyration_spaces(operations):
    """The sets of gyrations that a group allows: orthonormal bases (k, 3), largest first.

    Each is a space on which every operation acts as +1 or as −1: g may lie in any one of
    them, not in a sum across them. An empty list: no gyration at all.
    """
    spaces = [np.eye(3)]
    for q in operations:
        parts = []
        for basis, sign in product(spaces, (1.0, -1.0)):
            coefficients = _null_space((basis @ q.T - sign * basis).T)
            if len(coefficients):
                parts.append(coefficients @ basis)
        spaces = parts
    return sorted(spaces, key=len, reverse=True)


def within(tensor, basis):
    """The part of a `tensor` that lies in a `basis` (k, *tensor.shape)."""
    flat = basis.reshape(len(basis), tensor.size)
    return (flat.T @ (flat @ tensor.ravel())).reshape(tensor.shape)


def within_nearest(vector, spaces):
    """The largest part of a (3,) `vector` that lies in one of the `spaces`."""
    parts = [within(vector, basis) for basis in spaces] or [np.zeros(3)]
    return max(parts, key=np.linalg.norm)


def _null_space(matrix):
    """(k, n) orthonormal x with matrix @ x = 0 up to `_ROUNDING`; no fewer rows than columns."""
    _, size, rows = np.linalg.svd(matrix, full_matrices=False)
    return rows[size <= _ROUNDING]


def tensor_words(basis, axial=False):
    """Say which components a basis of `invariant_tensors` leaves: "xx = yy, zz", or "none".

    The polarizabilities (not axial) are symmetric and described by their upper half.
    """
    shown, words = _shown(axial), []
    for row in _reduced(basis.reshape(len(basis), 9)):
        present = [k for k in shown if abs(row[k]) > _ROUNDING]
        first = row[present[0]]
        words.append(" = ".join(_term(row[k] / first, PAIRS[k]) for k in present))
    return ", ".join(words) or "none"


def zero_components(basis, axial=False):
    """The components that no tensor of a basis has, such as ["xy", "xz", "yz"]."""
    used = np.abs(basis).sum(axis=0).ravel()
    return [PAIRS[k] for k in _shown(axial) if used[k] <= _ROUNDING]


def _shown(axial):
    return [k for k in range(9) if axial or k // 3 <= k % 3]


def _term(ratio, name):
    """A component in units of the first of its row, so that all terms of a row are equal."""
    if abs(abs(ratio) - 1) < _ROUNDING:
        return name if ratio > 0 else "-" + name
    return f"{name}/{ratio:.3g}"


def _reduced(matrix):
    """Reduced row echelon form of a full-rank matrix."""
    rows, done = np.array(matrix), 0
    for column in range(rows.shape[1]):
        if done == len(rows):
            break
        best = done + int(np.argmax(np.abs(rows[done:, column])))
        if abs(rows[best, column]) <= _ROUNDING:
            continue
        rows[[done, best]] = rows[[best, done]]
        rows[done] /= rows[done, column]
        others = np.arange(len(rows)) != done
        rows[others] -= np.outer(rows[others, column], rows[done])
        done += 1
    return rows


def gyration_words(spaces):
    """Say where a gyration may point: "along x, y or z", "in the xy plane or along z", "none"."""
    words = sorted((_space_words(basis) for basis in spaces),
                   key=lambda word: (word.startswith("along"), word))
    if words == ["along x", "along y", "along z"]:
        return "along x, y or z"
    return " or ".join(words) or "none"


def _space_words(basis):
    if len(basis) == 3:
        return "any direction"
    share = np.diag(basis.T @ basis)
    names = "".join(a for a, s in zip(AXES, share, strict=True) if s > 1 - _ROUNDING)
    if len(names) == len(basis):
        return f"along {names}" if len(names) == 1 else f"in the {names} plane"
    if len(basis) == 1:
        return "along ({:.3f}, {:.3f}, {:.3f})".format(*basis[0])
    return "across ({:.3f}, {:.3f}, {:.3f})".format(*np.cross(*basis))
