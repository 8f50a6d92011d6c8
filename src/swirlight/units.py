"""Internal units and the constants of nature in them.

Internal units  length nm, time ps, mass u, charge e, temperature K.
Hence           energy u nm²/ps², torque the same, force u nm/ps²,
                electric field u nm/ps²/e, polarizability e² ps²/u,
                angular momentum u nm²/ps.
One u nm²/ps² is one kJ/mol to 1e-9 (`KJ_PER_MOL` says by how much they differ).

Constants are CODATA's, through scipy.constants.
"""

from scipy import constants as _si

ATOMIC_MASS = _si.atomic_mass  # kg in 1 u
NANOMETRE, PICOSECOND = 1e-9, 1e-12  # m, s
JOULE = 1.0 / (ATOMIC_MASS * (NANOMETRE / PICOSECOND) ** 2)  # u nm²/ps² in 1 J
KJ_PER_MOL = 1e3 / _si.N_A * JOULE  # u nm²/ps² in 1 kJ/mol
VOLT_PER_METRE = _si.e * NANOMETRE * JOULE  # u nm/ps²/e in 1 V/m
COULOMB_METRE = 1.0 / (_si.e * NANOMETRE)  # e nm in 1 C m
COULOMB_METRE2_PER_VOLT = COULOMB_METRE / VOLT_PER_METRE  # e² ps²/u in 1 C m²/V
CUBIC_ANGSTROM = 4e-30 * _si.pi * _si.epsilon_0 * COULOMB_METRE2_PER_VOLT  # e² ps²/u, α/4πε0 in 1 Å³
WATT_PER_CM2 = JOULE * 1e4 * NANOMETRE**2 * PICOSECOND  # u/ps³ in 1 W/cm²
BAR = 1e5 * NANOMETRE**3 * JOULE  # u/nm/ps² in 1 bar

BOLTZMANN = _si.k * JOULE  # u nm²/ps²/K
HBAR = _si.hbar * JOULE / PICOSECOND  # u nm²/ps
LIGHT_SPEED = _si.c * PICOSECOND / NANOMETRE  # nm/ps
VACUUM_PERMITTIVITY = _si.epsilon_0 * NANOMETRE / (_si.e**2 * JOULE)  # e² ps²/(u nm³)
COULOMB = 1.0 / (4.0 * _si.pi * VACUUM_PERMITTIVITY)  # u nm³/ps²/e²
