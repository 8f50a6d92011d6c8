"""Linear response: what weak light does, from fluctuations of dark trajectories alone.

The power that the light torque of time t′ would deliver to the bodies as they are at a dark
origin, Ẇ = Σ τ(t′)·ω, gives for any quantity A of all bodies

    Δ⟨A(t)⟩ = (1/kT) ∫₀^∞ ds ⟨A(s) Ẇ(0; t − s)⟩

R. Kubo, J. Phys. Soc. Jpn. 12, 570 (1957), from memory; the forms for rigid bodies in light are
derived. Light torques depend on orientations only, so that conservative and dissipative ones
follow the same formula. It is exact at first order in intensity for bodies that conserve
their energy and for Langevin dynamics with the same friction.

Everything in internal units, laboratory frame. Bodies: R (..., n, 3, 3) body to laboratory,
ω (..., n, 3) angular velocity *in the body frame*; sums run over the n bodies, so that their
cross terms are part of every correlation. Times are the last axis of kernels, the axis
before the components of vectors; axes before it (starts) are kept. Kernels are averages over
all origins and, as the liquid is isotropic, over all axes of the laboratory.
"""

import numpy as np
from scipy import fft
from scipy.interpolate import CubicSpline
from scipy.ndimage import uniform_filter1d

from swirlight.rotation import rotation_matrix

FEWEST = 4  # lags of a kernel
CLEAR = 5.0  # standard errors by which a kernel stands out of its noise somewhere
QUIET = 2.0  # mean square of a kernel over its standard error where it is noise: 1 expected


def rotation_and_spin(orientation, momentum, inverse_inertia):
    """R and ω of bodies of one species.

    orientation : (..., n, 4); momentum : (..., n, 3) laboratory. [u nm²/ps]
    inverse_inertia : (3,), 0 about an axis without moment. [1/(u nm²)]
    """
    turn = rotation_matrix(orientation)
    return turn, np.einsum("...ji,...j->...i", turn, momentum) * inverse_inertia


def vector_sum(turn, vector):
    """(..., 3) Σ R v of a body-frame vector (3,)."""
    return turn.sum(axis=-3) @ vector


def vector_rate(turn, spin, vector):
    """(..., 3) its time derivative, Σ R (ω×v)."""
    return np.einsum("...nij,...nj->...i", turn, np.cross(spin, vector))


def tensor_sum(turn, tensor):
    """(..., 3, 3) Σ R a Rᵀ of the traceless part of a symmetric body-frame tensor (3, 3)."""
    own = tensor - np.trace(tensor) / 3.0 * np.eye(3)
    return np.einsum("...nij,...nkj->...ik", turn @ own, turn)


def tensor_rate(turn, spin, tensor):
    """(..., 3, 3) its time derivative, Σ R (Ω a − a Ω) Rᵀ, Ω = ω×."""
    half = np.einsum("...nij,...nkj->...ik", turn @ _cross_matrix(spin) @ tensor, turn)
    return half + half.swapaxes(-1, -2)


def _cross_matrix(vector):
    x, y, z = np.moveaxis(vector, -1, 0)
    o = np.zeros_like(x)
    rows = [np.stack(row, axis=-1) for row in ((o, -z, y), (z, o, -x), (-y, x, o))]
    return np.stack(rows, axis=-2)


def absorption_matrix(absorptive):
    """B with τ = B G, body frame: ¼ (Tr αD − αD), (3, 3)."""
    return 0.25 * (np.trace(absorptive) * np.eye(3) - absorptive)


def absorption_flux(turn, spin, absorptive):
    """(..., 3) J = Σ R Bᵀ ω, the power that absorbing bodies take per unit of G.

    A linear body has no ω along its axis, so what it takes no torque from drops out.
    """
    return np.einsum("...nij,...nj->...i", turn, spin @ absorption_matrix(absorptive))


def mean_absorption(absorptive, free):
    """Torque over G of one body, averaged over orientations: Tr αD/6, linear (α∥ + α⊥)/6.

    free : (3,) 1 for each body axis about which a torque acts, else 0.
    Also ⟨L_k J_k⟩/kT of one body, by equipartition.
    """
    return float(np.diag(absorption_matrix(absorptive)) @ free) / 3.0


def correlate(a, b):
    """(..., T) ⟨Σ_k a_k(t0 + s) b_k(t0)⟩ over all origins t0, at the lags s ≥ 0.

    a, b : (..., T, k). By fast Fourier transforms; lag s has T − s origins.
    """
    length = a.shape[-2]
    size = fft.next_fast_len(2 * length - 1, real=True)
    spectrum = (fft.rfft(a, size, axis=-2) * fft.rfft(b, size, axis=-2).conj()).sum(axis=-1)
    return fft.irfft(spectrum, size, axis=-1)[..., :length] / np.arange(length, 0, -1)


def vector_kernel(a, flux):
    """(..., T) c(s) of ⟨A_i(s) J_j(0)⟩ = c(s) δ_ij in an isotropic liquid; (..., T, 3) each."""
    return correlate(a, flux) / 3.0


def tensor_kernel(a, flux):
    """(..., T) c(s) of symmetric traceless tensors, (..., T, 3, 3) each.

    ⟨A_ij(s) J_kl(0)⟩ = c(s) [½(δ_ik δ_jl + δ_il δ_jk) − ⅓δ_ij δ_kl].
    """
    return correlate(*(x.reshape(*x.shape[:-2], 9) for x in (a, flux))) / 5.0


def alignment_drive(coherency, k):
    """(T,) ¼ [S_kk − ⅓ Tr S] of coherency rows (T, 9), S as xx yy zz xy xz yz first."""
    xx, yy, zz, xy, xz, yz = coherency[:, :6].T
    x, y, z = k
    along = xx * x * x + yy * y * y + zz * z * z + 2.0 * (xy * x * y + xz * x * z + yz * y * z)
    return 0.25 * (along - (xx + yy + zz) / 3.0)


def gyration_drive(coherency, k):
    """(T,) ¼ G·k of coherency rows, G last; with the flux Σ ġ. Absorption takes 4 times it."""
    return 0.25 * coherency[:, 6:] @ k


def convolve(kernel, drive, interval):
    """(..., T) ∫₀^t ds kernel(s) drive(t − s) by the trapezoid rule.

    kernel : (..., S), S lags from 0 on; beyond them it counts as 0. drive : (..., T), from the
    time on before which it is 0. Leading axes broadcast. interval : between frames. [ps]
    """
    kernel, drive = np.array(kernel, float), np.array(drive, float)
    lags, length = kernel.shape[-1], drive.shape[-1]
    kernel[..., 0] *= 0.5
    drive[..., 0] *= 0.5
    size = fft.next_fast_len(lags + length - 1, real=True)
    product = fft.rfft(kernel, size) * fft.rfft(drive, size)
    out = interval * fft.irfft(product, size)[..., :length]
    out[..., 0] = 0.0  # nothing has acted yet
    return out


def refined(kernel, factor):
    """A kernel (..., S ≥ 4) on `factor` times finer lags, (..., factor (S − 1) + 1).

    By cubic splines; light that changes faster than the frames then acts when it does.
    """
    if factor == 1:
        return kernel
    lags = np.arange(kernel.shape[-1])
    return CubicSpline(lags, kernel, axis=-1)(np.arange(factor * lags[-1] + 1) / factor)


def noise_lag(kernels):
    """Number of lags to keep: twice those after which the mean is no more than its noise.

    kernels : (starts, T). z is the mean over its standard error. Behind its largest value, the
    first lag from which the mean square of z over a further quarter of the lag (at least five
    frames) is below `QUIET`, where noise alone has 1; and as much again. A kernel that nowhere
    stands out (|z| < `CLEAR`) is not cut: what it amounts to is not known, and the errors
    show it. At most four fifths of T, where the origins run out; that too with one start.
    """
    starts, length = kernels.shape
    most = min(max(FEWEST, 4 * length // 5), length)
    if starts < 2:
        return most
    variance = uniform_filter1d(kernels.var(axis=0, ddof=1), max(5, length // 20))
    error = np.sqrt(variance / starts) + np.finfo(float).tiny
    z = np.abs(kernels.mean(axis=0)) / error
    lag = int(np.argmax(z[:most]))
    if z[lag] < CLEAR:
        return most
    sums = np.concatenate([[0.0], np.cumsum(z**2)])
    for quiet in range(lag + 1, most):
        last = min(quiet + max(5, quiet // 4), length)
        if sums[last] - sums[quiet] < QUIET * (last - quiet):
            return int(np.clip(2 * quiet, min(FEWEST, length), most))
    return most


def polarise(susceptibility, field, interval):
    """(..., 3, T) dipole of all bodies at first order, M⁽¹⁾(t) = ∫ds χ(s) E(t − s). [e nm]

    susceptibility : (..., S) χ(s) = ⟨M(s)·Ṁ(0)⟩/3kT, conducting boundary.
    field : (T, 3) E. [u nm/ps²/e]
    """
    return convolve(susceptibility[..., None, :], field.T, interval)


def delivered_torque(dipole, field, k):
    """(..., T) (M⁽¹⁾×E)·k: what resolved light delivers, closed at second order in E."""
    return np.einsum("...jt,tj->...t", dipole, np.cross(field, k))


def running_integral(values, interval):
    """(..., T) ∫₀^t by the trapezoid rule."""
    sums = np.cumsum(values, axis=-1)
    return interval * (sums - 0.5 * values - 0.5 * values[..., :1])


def delivered_work(dipole, field, field_rate, interval):
    """(..., T) ∫₀^t E·Ṁ⁽¹⁾ dt, as E·M⁽¹⁾ − ∫Ė·M⁽¹⁾ dt; the light's work once E is over.

    field_rate : (T, 3) Ė.
    """
    here = np.einsum("...jt,tj->...t", dipole, field)
    return here - running_integral(np.einsum("...jt,tj->...t", dipole, field_rate), interval)


def delivered_spectra(susceptibility, field, k, interval):
    """Angular momentum along k and work that each spectral component delivers.

    Returns ω (F,) [rad/ps]; χ″(ω)G(ω)/π and ωχ″(ω)|E(ω)|²/π, (..., F), with
    G(ω) = i[E(ω)×E*(ω)]·k and E(ω) = ∫E e^{iωt} dt; and the step in ω, so that the sums of
    both times that step are ∫τ dt and ∫E·Ṁ dt of the whole pulse. Their ratio at one ω is
    s3/ω: only a narrow band delivers s3/ω₀ of its work.
    """
    kernel = np.array(susceptibility, float)
    kernel[..., 0] *= 0.5
    size = fft.next_fast_len(kernel.shape[-1] + len(field), real=True)
    omega = 2.0 * np.pi * fft.rfftfreq(size, interval)
    loss = -interval * fft.rfft(kernel, size).imag  # numpy's sign is e^{−iωt}
    waves = interval * fft.rfft(field, size, axis=0).conj()
    helicity = (1j * np.cross(waves, waves.conj())).real @ k
    power = (np.abs(waves) ** 2).sum(axis=-1)
    return omega, loss * helicity / np.pi, omega * loss * power / np.pi, omega[1]


def spin_estimate(spin_correlation, torque, interval):
    """(..., T) Δ⟨L·k⟩ ≈ ∫ds C_L(s)/C_L(0) τ(t − s); an ESTIMATE, not linear response.

    It would be exact if the light torque did not depend on orientation. The exact answer at
    second order in E needs stability matrices, which dark runs do not hold.
    spin_correlation : (..., S) of Σ L. torque : (..., T), leading axes alike.
    """
    return convolve(spin_correlation / spin_correlation[..., :1], torque, interval)
