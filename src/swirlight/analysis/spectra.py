"""Spectra from correlation functions.

Convention  exp(−iωt): loss is a positive imaginary part.
Units       internal ones (nm, ps, u, e, K); frequencies f = ω/2π in THz = 1/ps.
Estimator   a correlation function C_k = C(kΔt), k = 0 … K, is taken times a lag window with
            w_0 = 1 and counts as 0 beyond. Of its relaxation transform

                D(ω) = ∫₀^∞ (−dC/dt) e^{iωt} dt ≈ Σ (C_k − C_{k+1}) e^{iω(k+½)Δt} / sinc(ωΔt/2)

            the imaginary part is ω times the trapezoid rule of ∫C cos ωt dt, which is exact
            for what the record resolves; the real part has the same accuracy, and
            D(0) = C_0 to rounding. A window smooths the spectrum and leaves C_0 alone, so
            that static limits hold whatever the window.
Windows     F. J. Harris, Proc. IEEE 66, 51 (1978) (names and shapes, from memory).
"""

import numpy as np
from scipy import fft

from swirlight.analysis.correlation import lagged_sums
from swirlight.errors import InputError
from swirlight.units import (
    BOLTZMANN,
    COULOMB_METRE,
    COULOMB_METRE2_PER_VOLT,
    JOULE,
    LIGHT_SPEED,
    VACUUM_PERMITTIVITY,
    VOLT_PER_METRE,
)

WAVENUMBER = 1e7 / LIGHT_SPEED  # cm^-1 in one THz
PER_CENTIMETRE = 1e-7  # 1/nm in 1/cm
SIEMENS_PER_METRE = COULOMB_METRE * 1e-39 / VOLT_PER_METRE  # e² ps/(u nm³) in 1 S/m
HYPERPOLARIZABILITY = COULOMB_METRE2_PER_VOLT**2 / JOULE  # e⁴ ps⁶/(u³ nm²) in 1 C m⁴/V³

# (lag over the first lag that counts as zero, 0 … 1) -> weight.
WINDOWS = {
    "hann": lambda x: np.cos(0.5 * np.pi * x) ** 2,
    "gaussian": lambda x: np.exp(-8.0 * x * x),  # three ten-thousandths are cut off at the end
    "triangle": lambda x: 1.0 - x,
    "none": np.ones_like,
}
# Full width at half maximum of what a sharp line becomes, times the longest lag.
_WIDTHS = {"hann": 1.0, "gaussian": 1.4992, "triangle": 0.8859, "none": 0.6034}
GRID = 4  # frequencies per resolution


def resolution(window, longest_lag):
    """Full width at half maximum of a sharp line after the window. [THz]

    longest_lag : [ps]
    """
    return _WIDTHS[window] / longest_lag


def autocorrelation(blocks, lags, pieces=1):
    """C_k = ⟨x²⟩ − ½⟨(x(t0 + kΔt) − x(t0))²⟩, component by component, mean over bodies.

    Each mean is over all origins that reach. Against the plain mean of x(t0) x(t0 + kΔt) this
    takes away the kink at k = 0 that the two ends of a finite record leave, which would be a
    tail of the loss at high frequencies; C_0 is ⟨x²⟩ of the whole record.
    blocks : iterable of (frames, bodies, p), frames > lags; nothing is subtracted.
    Returns ((lags, p) of all origins, (pieces, lags, p) of the origins in each piece).
    """
    squares = 0.0  # of each frame

    def pairs():
        nonlocal squares
        for x in blocks:
            squares = squares + np.einsum("fnp,fnp->fp", x, x, dtype=float)
            yield x, x

    sums = lagged_sums(pairs(), lags - 1, pieces)
    products = np.diagonal(sums.products[:, lags - 1 :], axis1=2, axis2=3)
    before = np.cumsum(np.concatenate([np.zeros_like(squares[:1]), squares]), axis=0)
    whole = _without_kink(products.sum(axis=0, keepdims=True), sums.edges[[0, -1]], before)
    return whole[0] / sums.bodies, _without_kink(products, sums.edges, before) / sums.bodies


def _without_kink(products, edges, before):
    """(pieces, lags, p) from Σ x(t0) x(t0 + k) and `before`, Σ x² of all frames before each."""
    k = np.arange(products.shape[1])
    low = edges[:-1, None]
    high = np.minimum(edges[1:, None], len(before) - 1 - k)
    both = before[high] - before[low] + before[high + k] - before[low + k]
    mean = (before[edges[1:]] - before[edges[:-1]]) / np.diff(edges)[:, None]
    return mean[:, None] - (0.5 * both - products) / (high - low)[..., None]


def windowed(correlation, window):
    """A correlation function (lags, ...) times the lag window of that name."""
    lags = len(correlation)
    weight = WINDOWS[window](np.arange(lags) / lags)
    return correlation * weight.reshape(-1, *[1] * (np.ndim(correlation) - 1))


def grid(lags, interval, width):
    """(frequencies [THz], length of the transform) that show a resolution `width` [THz]."""
    size = fft.next_fast_len(max(int(np.ceil(GRID / (width * interval))), 2 * lags), real=True)
    return fft.rfftfreq(size, interval), size


def checked_high_frequency(value):
    """ε∞ as a float, 1 where nothing is said. Raises InputError below 1."""
    if value is None:
        return 1.0
    if not 1.0 <= value < np.inf:
        raise InputError(f"high_frequency: {value}; a permittivity is at least 1")
    return float(value)


def relaxation_transform(correlation, interval, size):
    """D(ω) of the module's head, at fft.rfftfreq(size, interval).

    correlation : (lags, ...) real, windowed, size ≥ lags. Returns (size//2 + 1, ...) complex.
    """
    c = np.asarray(correlation, float)
    steps = -np.diff(c, axis=0, append=np.zeros_like(c[:1]))
    half = np.pi * fft.rfftfreq(size)  # ωΔt/2
    factor = np.exp(1j * half) / np.sinc(half / np.pi)
    d = np.conj(fft.rfft(steps, size, axis=0))
    return factor.reshape(-1, *[1] * (c.ndim - 1)) * d


def half_line_transform(correlation, interval, size):
    """∫₀^∞ C e^{iωt} dt = (D(ω) − C_0)/iω, at fft.rfftfreq(size, interval).

    correlation : (lags, ...) real, windowed. Its real part is the trapezoid rule.
    """
    c = np.asarray(correlation, float)
    omega = 2 * np.pi * fft.rfftfreq(size, interval)
    d = relaxation_transform(c, interval, size) - c[0]
    whole = interval * (c.sum(axis=0) - 0.5 * c[0])
    with np.errstate(divide="ignore", invalid="ignore"):
        h = d / (1j * omega.reshape(-1, *[1] * (c.ndim - 1)))
    h[0] = whole
    return h


def spectral_density(correlation, interval, size):
    """Two-sided power spectrum 2∫₀^∞ C cos ωt dt; its integral over all f is C_0, to rounding.

    correlation : (lags, ...) real, windowed.
    """
    return 2.0 * half_line_transform(correlation, interval, size).real


def density_of_states(correlation, interval, size):
    """4∫₀^∞ C cos ωt dt / C_0, one-sided: the trapezoid rule over f from 0 gives 1. [ps]

    correlation : (lags, ...) autocorrelation of an angular velocity, windowed.
    Source: Wiener and Khinchin; for velocities Dickey & Paskin, Phys. Rev. 188, 1407 (1969)
    (from memory).
    """
    return 2.0 * spectral_density(correlation, interval, size) / np.asarray(correlation)[0]


def dipole_strength(volume, temperature):
    """1/(3 V ε0 kT): susceptibility per squared dipole moment. [1/(e nm)²]

    volume : [nm³]; temperature : [K]
    """
    return 1.0 / (3.0 * volume * VACUUM_PERMITTIVITY * BOLTZMANN * temperature)


def permittivity(correlation, interval, size, volume, temperature, high_frequency=1.0):
    """ε(ω) of neutral bodies from ⟨M(0)·M(t)⟩ under a conducting boundary.

    ε(ω) = ε∞ + D(ω)/(3Vε0kT); ε(0) = ε∞ + ⟨M²⟩/(3Vε0kT).
    correlation : (lags, ...) of the collective dipole, windowed [(e nm)²]; volume [nm³];
    temperature [K]; high_frequency : ε∞, 1 for bodies that do not polarise.
    Source: Kubo (1957) for the method; M. Neumann & O. Steinhauser, Chem. Phys. Lett. 102, 508
    (1983) for the boundary (both from memory).
    """
    d = relaxation_transform(correlation, interval, size)
    return high_frequency + dipole_strength(volume, temperature) * d


def conductivity(correlation, interval, size, volume, temperature):
    """σ(ω) = ∫₀^∞ ⟨J(0)·J(t)⟩ e^{iωt} dt / 3VkT. [e² ps/(u nm³)]

    correlation : (lags, ...) of J = ΔM/Δt, finite differences of the collective dipole,
    windowed [(e nm/ps)²]. Such differences are means over Δt. The sum below over sinc²(ωΔt/2)
    is −iω times the `relaxation_transform` of the dipole itself, with nothing lost to them.
    Source: Kubo (1957) (from memory).
    """
    c = np.asarray(correlation, float)
    total = np.conj(fft.rfft(c, size, axis=0)) - 0.5 * c[0]
    smooth = np.sinc(fft.rfftfreq(size)) ** 2
    h = interval * total / smooth.reshape(-1, *[1] * (c.ndim - 1))
    return h / (3.0 * volume * BOLTZMANN * temperature)


def permittivity_of_conductor(sigma, frequencies, high_frequency=1.0):
    """ε(ω) = ε∞ + i[σ(ω) − σ(0)]/(ε0ω): the part left when the static conductivity is split off.

    sigma : (F, ...) of `conductivity`; frequencies : (F,) [THz], the first one 0.
    The value at ω = 0 is that at the first frequency above.
    """
    omega = 2 * np.pi * frequencies.reshape(-1, *[1] * (np.ndim(sigma) - 1))
    with np.errstate(divide="ignore", invalid="ignore"):
        eps = high_frequency + 1j * (sigma - sigma[0].real) / (VACUUM_PERMITTIVITY * omega)
    eps[0] = eps[1].real
    return eps


def refraction(permittivity):
    """Refractive index n of √ε = n + iκ, κ of the same sign as ε''."""
    return np.sqrt(permittivity).real


def absorption(frequencies, permittivity):
    """Absorption coefficient of the intensity, 2ωκ/c. [1/nm]

    frequencies : [THz], of the last axis of `permittivity` (..., F).
    """
    return 4 * np.pi * frequencies * np.sqrt(permittivity).imag / LIGHT_SPEED


def kerr_susceptibility(correlation, interval, size, temperature, bodies):
    """χ(ω) per body: Δ⟨Π_ab⟩/N = χ(ω) [S_ab − ⅓ δ_ab |𝓔|²](ω) with S = Re 𝓔𝓔†. [e⁴ ps⁶/(u³ nm²)]

    χ(ω) = D(ω)/(20 N kT), D of C(t) = ⟨Π(0):Π(t)⟩; uncorrelated linear bodies:
    χ(0) = Δα²/30kT.
    correlation : (lags, ...) windowed [(e² ps²/u)²]; temperature : [K].
    Source: derived (Kubo 1957 for the method, from memory).
    """
    return relaxation_transform(correlation, interval, size) * _kerr(temperature, bodies)


def kerr_response(correlation, interval, temperature, bodies):
    """−dC/dt / (20 N kT): the response in time of which `kerr_susceptibility` is the transform.

    correlation : (lags, ...) without a window. Central differences.
    """
    return -np.gradient(correlation, interval, axis=0) * _kerr(temperature, bodies)


def _kerr(temperature, bodies):
    return 1.0 / (20.0 * bodies * BOLTZMANN * temperature)


def transient_permittivity(moment, field, interval, volume, size, high_frequency=1.0):
    """ε(ω) that a weak probe meets, from what it does to the collective dipole.

    ε(ω) − ε∞ = δM(ω)·E(ω)* / (ε0 V |E(ω)|²): δM and E half the differences of two twins
    that differ by 180° in the probe's carrier alone, so that whatever does not follow the
    sign of the probe has gone.
    moment, field : (frames, 3) [e nm], [u nm/ps²/e]; interval [ps]; volume [nm³].
    Returns (frequencies [THz], ε (F,), |E(ω)|² over its largest value); ε says something
    where the last is not small.
    Source: derived from the definition of the susceptibility.
    """
    m, e = (np.conj(fft.rfft(np.asarray(x, float), size, axis=0)) for x in (moment, field))
    power = (np.abs(e) ** 2).sum(axis=1)
    with np.errstate(divide="ignore", invalid="ignore"):
        chi = (m * np.conj(e)).sum(axis=1) / (VACUUM_PERMITTIVITY * volume * power)
    return fft.rfftfreq(size, interval), high_frequency + chi, power / power.max()
