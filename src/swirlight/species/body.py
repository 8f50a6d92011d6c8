"""A rigid body, in its own frame and in internal units: what every other room calculates with."""

from dataclasses import dataclass

import numpy as np

ATOM, LINEAR, GENERAL = 0, 2, 3  # rotational degrees of freedom


@dataclass(frozen=True)
class OpticalResponse:
    """Response of one body to light near one carrier, body frame. [e² ps²/u unless said]

    at : angular frequency it was given for [rad/ps]; None: used for every carrier.
    polarizability, absorptive : (3, 3) real symmetric.
    gyration : (3,) axial vector g, p = i g × 𝓔.
    rectification : (3, 3) κ, p0 = κ G. [e³ ps⁴/(u² nm): a dipole per field squared]
    source : where the numbers are from, "" when the species' own source says it.
    """

    at: float | None
    polarizability: np.ndarray
    absorptive: np.ndarray
    gyration: np.ndarray
    rectification: np.ndarray
    source: str = ""


@dataclass(frozen=True)
class LiquidState:
    """A state in which the real liquid exists: temperature [K], density [u/nm³], its source."""

    temperature: float
    density: float
    source: str


@dataclass(frozen=True)
class Species:
    """One kind of rigid body.

    sites : (s, 3) in the body frame, origin at the centre of mass. [nm]
    mass, charge : (s,) [u], [e]
    sigma, epsilon : (s,) Lennard-Jones; epsilon 0 where a site has none. [nm], [u nm²/ps²]
    inertia : (3,) principal moments; exactly 0 along a linear body and for an atom. [u nm²]
    freedom : ATOM, LINEAR or GENERAL, the number of rotational degrees of freedom.
    frame : (3, 3) with x_body = frame @ (x_file − centre of mass).
    mixing : "lorentz-berthelot" or "geometric", between bodies of this species.
    responses : one entry per wavelength given; empty: the body does not see averaged light.
    heat_capacity : C_V per body [u nm²/ps²/K] or None; with its source.
    liquid : a handbook state of the liquid, or None.
    notes : what whoever uses the species must be told.
    """

    name: str
    source: str
    labels: tuple[str, ...]
    sites: np.ndarray
    mass: np.ndarray
    charge: np.ndarray
    sigma: np.ndarray
    epsilon: np.ndarray
    inertia: np.ndarray
    freedom: int
    frame: np.ndarray
    mixing: str = "lorentz-berthelot"
    responses: tuple[OpticalResponse, ...] = ()
    heat_capacity: float | None = None
    heat_capacity_source: str = ""
    liquid: LiquidState | None = None
    notes: tuple[str, ...] = ()

    @property
    def total_mass(self):
        """Mass of the body. [u]"""
        return float(self.mass.sum())

    @property
    def total_charge(self):
        """Net charge of the body. [e]"""
        return float(self.charge.sum())

    @property
    def dipole(self):
        """(3,) dipole about the centre of mass, body frame. [e nm]

        What only rounding has left of components that cancel is 0.
        """
        dipole = self.charge @ self.sites
        return np.where(np.abs(dipole) > 1e-12 * np.abs(self.charge) @ np.abs(self.sites),
                        dipole, 0.0)

    @property
    def radius(self):
        """Distance of the outermost site from the centre of mass. [nm]"""
        return float(np.sqrt((self.sites**2).sum(axis=1)).max())
