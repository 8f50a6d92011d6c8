"""What linear response can be asked about, and how the lit runs show the same.

A new observable is one entry of `OBSERVABLES`. Values are per body.
"""

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np

from swirlight import units
from swirlight.analysis import kubo
from swirlight.errors import InputError
from swirlight.motion.freedom import NEUTRAL
from swirlight.results.contributions import (
    AveragedTensor,
    AveragedVector,
    Delivered,
    MeanTorque,
    total_spin,
)

ALIASES = {"total_angular_momentum": "angular_momentum", "spin": "angular_momentum"}
Z = np.array([0.0, 0.0, 1.0])
UNIAXIAL = np.diag([-0.5, -0.5, 1.0])  # R of it R^T has kk = P2(z·k)


@dataclass(frozen=True)
class Observable:
    """One entry.

    part : "odd" or "even"; unit : of the values.
    contributions : (Subject) -> list of `contributions`. Raises InputError where dark runs
        cannot tell it.
    scale : (Subject) -> value per body in `unit` over that of the whole box, internal.
    driven : (Subject, Trajectory) -> (T,) values, (T,) steps of a lit or dark trajectory.
    estimate : whether resolved light makes it an estimate.
    """

    part: str
    unit: str
    contributions: Callable
    scale: Callable
    driven: Callable
    estimate: bool = False

    def label(self, subject):
        """ "linear response", or "estimate"."""
        return "estimate" if self.estimate and subject.resolved else "linear response"


def _rotating(subject):
    return sum(n for n, s in zip(subject.system.counts, subject.system.species, strict=True)
               if s.freedom)


def _spin(subject):
    parts = [AveragedVector(subject, total_spin, n, True) for n in range(len(subject.groups))]
    return parts + _delivered(subject, "spin")


def _impulse(subject):
    return [MeanTorque(subject, n) for n in range(len(subject.groups))] + _delivered(
        subject, "impulse")


def _work(subject):
    if subject.groups:
        raise InputError("light_work: the work of averaged light is of second order in its"
                         " intensity, which dark runs do not tell; that of resolved light is not")
    return _delivered(subject, "work")


def _delivered(subject, of):
    if not subject.resolved:
        return []
    if np.any(np.abs(subject.system.charge) > NEUTRAL):
        raise InputError("linear response to resolved light: bodies with a net charge need their"
                         " current, which is not recorded")
    return [Delivered(subject, of)]


def _vector(vectors):
    """Contributions to Σ R v, v = vectors(subject)[species]."""
    def make(subject):
        _averaged_only(subject)
        own = vectors(subject)
        return [AveragedVector(subject, lambda b: kubo.vector_sum(b.turn, own[b.kind]), n, False)
                for n in range(len(subject.groups))]
    return make


def _tensor(tensors):
    """Contributions to Σ R a Rᵀ, a = tensors(subject)[species]."""
    def make(subject):
        _averaged_only(subject)
        own = tensors(subject)
        return [AveragedTensor(subject, lambda b: kubo.tensor_sum(b.turn, own[b.kind]), n)
                for n in range(len(subject.groups))]
    return make


def _averaged_only(subject):
    if subject.resolved:
        raise InputError("orientation and alignment under resolved light are of second order in"
                         " the field and not closed: dark runs tell light_impulse and light_work,"
                         " and estimate angular_momentum")


def _axes(subject):
    return [Z] * len(subject.system.species)


def _uniaxial(subject):
    return [UNIAXIAL] * len(subject.system.species)


def _first_optics(subject):
    return subject.optics(subject.groups[0])


def _gyrations(subject):
    return [o.gyration for o in _first_optics(subject)]


def _polarizabilities(subject):
    return [o.polarizability for o in _first_optics(subject)]


def _per_gyration(subject):
    total = subject.per_species([np.linalg.norm(g) for g in _gyrations(subject)])
    if total == 0.0:
        raise InputError("gyration: no species of this sample has one")
    return 1.0 / total


def _from_totals(name, factor=1.0, per_body=False, along=False):
    """Reads a recorded total."""
    def read(subject, trajectory):
        series = trajectory[name]
        values = np.asarray(series, float) @ subject.k if along else np.asarray(series, float)
        return factor * values / (subject.system.bodies if per_body else 1), series.steps
    return read


def _from_orientations(total, quantities, scale):
    """Works out k·Σ… or k·Σ…·k from the recorded orientations."""
    def read(subject, trajectory):
        own, k = quantities(subject), subject.k
        sums = subject.sums(trajectory, {"it": lambda b: total(b.turn, own[b.kind])})["it"]
        values = sums @ k if sums.ndim == 2 else k @ sums @ k
        return scale(subject) * values, subject.steps
    return read


def _per_polarizability(subject):
    return 1.0 / units.CUBIC_ANGSTROM / subject.system.bodies


OBSERVABLES = {
    "angular_momentum": Observable(
        "odd", "hbar", _spin, lambda s: 1.0 / units.HBAR / s.system.bodies,
        _from_totals("total_angular_momentum", 1.0 / units.HBAR, True, True), estimate=True),
    "light_impulse": Observable(
        "odd", "hbar", _impulse, lambda s: 1.0 / units.HBAR / s.system.bodies,
        _from_totals("light_impulse", 1.0 / units.HBAR, True, True)),
    "light_work": Observable(
        "even", "kJ mol-1", _work, lambda s: 1.0 / units.KJ_PER_MOL / s.system.bodies,
        _from_totals("light_work", 1.0, True)),
    "orientation_along_beam": Observable(
        "odd", "", _vector(_axes), lambda s: 1.0 / _rotating(s),
        _from_totals("orientation_along_beam")),
    "gyration": Observable(
        "odd", "", _vector(_gyrations), _per_gyration,
        _from_orientations(kubo.vector_sum, _gyrations, _per_gyration)),
    "alignment": Observable(
        "even", "", _tensor(_uniaxial), lambda s: 1.0 / _rotating(s),
        _from_totals("alignment")),
    "polarizability": Observable(
        "even", "angstrom^3", _tensor(_polarizabilities), _per_polarizability,
        _from_orientations(kubo.tensor_sum, _polarizabilities, _per_polarizability)),
}
