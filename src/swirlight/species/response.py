"""From the response tensors as written to those of the body frame, held against its symmetry."""

from dataclasses import dataclass

import numpy as np

from swirlight.errors import InputError
from swirlight.species.invariants import (
    gyration_spaces,
    gyration_words,
    invariant_tensors,
    tensor_words,
    within,
    within_nearest,
    zero_components,
)

TYPED = 1e-4  # of a tensor's largest entry: what rounding in a typed number may amount to
DUST = 1e-13  # of a tensor's largest entry: what rounding in arithmetic may amount to
PARTS = ("polarizability", "absorptive_polarizability", "gyration", "rectification")


@dataclass(frozen=True)
class Allowed:
    """What some operations leave of every tensor; from `allowed_by`."""

    polarizability: np.ndarray
    gyration: list
    rectification: np.ndarray

    def part(self, name, tensor):
        """The part of a body-frame tensor that is allowed; `name` as in a species file."""
        if name == "gyration":
            return within_nearest(tensor, self.gyration)
        return within(tensor, self._basis(name))

    def forbidden(self, name):
        """The components that are 0 in every allowed tensor, such as ["xy", "xz", "yz"]."""
        if name == "gyration":
            used = sum((np.abs(space).sum(axis=0) for space in self.gyration), np.zeros(3))
            return [n for n, weight in zip("xyz", used, strict=True) if weight < TYPED]
        return zero_components(self._basis(name), axial=name == "rectification")

    def words(self, name):
        """What is allowed, in words."""
        if name == "gyration":
            return gyration_words(self.gyration)
        return tensor_words(self._basis(name), axial=name == "rectification")

    def _basis(self, name):
        return self.rectification if name == "rectification" else self.polarizability


def allowed_by(operations):
    """The `Allowed` of some operations (n, 3, 3)."""
    return Allowed(invariant_tensors(operations), gyration_spaces(operations),
                   invariant_tensors(operations, axial=True))


def to_body_frame(tensor, rotation):
    """Turn a (3, 3) tensor or a (3,) axial vector; the rotation is proper, so κ and g follow."""
    return rotation @ tensor if tensor.ndim == 1 else rotation @ tensor @ rotation.T


def hold_against(name, tensor, group, ignore=False):
    """Hold a body-frame tensor against the symmetry of its body.

    Returns the tensor, freed of the rounding of typed numbers, and a note: "" or what
    `ignore` has kept.
    Raises InputError for a part that is forbidden, or that has no meaning on a linear body
    or an atom; the latter whatever `ignore` says.
    """
    scale = TYPED * np.abs(tensor).max()
    held, full = allowed_by(group.held), allowed_by(group.operations)
    meaningful = held.part(name, tensor)
    if np.abs(tensor - meaningful).max() > scale:
        kind = "a linear body" if group.name in ("C∞v", "D∞h") else "an atom"
        raise InputError(f"{_excess(tensor - meaningful)} has no meaning on {kind};"
                         f" in the body frame it may have: {held.words(name)}")
    permitted = full.part(name, meaningful)
    if np.abs(meaningful - permitted).max() <= scale:
        return _without_dust(permitted), ""
    excess = _excess(meaningful - permitted)
    if not ignore:
        raise InputError(f"{excess} is forbidden by the symmetry {group.name} of the sites;"
                         f" in the body frame it may have: {full.words(name)}"
                         ' (write "symmetry: ignore" to keep it)')
    return _without_dust(meaningful), (f"{name}: {excess} kept although {group.name} forbids it"
                                       " (symmetry: ignore)")


def _without_dust(tensor):
    """A tensor whose entries of rounding size are exactly 0."""
    return np.where(np.abs(tensor) > DUST * np.abs(tensor).max(), tensor, 0.0)


def _excess(forbidden):
    """Name the components that are too much."""
    names = "xyz" if forbidden.ndim == 1 else [a + b for a in "xyz" for b in "xyz"]
    size = np.abs(forbidden.ravel())
    return "component " + ", ".join(
        name for name, s in zip(names, size, strict=True) if s > 0.01 * size.max())


def require_absorbing(absorptive):
    """Raise InputError unless a (3, 3) absorptive polarizability is positive semidefinite."""
    values = np.linalg.eigvalsh(absorptive)
    if values[0] < -TYPED * np.abs(values).max():
        raise InputError("a principal value is negative, which would amplify the light;"
                         " all three must be 0 or positive")
