"""Madelung constants of two crystals by both Ewald sums."""

import numpy as np
import pytest

from swirlight.forces.field import ForceField
from swirlight.system import Interactions, System
from swirlight.units import COULOMB
from tests.reference.samples import body

pytestmark = pytest.mark.published

# By the distance of nearest neighbours. NaCl: Ewald sum in mpmath (30 digits) and the
# Benson-Mackenzie series 12π Σ sech². CsCl: Ewald sum in mpmath and OEIS A181152.
MADELUNG = {"NaCl": 1.7475645946331821, "CsCl": 1.7626747730709884}


def crystal(name, cells=2):
    """Places of the cations and of the anions, box, distance of nearest neighbours. [nm]"""
    edge = 0.6
    corner = edge * np.stack(np.meshgrid(*[np.arange(cells)] * 3, indexing="ij"), -1).reshape(-1, 3)
    face = edge / 2 * np.array([[0, 0, 0], [0, 1, 1], [1, 0, 1], [1, 1, 0]])
    if name == "NaCl":
        plus = (corner[:, None] + face).reshape(-1, 3)
        return plus, plus + [edge / 2, 0, 0], np.full(3, cells * edge), edge / 2
    return corner, corner + edge / 2, np.full(3, cells * edge), edge * np.sqrt(0.75)


@pytest.mark.parametrize("name", MADELUNG)
@pytest.mark.parametrize("method, tolerance, accuracy", [
    ("direct-ewald", 1e-12, 1e-8), ("mesh-ewald", 1e-6, 1e-5)])
def test_madelung_constant(name, method, tolerance, accuracy, table):
    plus, minus, box, distance = crystal(name)
    ions = tuple(body(label, [[0, 0, 0]], [20.0], [q], [0.2], [0.0])
                 for label, q in (("cation", 1.0), ("anion", -1.0)))
    system = System(ions, (len(plus), len(minus)), Interactions(
        0.55, electrostatics=method, tolerance=tolerance, precision="double",
        splitting=5.2 / 0.55 if method == "direct-ewald" else None))
    position = np.concatenate([plus, minus]) + [0.013, -0.04, 0.27]
    orientation = np.tile([1.0, 0, 0, 0], (len(position), 1))
    found = ForceField(system, box).evaluate(position, orientation, box)
    constant = -found.energy / len(plus) * distance / COULOMB
    table(f"Madelung constant of {name}, {method}: error", f"{constant - MADELUNG[name]:.1e}",
          accuracy)
    assert constant == pytest.approx(MADELUNG[name], abs=accuracy)
    scale = COULOMB / distance**2
    assert np.abs(found.force).max() < max(tolerance, 1e-10) * scale  # no force in a crystal
