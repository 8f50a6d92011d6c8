"""Parts of the SPC/E energy that no configuration enters."""

import numpy as np
import pytest

from swirlight.forces import corrections
from swirlight.forces.laws import CoulombLaw
from swirlight.system import Interactions, System
from swirlight.units import BOLTZMANN
from tests.reference.samples import spce

pytestmark = pytest.mark.published

# Molecules, edge [Å], self, intramolecular, tail energy, each over k. [K]
# Closed forms in mpmath, 30 digits, CODATA 2022: rc = 10 Å, α = 5.6/L, and the parameters of
# https://www.nist.gov/mml/csd/chemical-informatics-group/spce-water-reference-calculations-cuboid-cell-10a-cutoff
# Their first 6 digits are those of NIST's table as remembered (the table itself from memory).
TERMS = [
    (100, 20.0, -2844691.41, 2809992.03, -823.714995),
    (200, 20.0, -5689382.81, 5619984.07, -3294.85998),
    (300, 20.0, -8534074.22, 8429976.1, -7413.43495),
    (750, 30.0, -14223457.0, 14148310.6, -13728.5832),
]


@pytest.mark.parametrize("molecules, edge, own, inner, tail", TERMS)
def test_self_intramolecular_and_tail_energy(molecules, edge, own, inner, tail):
    """To the 9 digits given: half a unit of the last is at most 4e-9 of a term."""
    water = spce(sigma=0.316555789, epsilon=78.19743111 * BOLTZMANN)
    system = System((water,), (molecules,), Interactions(1.0, cutoff_form="tail-corrected"))
    law, box = CoulombLaw("ewald", 1.0, alpha=56.0 / edge), np.full(3, edge / 10)
    found = [corrections.self_energy(system, law), corrections.intramolecular_energy(system, law),
             corrections.tail_energy(system, box)]
    for value, expected in zip(found, (own, inner, tail), strict=True):
        assert value / BOLTZMANN == pytest.approx(expected, rel=1e-8)
