"""Tail corrections of the Lennard-Jones fluid."""

import numpy as np
import pytest

from swirlight.forces import corrections
from swirlight.system import Interactions, System
from tests.reference.samples import body

pytestmark = pytest.mark.published

# Atoms, edge, cut-off, U_LRC in units of σ, ε. Computed from (8/3)πρN[(1/3)rc⁻⁹ − rc⁻³]; equal
# to all printed digits to NIST's reference calculations as remembered (the page
# http://nist.gov/mml/csd/informatics_research/lj_refcalcs.cfm exists, its numbers from memory).
TAILS = [
    (800, 10, 3, -198.49), (800, 10, 4, -83.769), (200, 8, 3, -24.230), (200, 8, 4, -10.226),
    (400, 10, 3, -49.622), (400, 10, 4, -20.942), (30, 8, 3, -0.54517), (30, 8, 4, -0.23008),
]


@pytest.mark.parametrize("atoms, edge, cutoff, energy", TAILS)
def test_tail_energy_and_pressure(atoms, edge, cutoff, energy):
    atom = body("atom", [[0, 0, 0]], [1.0], [0.0], [1.0], [1.0])
    system = System((atom,), (atoms,), Interactions(float(cutoff), cutoff_form="tail-corrected"))
    box = np.full(3, float(edge))
    assert corrections.tail_energy(system, box) == pytest.approx(energy, rel=5e-5)
    density, pressure = atoms / edge**3, corrections.tail_virial(system, box) / (3 * edge**3)
    assert pressure == pytest.approx(
        16 / 3 * np.pi * density**2 * (2 / 3 * cutoff**-9 - cutoff**-3), rel=1e-13)
