"""Energies of two molecules in vacuum: a reaction field of permittivity 1 in a large box."""

import numpy as np
import pytest
from scipy.spatial.transform import Rotation

from swirlight.forces.field import ForceField
from swirlight.system import Interactions, System
from swirlight.units import BOLTZMANN, KJ_PER_MOL
from tests.reference.samples import body, spce

pytestmark = pytest.mark.published

# Coulomb and Lennard-Jones energy [kJ/mol], computed in mpmath (30 digits) as sums over sites
# with CODATA 2022. SPC/E (σ = 3.166 Å, ε = 0.650 kJ/mol): molecule 1 has O at the origin and H
# at (±r sin θ/2, r cos θ/2, 0); where O of molecule 2 is [Å], and its turn about z.
SPCE = [
    ((0.0, 3.0, 0.0), 0.0, -17.2654711703, 1.3701209668),
    ((0.0, 3.0, 0.0), 180.0, 24.8535969121, 1.3701209668),
    ((3.5, 0.0, 0.0), 180.0, -11.1358333262, -0.644048384114),
]
# EPM2 CO2, Harris & Yung, J. Phys. Chem. 99 (1995) 12021 (parameters as printed on
# http://friedel.uned.es/SklogWiki/index.php/Carbon_dioxide, cross terms included): where C of
# molecule 2 is [Å] and the axes of both.
EPM2 = [
    ((0.0, 0.0, 4.0), "z", "x", -3.13887771048, -0.867084802403),
    ((3.6, 0.0, 0.0), "z", "z", 2.64238424357, -2.99593176577),
    ((0.0, 0.0, 5.0), "z", "z", 2.63897955024, 4.56580351853),
]
BOX = np.full(3, 30.0)


def energies(species, position, orientation, overrides=()):
    """Coulomb and Lennard-Jones energy of two molecules. [kJ/mol]"""
    system = System((species,), (2,), Interactions(
        10.0, cutoff_form="plain", electrostatics="reaction-field", reaction_permittivity=1.0,
        precision="double", overrides=overrides))
    terms = ForceField(system, BOX).evaluate(position, orientation, BOX).terms
    coulomb = (terms["coulomb_real"] + terms["reaction_field"] + terms["coulomb_self"]
               + terms["coulomb_intramolecular"] + terms["coulomb_mesh"])
    return coulomb / KJ_PER_MOL, terms["lennard_jones"] / KJ_PER_MOL


@pytest.mark.parametrize("oxygen, turn, coulomb, lennard_jones", SPCE)
def test_spce_dimers(oxygen, turn, coulomb, lennard_jones):
    water = spce(epsilon=0.650 * KJ_PER_MOL)
    upright = Rotation.from_matrix(water.frame.T)  # the frame in which the sites are given
    second = Rotation.from_euler("z", turn, degrees=True) * upright
    position = np.array([-upright.apply(water.sites[0]),
                         0.1 * np.array(oxygen) - second.apply(water.sites[0])])
    orientation = np.array([r.as_quat(scalar_first=True) for r in (upright, second)])
    found = energies(water, position, orientation)
    assert found == pytest.approx((coulomb, lennard_jones), abs=1e-10, rel=1e-10)


@pytest.mark.parametrize("carbon, first, second, coulomb, lennard_jones", EPM2)
def test_carbon_dioxide_dimers(carbon, first, second, coulomb, lennard_jones):
    k = BOLTZMANN
    oxide = body("EPM2", [[0, 0, 0], [0, 0, 0.1149], [0, 0, -0.1149]], [12.011, 15.999, 15.999],
                 [0.6512, -0.3256, -0.3256], [0.2757, 0.3033, 0.3033],
                 [28.129 * k, 80.507 * k, 80.507 * k])
    cross = tuple((("EPM2", "s0"), ("EPM2", o), 0.2892, 47.588 * k) for o in ("s1", "s2"))
    turns = {"z": Rotation.identity(), "x": Rotation.from_euler("y", 90, degrees=True)}
    orientation = np.array([turns[a].as_quat(scalar_first=True) for a in (first, second)])
    position = 0.1 * np.array([(0.0, 0.0, 0.0), carbon])
    found = energies(oxide, position, orientation, cross)
    assert found == pytest.approx((coulomb, lennard_jones), abs=1e-10, rel=1e-10)
