"""Library models against published and independently computed values.

"computed" means computed by a second route that shares no code with this package.
"""

from itertools import product

import chemicals
import numpy as np
import pytest
from chemicals.elements import periodic_table
from chemicals.heat_capacity import CRC_standard_data
from chemicals.volume import rho_data_Perry_8E_105_l

from swirlight import units
from swirlight.config.reader import read_text
from swirlight.species.describe import DEBYE, GRAM_PER_CM3, J_PER_MOL_K, rotational_constants
from swirlight.species.file import read_species
from swirlight.species.library import load_species
from swirlight.system import Interactions, System

pytestmark = pytest.mark.published

AMU_A2 = 0.01  # u nm² in 1 u Å²
KELVIN = units.BOLTZMANN


def dipole(species):
    return np.linalg.norm(species.dipole) / DEBYE


# --- geometry, inertia, multipoles ------------------------------------------------------------


def test_spce_inertia_and_dipole():
    """Planar closed forms 2 m_H x², μ y² and their sum with H = 1.008, O = 15.999: computed.
    Dipole 2 q r cos(θ/2): computed; 2.351 D is printed in Mark & Nilsson, J. Phys. Chem. A 105,
    9954 (2001), Table 1."""
    water = load_species("water")
    # The coordinates in the file have 10 decimals: 1e-9 of the moments.
    np.testing.assert_allclose(water.inertia / AMU_A2, [0.5968166485, 1.343979754, 1.940796402],
                               rtol=3e-9)
    assert dipole(water) == pytest.approx(2.350541697, rel=1e-8)


def test_spce_parameters():
    """Geometry and charges: Berendsen, Grigera & Straatsma, J. Phys. Chem. 91, 6269 (1987).
    Its A = 0.37122 and B = 0.3428 (nm, kJ/mol to the powers 1/6 and 1/12; from memory) give
    sigma = B²/A, epsilon = A¹²/4B¹²; the long forms are printed on NIST's page of SPC/E
    reference calculations in a cuboid cell."""
    water = load_species("water")
    oxygen, first, second = water.sites
    for hydrogen in (first, second):
        assert np.linalg.norm(hydrogen - oxygen) == pytest.approx(0.1, rel=1e-9)
    cosine = (first - oxygen) @ (second - oxygen) / 0.01
    assert np.degrees(np.arccos(cosine)) == pytest.approx(109.47, abs=1e-6)
    np.testing.assert_allclose(water.charge, [-0.8476, 0.4238, 0.4238])
    assert water.sigma[0] == pytest.approx(0.3428**2 / 0.37122, rel=1e-8)
    assert water.epsilon[0] / units.KJ_PER_MOL == pytest.approx(
        (0.37122 / 0.3428) ** 12 / 4 , rel=1e-7)
    assert water.epsilon[0] == pytest.approx(78.19743111 * KELVIN, rel=1e-12)


def test_epm2_quadrupole_and_inertia():
    """2 q_O r² and 2 m_O r² with the parameters of Harris & Yung, J. Phys. Chem. 99, 12021
    (1995) and O = 15.999: computed."""
    carbon_dioxide = load_species("carbon-dioxide")
    quadrupole = carbon_dioxide.charge @ carbon_dioxide.sites[:, 2] ** 2 / DEBYE * 10  # D Å
    assert quadrupole == pytest.approx(-4.129386617, rel=1e-8)
    np.testing.assert_allclose(carbon_dioxide.inertia[:2] / AMU_A2, 42.2437916, rtol=1e-8)
    assert carbon_dioxide.inertia[2] == 0.0
    # 2.3 % above the moment of the real molecule, B0 = 0.39021 1/cm (from memory).
    assert rotational_constants(carbon_dioxide.inertia)[0] == pytest.approx(0.39021, rel=0.025)


def test_epm2_cross_terms_are_geometric_means():
    """sigma_CO = 2.892 Å and epsilon_CO = 47.588 K are printed with the model; the arithmetic
    mean would be 2.895 Å."""
    system = System((load_species("carbon-dioxide"),), (2,), Interactions(cutoff=1.0))
    sigma, epsilon = system.lennard_jones
    assert sigma[0, 1] == pytest.approx(0.2892, abs=5e-5)
    assert epsilon[0, 1] / KELVIN == pytest.approx(47.588, abs=5e-4)


@pytest.mark.parametrize("name, value", [
    ("acetonitrile", 4.1231),  # computed; 4.12 D in Edwards, Madden & McDonald 1984, from memory
    ("chloroform", 1.0987),  # computed
    ("carbon-disulfide", 0.0),
    ("nitrogen", 0.0),
])  # fmt: skip
def test_dipoles(name, value):
    assert dipole(load_species(name)) == pytest.approx(value, abs=6e-5)


def test_other_geometry():
    """Bond lengths and angles of the models (from memory, see the library files)."""
    # 2 m_S r² with S = 32.06, r = 1.57 Å: computed
    carbon_disulfide = load_species("carbon-disulfide")
    assert carbon_disulfide.inertia[0] / AMU_A2 == pytest.approx(158.049, abs=1e-3)
    chloroform = load_species("chloroform")
    carbon, hydrogen, *chlorines = chloroform.sites
    assert np.linalg.norm(hydrogen - carbon) == pytest.approx(0.11)
    for a, b in ((0, 1), (1, 2), (2, 0)):
        u, v = chlorines[a] - carbon, chlorines[b] - carbon
        assert np.linalg.norm(u) == pytest.approx(0.1758, rel=1e-9)
        assert np.degrees(np.arccos(u @ v / 0.1758**2)) == pytest.approx(111.3, abs=1e-6)
    assert chloroform.inertia[0] == chloroform.inertia[1] < chloroform.inertia[2]
    nitrogen = load_species("nitrogen")
    length = np.ptp(nitrogen.sites[:, 2])
    assert length == pytest.approx(0.10897, rel=1e-9)
    assert length / nitrogen.sigma[0] == pytest.approx(0.3292, abs=5e-5)  # the paper's L/σ


# --- energies of pairs ------------------------------------------------------------------------


def pair_energy(species, offset, turn):
    """(Coulomb, Lennard-Jones) between two bodies in vacuum [kJ/mol]: plain sums over sites.

    The first stands in its body frame about the given origin site 0; the second is turned about
    its own site 0 and moved there by `offset`.
    """
    system = System((species,), (2,), Interactions(cutoff=1.0))
    sigma, epsilon = system.lennard_jones
    first = species.sites - species.sites[0]
    second = first @ np.asarray(turn, float).T + offset
    coulomb = lennard_jones = 0.0
    for i, j in product(range(len(first)), repeat=2):
        r = np.linalg.norm(first[i] - second[j])
        coulomb += units.COULOMB * species.charge[i] * species.charge[j] / r
        x = (sigma[i, j] / r) ** 6
        lennard_jones += 4 * epsilon[i, j] * (x * x - x)
    return np.array([coulomb, lennard_jones]) / units.KJ_PER_MOL


ROUNDED_WATER = """\
name: rounded
source: SPC/E with the rounded parameters
sites:
  - {label: O, mass: 15.999 u, at: 0 0 0 nm, charge: -0.8476 e, sigma: 0.3166 nm, epsilon: 0.65 kJ/mol}
  - {label: H, mass: 1.008 u, at: 0.081649043092011722 0.057735896651553038 0 nm, charge: 0.4238 e}
  - {label: H, mass: 1.008 u, at: -0.081649043092011722 0.057735896651553038 0 nm, charge: 0.4238 e}
"""  # noqa: E501
SAME, ABOUT_Z = np.eye(3), np.diag([-1.0, -1, 1])


@pytest.mark.parametrize("offset, turn, coulomb, lennard_jones", [
    ((0, 0.3, 0), SAME, -17.2654711703, 1.3701209668),
    ((0, 0.3, 0), ABOUT_Z, 24.8535969121, 1.3701209668),
    ((0.35, 0, 0), ABOUT_Z, -11.1358333262, -0.644048384114),
])  # fmt: skip
def test_spce_dimers(offset, turn, coulomb, lennard_jones):
    """30-digit site sums with sigma = 3.166 Å, epsilon = 0.650 kJ/mol: computed. The gate is the
    change of the Coulomb constant between editions of CODATA."""
    found = pair_energy(read_species(read_text(ROUNDED_WATER, "rounded.yaml")), offset, turn)
    np.testing.assert_allclose(found, [coulomb, lennard_jones], rtol=1e-8)
    # The library's unrounded sigma and epsilon move the Lennard-Jones part by less than 1 %.
    np.testing.assert_allclose(pair_energy(load_species("water"), offset, turn),
                               [coulomb, lennard_jones], rtol=1e-2)


ONTO_X = np.array([[0.0, 0, 1], [0, 1, 0], [-1, 0, 0]])


@pytest.mark.parametrize("offset, turn, coulomb, lennard_jones", [
    ((0, 0, 0.40), ONTO_X, -3.13887771048, -0.867084802403),
    ((0.36, 0, 0), SAME, 2.64238424357, -2.99593176577),
    ((0, 0, 0.50), SAME, 2.63897955024, 4.56580351853),
])  # fmt: skip
def test_epm2_dimers(offset, turn, coulomb, lennard_jones):
    """30-digit site sums with the printed cross terms: computed. The printed 2.892 Å and
    47.588 K are rounded geometric means, worth up to 0.2 % of the Lennard-Jones part."""
    found = pair_energy(load_species("carbon-dioxide"), offset, turn)
    assert found[0] == pytest.approx(coulomb, rel=1e-8)
    assert found[1] == pytest.approx(lennard_jones, rel=2e-3)


# --- masses, densities, heat capacities, polarizabilities -------------------------------------

FORMULAS = {"water": ("O", "H", "H"), "carbon-dioxide": ("C", "O", "O"),
            "carbon-disulfide": ("C", "S", "S"), "nitrogen": ("N", "N"), "argon": ("Ar",),
            "chloroform": ("C", "H", "Cl", "Cl", "Cl")}


def test_masses_are_standard_atomic_weights():
    """`chemicals` holds the weights of an earlier edition; the largest change among these
    elements is that of sulfur, 32.065 to 32.06."""
    for name, elements in FORMULAS.items():
        weights = [getattr(periodic_table, element).MW for element in elements]
        np.testing.assert_allclose(load_species(name).mass, weights, rtol=1.7e-4, err_msg=name)
    weights = [periodic_table.C.MW + 3 * periodic_table.H.MW, periodic_table.C.MW,
               periodic_table.N.MW]
    np.testing.assert_allclose(load_species("acetonitrile").mass, weights, rtol=1e-4)


ORGANIC = {"acetonitrile": ("75-05-8", 1.07e-9), "carbon-disulfide": ("75-15-0", 0.94e-9),
           "chloroform": ("67-66-3", 0.99e-9)}  # CAS number, compressibility [1/Pa] (from memory)


def perry_density(cas, temperature):
    """Density by the correlation of Perry's Handbook, 8th ed. [kg/m³]"""
    c1, c2, c3, c4 = (rho_data_Perry_8E_105_l.loc[cas][f"C{k}"] for k in (1, 2, 3, 4))
    return c1 / c2 ** (1 + (1 - temperature / c3) ** c4) * chemicals.MW(cas) / 1e3


@pytest.mark.parametrize("name", ORGANIC)
def test_density_and_heat_capacity_of_the_organic_liquids(name):
    cas, compressibility = ORGANIC[name]
    species, t = load_species(name), 298.15
    density = perry_density(cas, t)
    assert species.liquid.temperature == t
    assert species.liquid.density / GRAM_PER_CM3 == pytest.approx(density / 1e3, rel=3e-5)
    expansion = -np.log(perry_density(cas, t + 0.5) / perry_density(cas, t - 0.5))  # 1/K
    volume = chemicals.MW(cas) * 1e-3 / density  # m³/mol
    c_v = CRC_standard_data.loc[cas]["Cpl"] - t * volume * expansion**2 / compressibility
    assert species.heat_capacity / J_PER_MOL_K == pytest.approx(c_v, rel=1e-3)


@pytest.mark.parametrize("name, temperature, density, c_v", [
    ("water", 298.15, 997.0476, 74.5393),  # IAPWS-95, 0.101325 MPa
    ("carbon-dioxide", 240.0, 1088.8692, 41.6048),  # Span & Wagner, saturated
    ("nitrogen", 77.355, 806.0845, 30.3685),
    ("argon", 87.302, 1395.3961, 21.4169),
])  # fmt: skip
def test_density_and_heat_capacity_of_the_fluids_with_an_equation_of_state(
        name, temperature, density, c_v):
    """CoolProp 8.0.0, kg/m³ and J/mol/K; computed again where the library is installed."""
    species = load_species(name)
    assert species.liquid.temperature == temperature
    assert species.liquid.density / GRAM_PER_CM3 == pytest.approx(density / 1e3, rel=1e-5)
    assert species.heat_capacity / J_PER_MOL_K == pytest.approx(c_v, rel=1e-3)
    coolprop = pytest.importorskip("CoolProp.CoolProp")
    fluid = name.title().replace("-D", "D")
    state = ("P", 101325) if name == "water" else ("Q", 0)
    for key, value in (("D", density), ("CVMOLAR", c_v)):
        assert coolprop.PropsSI(key, "T", temperature, *state, fluid) == pytest.approx(
            value, rel=1e-5)


@pytest.mark.parametrize("name, index, density, mass", [
    ("water", 1.3328583, 997.05, 18.015),  # IAPWS refractive index, 298.15 K
    ("acetonitrile", 1.3442, 771.3, 41.052),  # chemicals.RI; 303.15 K
    ("carbon-disulfide", 1.6319, 1263.2, 76.141),  # 293.15 K
    ("chloroform", 1.4459, 1489.1, 119.378),  # 293.15 K
])  # fmt: skip
def test_mean_polarizability_against_the_refractive_index(name, index, density, mass):
    """Lorentz and Lorenz: α/4πε0 = (3/4π)(M/ρN_A)(n²−1)/(n²+2) at the sodium D line. The gate is
    the 3 % that gas and liquid differ by (carbon disulfide: 2.5 %, chloroform: 2.9 %)."""
    volume = mass * 1e-3 / density / 6.02214076e23  # m³
    mean = 3 / (4 * np.pi) * volume * (index**2 - 1) / (index**2 + 2) * 1e30
    (response,) = load_species(name).responses
    found = np.trace(response.polarizability) / 3 / units.CUBIC_ANGSTROM
    assert found == pytest.approx(mean, rel=0.03)


@pytest.mark.parametrize("name, anisotropy", [
    ("nitrogen", 0.70), ("carbon-dioxide", 2.10), ("carbon-disulfide", 9.6)])
def test_anisotropy_of_the_linear_molecules(name, anisotropy):
    """Bridge & Buckingham, Proc. R. Soc. A 295, 334 (1966), from memory."""
    alpha = load_species(name).responses[0].polarizability / units.CUBIC_ANGSTROM
    assert alpha[2, 2] - alpha[0, 0] == pytest.approx(anisotropy, rel=1e-9)
