"""The pair laws: what one site does to another at distance r.

Lennard-Jones  u = 4ε[(σ/r)¹² − (σ/r)⁶], cut in one of the forms of `LENNARD_JONES_FORMS`.
Coulomb        every law here can be written, with z = r² and k = 1/4πε0,

                   u = k q q' [1/r − Q(z) + c r]        f = k q q' [1/r³ − P(z) − c/r] r⃗

               where P and Q are smooth down to z = 0: the kernels replace them by
               polynomials, so no erfc is left in a loop. P = −2 dQ/dz.
Units          nm, ps, u, e.
"""

from dataclasses import dataclass

import numpy as np
from numpy.polynomial import chebyshev
from scipy.special import erf, erfc, gammainc

from swirlight.errors import InputError
from swirlight.units import COULOMB

LENNARD_JONES_FORMS = ("switched", "tail-corrected", "force-shifted", "plain")
SWITCH_START = 0.9  # of the cutoff: S falls from 1 to 0 from here to the cutoff


@dataclass(frozen=True)
class CoulombLaw:
    """How two charges act on each other in real space.

    kind : "none"; "ewald", the real-space part of an Ewald sum; "reaction-field"; or
        "damped-shifted", the force shifted to zero at the cutoff.
    cutoff : [nm]
    alpha : splitting (ewald) or damping (damped-shifted). [1/nm]
    epsilon_rf : permittivity beyond the cutoff (reaction-field), inf for a conductor.

    Sources  reaction field: Barker & Watts, Mol. Phys. 26, 789 (1973), shifted so that the
    energy vanishes at the cutoff; damped shifted force: Fennell & Gezelter, J. Chem. Phys.
    124, 234104 (2006), eqs. 18 and 19 (numbers of the equations from memory).
    """

    kind: str
    cutoff: float
    alpha: float = 0.0
    epsilon_rf: float = np.inf

    KINDS = ("none", "ewald", "reaction-field", "damped-shifted")

    def __post_init__(self):
        if self.kind not in self.KINDS:
            raise ValueError(f"unknown Coulomb law {self.kind!r}; known: {', '.join(self.KINDS)}")

    @property
    def force_shift(self):
        """c, the constant taken off the force; 0 except for the damped shifted force. [1/nm²]"""
        if self.kind != "damped-shifted":
            return 0.0
        a, r = self.alpha, self.cutoff
        return float(erfc(a * r) / r**2
                     + 2 * a / np.sqrt(np.pi) * np.exp(-((a * r) ** 2)) / r)

    def smooth_force(self, z):
        """P(z) for z = r² > 0. [1/nm³]"""
        if self.kind == "reaction-field":
            return np.full_like(z, 2 * self._reaction)
        if self.alpha == 0.0:
            return np.zeros_like(z)
        # erf(a) − 2a exp(−a²)/√π is the incomplete gamma function, without cancellation.
        return gammainc(1.5, self.alpha**2 * z) / z**1.5

    def smooth_energy(self, z):
        """Q(z) for z = r² > 0. [1/nm]"""
        if self.kind == "reaction-field":
            return 1 / self.cutoff + self._reaction * (self.cutoff**2 - z)
        screened = erf(self.alpha * np.sqrt(z)) / np.sqrt(z)
        if self.kind == "damped-shifted":
            edge = erfc(self.alpha * self.cutoff) / self.cutoff
            return screened + edge + self.force_shift * self.cutoff
        return screened

    @property
    def _reaction(self):
        """(ε − 1)/(2ε + 1)/rc³. [1/nm³]"""
        inverse = 1.0 / self.epsilon_rf
        return (1 - inverse) / (2 + inverse) / self.cutoff**3

    def polynomials(self, tolerance):
        """Coefficients of P and Q in t = 2z/rc² − 1, constant first, two rows of one length.

        tolerance : largest error, relative to the largest value.
        The degree is 1 or even, so that laws that differ little share a kernel.
        Raises InputError when no degree up to 60 is enough.
        """
        x = np.cos(np.linspace(0.0, np.pi, 1000))[:-1]  # z > 0
        laws = (self.smooth_force, self.smooth_energy)

        def place(t):
            return 0.5 * (t + 1) * self.cutoff**2

        exact = np.array([law(place(x)) for law in laws])
        for degree in (1, *range(2, 61, 2)):
            fits = [chebyshev.chebinterpolate(lambda t, law=law: law(place(t)), degree)
                    for law in laws]
            error = np.abs(chebyshev.chebval(x, np.transpose(fits)) - exact)
            if (error.max(axis=1) <= tolerance * np.abs(exact).max(axis=1)).all():
                powers = np.zeros((2, degree + 1))
                for row, fit in zip(powers, fits, strict=True):
                    terms = chebyshev.cheb2poly(fit)
                    row[: len(terms)] = terms
                return powers
        raise InputError(
            f"a splitting of {self.alpha:g} /nm is too sharp for a cutoff of {self.cutoff:g} nm"
        )


def charge_products(own, other):
    """(a, b) k q q' of all pairs of two lists of charges [e]. [u nm³/ps²]"""
    return COULOMB * np.outer(own, other)


def lennard_jones_terms(sigma, epsilon, form, cutoff):
    """The four numbers with which a kernel writes one Lennard-Jones pair, (…, 4).

    C12, C6 with u = C12/r¹² − C6/r⁶, and for the force-shifted form s, w of
    u − u(rc) − (r − rc) u′(rc) = u + s r + w (0 in the other forms).
    """
    six = 4 * epsilon * sigma**6
    twelve = six * sigma**6
    slope = offset = np.zeros_like(six)
    if form == "force-shifted":
        slope = 12 * twelve / cutoff**13 - 6 * six / cutoff**7
        offset = -(twelve / cutoff**12 - six / cutoff**6) - slope * cutoff
    return np.stack([twelve, six, slope, offset], axis=-1)
