"""Rigid bodies from lists of sites, and a library of them with their sources."""

from swirlight.species.body import LiquidState, OpticalResponse, Species
from swirlight.species.library import library_names, load_species

__all__ = ["LiquidState", "OpticalResponse", "Species", "library_names", "load_species"]
