"""Which response each species shows to each colour of light, as tables for the kernels.

A species may give its response at several wavelengths; the block nearest to the carrier is
taken, one without wavelength only where no other is within a factor of 2. Averaged light
refuses a block that is off by a factor of 2 or more. Carrier-resolved light takes from such a
block the real polarizability alone: what electrons do below their transitions hardly depends
on frequency, while absorption and gyration are known only where they were given.
No numba here.
"""

from math import exp, log

import numpy as np

from swirlight.errors import InputError
from swirlight.species.body import GENERAL, LINEAR, OpticalResponse
from swirlight.units import LIGHT_SPEED

NEAR, FAR = 1.1, 2.0  # carrier against the frequency of the response

# Columns of an optics row, body frame: α_S as xx yy zz xy xz yz, g, α_D likewise, κ by rows.
ALPHA, GYRATION, ABSORPTION, RECTIFICATION = slice(0, 6), slice(6, 9), slice(9, 15), slice(15, 24)
WIDTH = 24

DARK = OpticalResponse(None, np.zeros((3, 3)), np.zeros((3, 3)), np.zeros(3), np.zeros((3, 3)))


def colour_of(pulses):
    """The carrier that stands for a group: that of its strongest pulse, the first of equals."""
    return max(pulses, key=lambda p: p.amplitude).carrier


def choose_response(species, carrier, resolved=False):
    """(OpticalResponse, warning or None) of a species at a carrier [rad/ps].

    Raises InputError when averaged light is off by a factor of 2 or more from every block.
    """
    if not species.responses:
        return DARK, None
    named = [r for r in species.responses if r.at is not None]
    everywhere = [r for r in species.responses if r.at is None]
    best = min(named, key=lambda r: _ratio(r.at, carrier), default=None)
    if best is None or (everywhere and _ratio(best.at, carrier) >= FAR):
        return everywhere[0], (f"{species.name}: light_response names no wavelength and is used"
                               f" for {_wavelength(carrier)}")
    off = _ratio(best.at, carrier)
    if off < NEAR:
        return best, None
    said = (f"{species.name}: light_response is given for {_wavelength(best.at)}, the carrier is"
            f" {_wavelength(carrier)}, a factor of {off:.3g} away")
    if off < FAR:
        return best, said
    if not resolved:
        raise InputError(f"{said}; give a block within a factor of 2, or one without 'at'")
    only = OpticalResponse(best.at, best.polarizability, DARK.absorptive, DARK.gyration,
                           DARK.rectification)
    return only, f"{said}: resolved light uses its real polarizability alone"


def optics_table(system, groups, resolved=False):
    """Rows of the kernels, (colours, species, 24) in internal units; and the warnings."""
    table = np.zeros((len(groups), len(system.species), WIDTH))
    warnings = []
    for c, pulses in enumerate(groups):
        for k, species in enumerate(system.species):
            block, warning = choose_response(species, colour_of(pulses), resolved)
            table[c, k] = _row(block)
            if warning is not None and warning not in warnings:
                warnings.append(warning)
    return table, warnings


def _row(block):
    return np.concatenate([
        six(block.polarizability), block.gyration, six(block.absorptive),
        np.ravel(block.rectification),
    ])


def six(matrix):
    """xx, yy, zz, xy, xz, yz of a symmetric matrix."""
    m = np.asarray(matrix, float)
    return np.array([m[0, 0], m[1, 1], m[2, 2], m[0, 1], m[0, 2], m[1, 2]])


def free_axes(system):
    """(species, 3): 1 for each body axis about which a torque acts, 0 for the others.

    A linear body takes no torque along its axis z, an atom none at all.
    """
    rows = {GENERAL: (1.0, 1.0, 1.0), LINEAR: (1.0, 1.0, 0.0)}
    return np.array([rows.get(s.freedom, (0.0, 0.0, 0.0)) for s in system.species])


def _ratio(a, b):
    return exp(abs(log(a / b)))


def _wavelength(carrier):
    nanometres = 2.0 * np.pi * LIGHT_SPEED / carrier
    if nanometres < 1e4:
        return f"{nanometres:.4g} nm"
    return f"{carrier / (2.0 * np.pi):.4g} THz"
