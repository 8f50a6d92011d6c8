"""Forces between bodies, site by site: Lennard-Jones and the real-space part of the charges.

Model   every pair of sites of two bodies (or of a body and its own image), whichever image
        of the pair is nearest, up to the cutoff between the sites; laws of `laws.py`.
Layers  `PairForces` chooses kernels and fills their tables; the kernels are written for the
        pattern of sites by `kernels/source.py` and check nothing.
Bits    each body sums over its own row of a full neighbour list, so results do not depend on
        the number of threads.
"""

from dataclasses import dataclass, field, replace

import numpy as np

from swirlight.forces import laws
from swirlight.forces.box import check_box
from swirlight.forces.kernels.generated import module_of
from swirlight.forces.kernels.source import Pattern, pair_source
from swirlight.forces.kinds import interacting_kinds
from swirlight.forces.neighbours import Neighbours

# Of the polynomials that replace erfc, relative to their largest value: of the order of the
# rounding of the sums they enter.
TOLERANCE = {"mixed": 5e-8, "double": 2e-14}
REAL = {"mixed": np.float32, "double": np.float64}
GROUP = 6  # sites per kernel call; larger bodies are taken in groups


@dataclass
class PairSums:
    """Energies and virial of all pairs, without tails. [u nm²/ps²]

    virial : (3,) Σ over pairs of R_a f_a, R between the centres of the image the sites met.
    """

    lennard_jones: float
    coulomb: float
    virial: np.ndarray


@dataclass
class Call:
    """One kernel call: a group of sites of one kind against a group of another's.

    anew : whether it is the first for its own kind, whose sums then begin at nought.
    """

    own: int
    other: int
    my_sites: int
    its_sites: int
    pattern: Pattern
    pairs: np.ndarray
    anew: bool
    modules: dict = field(default_factory=dict)


def _groups(sites):
    """Slices of at most GROUP sites, as equal as possible."""
    bounds = np.linspace(0, sites, -(-sites // GROUP) + 1).astype(int)
    return list(zip(bounds[:-1], bounds[1:], strict=True))


class PairForces:
    """Pair forces of a system.

    coulomb : the `laws.CoulombLaw`, with the cutoff of the system's interactions.
    box : (3,) edges. [nm]
    repeat : (3,) powers of two, how often the box is repeated for the neighbour list; None:
        as few times as one image per body allows.
    Raises InputError when the box is too small for the cutoff.
    """

    def __init__(self, system, coulomb, box, repeat=None):
        inter = system.interactions
        if inter.cutoff_form not in laws.LENNARD_JONES_FORMS:
            raise ValueError(f"unknown cut-off form {inter.cutoff_form!r}")
        if coulomb.kind != "none" and coulomb.cutoff != inter.cutoff:
            raise ValueError("the Coulomb law must have the cutoff of the interactions")
        check_box(box, inter.cutoff, system.bodies)
        self.system, self.coulomb = system, coulomb
        self.real = REAL[inter.precision]
        sigma, epsilon = system.lennard_jones
        charge = system.type_charge if coulomb.kind != "none" else 0 * system.type_charge
        touching = epsilon * sigma > 0
        kinds = interacting_kinds(system, touching.any(axis=1) | (charge != 0))
        self.neighbours = Neighbours(system, kinds, inter.cutoff, self.real, repeat)
        self._tables(coulomb, inter)
        self.calls = []
        for a in range(len(kinds)):
            for b in range(len(kinds)):
                self._add_calls(a, b, touching, charge)
        self._sums = np.zeros((system.bodies, 5))
        pushed = {call.own for call in self.calls}
        self._left_alone = np.ones(system.bodies, bool)
        for kind in (kinds[a] for a in pushed):
            self._left_alone[kind.first:kind.first + kind.count] = False
        self._left_alone = np.flatnonzero(self._left_alone)

    def _tables(self, coulomb, inter):
        """Coefficients of the Coulomb law and the lengths that go with the cutoff."""
        smooth = np.zeros((2, 1))
        if coulomb.kind != "none":
            smooth = coulomb.polynomials(TOLERANCE[inter.precision])
        cutoff, start = inter.cutoff, laws.SWITCH_START * inter.cutoff
        out_of_reach = 2 * cutoff + 4 * self.neighbours.radius
        self.screening = smooth.astype(self.real)
        self.limits = np.array(
            [cutoff**2, 2 / cutoff**2, start, 1 / (cutoff - start), out_of_reach,
             coulomb.force_shift], self.real)

    def _add_calls(self, a, b, touching, charge):
        """The kernel calls for bodies of kind a as pushed by those of kind b."""
        own, other = self.neighbours.kinds[a], self.neighbours.kinds[b]
        for own_from, own_to in _groups(own.sites):
            for other_from, other_to in _groups(other.sites):
                mine, its = own.types[own_from:own_to], other.types[other_from:other_to]
                pattern, pairs = self._pattern(own, other, mine, its, touching, charge)
                if pattern.pairs:
                    anew = all(call.own != a for call in self.calls)
                    self.calls.append(Call(a, b, 3 + 3 * own_from, 3 + 3 * other_from, pattern,
                                           pairs, anew))

    def _pattern(self, own, other, mine, its, touching, charge):
        """What the kernel of these site types depends on, and the numbers of its pairs."""
        inter, table = self.system.interactions, np.ix_(mine, its)
        sigma, epsilon = (t[table] for t in self.system.lennard_jones)
        terms = laws.lennard_jones_terms(sigma, epsilon, inter.cutoff_form, inter.cutoff)
        products = laws.charge_products(charge[mine], charge[its])
        near, charged = touching[table], products != 0
        plain = inter.cutoff_form == "tail-corrected" or not near.any()
        pattern = Pattern(
            own=len(mine), other=len(its), own_words=own.words, central=other.central,
            lennard_jones=tuple(map(tuple, np.argwhere(near).tolist())),
            coulomb=tuple(map(tuple, np.argwhere(charged).tolist())),
            form="plain" if plain else inter.cutoff_form,
            degree=self.screening.shape[1] - 1, shifted=self.coulomb.kind == "damped-shifted",
            energies=False, real=np.dtype(self.real).name,
        )
        numbers = np.zeros((len(pattern.pairs), 5), self.real)
        for row, (a, b) in zip(numbers, pattern.pairs, strict=True):
            charges = [products[a, b]] if charged[a, b] else []
            contact = terms[a, b] if near[a, b] else []
            row[: len(charges) + len(contact)] = [*charges, *contact]
        return pattern, numbers

    def evaluate(self, position, orientation, box, force, torque, energies=False):
        """Overwrite force and torque (N, 3) with the pair forces; the sums with `energies`.

        position : (N, 3) centres, wrapped or not. [nm]
        orientation : (N, 4) unit quaternions, scalar first, body to laboratory.
        force, torque : (N, 3) float64, laboratory frame, about the centres.
        Returns `PairSums`, or None without energies.
        Raises InputError for a box too small, RunError when positions are not finite.
        """
        check_box(box, self.system.interactions.cutoff, self.system.bodies)
        near = self.neighbours
        near.update(position, orientation, box)
        if len(self._left_alone):
            force[self._left_alone] = torque[self._left_alone] = 0.0
        for call in self.calls:
            own, other = near.kinds[call.own], near.kinds[call.other]
            rows = near.rows[call.own, call.other]
            if energies not in call.modules:
                text = pair_source(replace(call.pattern, energies=energies))
                call.modules[energies] = module_of(text)
            call.modules[energies].rows(
                own.records.ravel(), own.centres.ravel(), other.records.ravel(),
                other.centres.ravel(), call.my_sites, call.its_sites, rows.entries, rows.counts,
                near.unit, call.pairs, self.screening, self.limits, own.body, call.anew, force,
                torque, self._sums)
        if not energies:
            return None
        # Each pair stands in two rows.
        lj, coulomb, *virial = 0.5 * self._sums.sum(axis=0)
        return PairSums(float(lj), float(coulomb), np.array(virial))

    def memory(self):
        """What the neighbour list was made from: a dict of arrays, for checkpoints."""
        return self.neighbours.memory()

    def restore(self, memory):
        """Make the list again: `evaluate` then gives the bits of a run never interrupted."""
        self.neighbours.restore(memory)
