"""Which boxes a cutoff allows."""

import math

import numpy as np

from swirlight.errors import InputError


def check_box(box, cutoff, bodies):
    """Refuse a box with an edge below twice the cutoff.

    box : (3,) edges [nm]; cutoff : [nm]; bodies : how many are in the box.
    Raises InputError naming the largest cutoff for this box, and the smallest number of
    bodies for this cutoff at the same density and proportions of the box.
    """
    box = np.asarray(box, dtype=float)
    shortest = float(box.min())
    if shortest >= 2 * cutoff:
        return
    largest = math.floor(shortest / 2 * 1e4) / 1e4
    smallest = math.ceil(bodies * (2 * cutoff / shortest) ** 3 * (1 - 1e-12))
    edges = " x ".join(f"{edge:.4g}" for edge in box)
    raise InputError(
        f"the box of {edges} nm is too small for a cutoff of {cutoff:g} nm: every edge must be"
        f" at least twice the cutoff. Largest cutoff for this box: {largest:.4f} nm; smallest"
        f" number of bodies for this cutoff at the same density: {smallest}"
    )
