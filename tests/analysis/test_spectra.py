"""Spectra against processes whose spectra are known in closed form."""

import numpy as np
import pytest
from scipy import constants, signal

from swirlight import units
from swirlight.analysis import spectra
from swirlight.analysis.kubo import tensor_sum
from swirlight.errors import InputError
from swirlight.rotation import normalised, rotation_matrix

VOLUME, KELVIN = 10.0, 300.0


def ornstein_uhlenbeck(random, runs, frames, keep):
    """(runs, frames, 3) of unit variance; keep = exp(−Δt/τ). Exact at any Δt."""
    noise = random.standard_normal((runs, frames, 3))
    noise[:, 1:] *= np.sqrt(1 - keep**2)
    return signal.lfilter([1.0], [1.0, -keep], noise, axis=1)


def each(x, lags):
    """(lags, n, p) autocorrelation of every one of n records, x (frames, n, p)."""
    return np.stack([spectra.autocorrelation([x[:, [k]]], lags)[0] for k in range(x.shape[1])], 1)


def debye(frequencies, chi, tau, high=1.0):
    return high + chi / (1 - 2j * np.pi * frequencies * tau)


# --- the estimator ------------------------------------------------------------------------


@pytest.mark.parametrize("name", spectra.WINDOWS)
def test_windows_begin_at_one_and_have_the_width_they_say(name):
    lags, interval = 4000, 0.01
    weight = spectra.windowed(np.ones(lags), name)
    assert weight[0] == 1.0
    f, size = spectra.grid(lags, interval, spectra.resolution(name, lags * interval) / 50)
    line = spectra.spectral_density(weight, interval, size)
    half = np.interp(-0.5 * line[0], -line[: np.argmax(line < 0.3 * line[0])], f[: np.argmax(
        line < 0.3 * line[0])])
    np.testing.assert_allclose(2 * half, spectra.resolution(name, lags * interval), rtol=2e-3)


def test_exponential_gives_the_debye_form_to_second_order():
    """Its kink at 0 is the worst case: the trapezoid rule is off by ωΔt²/12τ."""
    tau, error = 2.0, []
    for interval in (0.04, 0.02):
        lags = round(30 * tau / interval)
        c = np.exp(-interval * np.arange(lags) / tau)
        f, size = spectra.grid(lags, interval, 0.01)
        got = spectra.relaxation_transform(c, interval, size)
        error.append(np.abs(got - debye(f, 1.0, tau, 0.0))[f <= 1.0].max())
    np.testing.assert_allclose(error[1], 2 * np.pi * 0.02**2 / 12 / tau, rtol=0.05)
    assert 3.9 < error[0] / error[1] < 4.1


def test_smooth_correlation_is_exact_where_it_is_resolved():
    """C = exp(−t²/2s²): D'' = ω s √(π/2) exp(−ω²s²/2), D' = 1 − √2 ωs Dawson(ωs/√2)."""
    from scipy.special import dawsn

    s, interval = 0.2, 0.04
    c = np.exp(-0.5 * (interval * np.arange(200) / s) ** 2)
    f, size = spectra.grid(200, interval, 0.05)
    got = spectra.relaxation_transform(c, interval, size)
    x = 2 * np.pi * f * s
    seen = f < 0.3 / interval
    np.testing.assert_allclose(got.imag[seen], (x * np.sqrt(np.pi / 2) * np.exp(-x * x / 2))[seen],
                               atol=1e-7)
    # The real part's own error is (ωΔt)²(Δt/s)²/240 at most.
    np.testing.assert_allclose(got.real[seen], (1 - np.sqrt(2) * x * dawsn(x / np.sqrt(2)))[seen],
                               atol=1e-3)


@pytest.mark.parametrize("name", spectra.WINDOWS)
def test_sum_rules_hold_to_rounding_for_any_data(name):
    """Static limit, (2/π)∫D''/ω dω = C_0, and the integral of a spectral density."""
    random = np.random.default_rng(5)
    c = spectra.windowed(each(random.standard_normal((500, 2, 1)), 100)[..., 0], name)
    interval, size = 0.02, 512
    d = spectra.relaxation_transform(c, interval, size)
    np.testing.assert_allclose(d[0], c[0], rtol=1e-13)
    density = spectra.spectral_density(c, interval, size)
    whole = np.r_[1.0, 2 * np.ones(size // 2 - 1), 1.0] @ density / (size * interval)
    np.testing.assert_allclose(whole, c[0], rtol=1e-12)
    omega = 2 * np.pi * np.fft.rfftfreq(size, interval)[:, None]
    np.testing.assert_allclose(d.imag, 0.5 * omega * density, atol=1e-12 * np.abs(d).max())
    states = spectra.density_of_states(c, interval, size)
    np.testing.assert_allclose(np.trapezoid(states, dx=1 / (size * interval), axis=0), 1.0,
                               rtol=1e-12)


def test_real_part_follows_from_the_imaginary_one():
    """Kramers–Kronig: D'(ω) = (2/π) P∫ x D''(x)/(x² − ω²) dx, by the rule of every other point."""
    tau, interval = 0.5, 0.01
    t = interval * np.arange(1500)
    c = np.exp(-t / tau) * np.cos(6.0 * t) * (1 + t / tau)
    f, size = spectra.grid(1500, interval, 0.02)
    d = spectra.relaxation_transform(spectra.windowed(c, "gaussian"), interval, size)
    omega, step = 2 * np.pi * f, 2 * np.pi * f[1]
    for k in range(20, 400, 37):
        other = np.arange((k + 1) % 2, len(f), 2)
        x = omega[other]
        real = 2 / np.pi * 2 * step * np.sum(x * d.imag[other] / (x**2 - omega[k] ** 2))
        assert abs(real - d.real[k]) < 3e-3 * np.abs(d).max()  # what lies beyond Nyquist


def test_autocorrelation_against_the_double_loop():
    x = np.random.default_rng(1).standard_normal((60, 4, 3))

    def slow(first, last):
        origins = [np.arange(first, min(last, 60 - k)) for k in range(10)]
        return np.array([np.mean(x[first:last] ** 2, axis=(0, 1))
                         - 0.5 * np.mean((x[t + k] - x[t]) ** 2, axis=(0, 1))
                         for k, t in enumerate(origins)])

    whole, parts = spectra.autocorrelation([x[:, :1], x[:, 1:]], 10, pieces=3)
    np.testing.assert_allclose(whole, slow(0, 60), atol=1e-13)
    np.testing.assert_allclose(parts, [slow(0, 20), slow(20, 40), slow(40, 60)], atol=1e-13)


def test_autocorrelation_of_a_piece_of_a_slow_wave_has_no_kink():
    """A record that begins and ends anywhere: first differences vanish as k², not as k."""
    x = np.cos(0.01 * np.arange(629))
    c = each(x[:, None, None], 10)[:, 0, 0]
    np.testing.assert_allclose((c[0] - c)[1:] / np.arange(1, 10) ** 2, c[0] - c[1], rtol=0.1)
    plain = np.array([np.mean(x[: 629 - k] * x[k:]) for k in range(10)])
    assert abs(plain[1] - plain[0]) > 5 * (c[0] - c[1])


# --- permittivity -------------------------------------------------------------------------


def test_debye_relaxation_from_a_noisy_dipole():
    """64 records of 200 τ: ε(ω) within 4.5 standard errors at 40 frequencies, and together."""
    interval, tau, moment, runs = 0.1, 2.0, 3.0, 64
    m = moment * ornstein_uhlenbeck(np.random.default_rng(7), runs, 4000, np.exp(-interval / tau))
    lags = 400
    c = each(np.moveaxis(m, 0, 1), lags).sum(axis=-1)
    f, size = spectra.grid(lags, interval, spectra.resolution("none", lags * interval))
    eps = spectra.permittivity(c, interval, size, VOLUME, KELVIN).mean(axis=1)
    every = spectra.permittivity(c, interval, size, VOLUME, KELVIN)
    chi = 3 * moment**2 * spectra.dipole_strength(VOLUME, KELVIN)
    # What the estimator makes of the exact correlation; Debye's form but for ωΔt²/12τ.
    exact = 1 + chi * spectra.relaxation_transform(
        np.exp(-interval * np.arange(lags) / tau), interval, size)
    rows = np.arange(0, 200, 5)
    np.testing.assert_allclose(exact[rows], debye(f, chi, tau)[rows], atol=2e-3 * chi)
    for part in (np.real, np.imag):
        error = part(every).std(axis=1, ddof=1)[rows] / np.sqrt(runs)
        z = (part(eps) - part(exact))[rows] / np.where(error > 0, error, 1.0)
        assert np.abs(z).max() < 4.5
        assert 0.4 < np.sqrt(np.mean(z**2)) < 1.8  # correlated: about 10 are independent
    fluctuation = 1 + (m**2).sum(axis=-1).mean() * spectra.dipole_strength(VOLUME, KELVIN)
    np.testing.assert_allclose(eps[0], fluctuation, rtol=1e-12)
    si = (m**2).sum(axis=-1).mean() * (constants.e * 1e-9) ** 2 / (
        3 * constants.epsilon_0 * VOLUME * 1e-27 * constants.k * KELVIN)
    np.testing.assert_allclose(fluctuation, 1 + si, rtol=1e-10)


def test_high_frequency_permittivity_is_added():
    c = np.exp(-0.05 * np.arange(200))
    one, two = (spectra.permittivity(c, 0.1, 512, VOLUME, KELVIN, x) for x in (1.0, 1.8))
    np.testing.assert_allclose(two - one, 0.8, rtol=1e-12)
    assert spectra.checked_high_frequency(None) == 1.0
    with pytest.raises(InputError, match="high_frequency: 0.5"):
        spectra.checked_high_frequency(0.5)


def test_inertial_rotor_obeys_the_f_sum_rule():
    """(2/π)∫ω ε'' dω = ⟨Ṁ²⟩/3Vε0kT: Gaussian C(t), ⟨Ṁ²⟩ = C_0/s²."""
    s, interval = 0.3, 0.05
    c = np.exp(-0.5 * (interval * np.arange(400) / s) ** 2)
    f, size = spectra.grid(400, interval, 0.02)
    eps = spectra.permittivity(c, interval, size, VOLUME, KELVIN)
    total = 2 / np.pi * np.trapezoid(2 * np.pi * f * eps.imag, 2 * np.pi * f)
    np.testing.assert_allclose(total, spectra.dipole_strength(VOLUME, KELVIN) / s**2, rtol=1e-6)


def test_ions_give_drudes_conductivity_and_permittivity():
    """J an Ornstein–Uhlenbeck process, M = ∫J: σ = σ0/(1 − iωτ), ε − 1 = −σ0 τ/ε0/(1 − iωτ)."""
    fine, every, tau, runs = 0.02, 5, 1.0, 48
    j = ornstein_uhlenbeck(np.random.default_rng(3), runs, 40_000, np.exp(-fine / tau))
    m = np.cumsum(0.5 * fine * (j[:, 1:] + j[:, :-1]), axis=1)[:, ::every]
    interval, lags = fine * every, 120
    c = each(np.moveaxis(np.diff(m, axis=1) / interval, 0, 1), lags).sum(axis=-1)
    f, size = spectra.grid(lags, interval, 0.1)
    sigma = spectra.conductivity(c, interval, size, VOLUME, KELVIN)
    static = tau / (VOLUME * units.BOLTZMANN * KELVIN)
    omega = 2 * np.pi * f
    exact = static / (1 - 1j * omega * tau)
    seen = (f > 0) & (f < 2.0)
    error = (sigma.real.std(axis=1, ddof=1) + 1j * sigma.imag.std(axis=1, ddof=1)) / np.sqrt(runs)
    away = sigma.mean(axis=1) - exact
    # 4.5 standard errors, and what the step of 0.1 τ leaves at J's kink: 1e-3 of σ0.
    assert (np.abs(away.real) < 4.5 * error.real + 1e-3 * static)[seen].all()
    assert (np.abs(away.imag) < 4.5 * error.imag + 1e-3 * static)[seen].all()
    eps = spectra.permittivity_of_conductor(exact, f) - 1
    np.testing.assert_allclose(
        eps[1:], (-tau * exact / units.VACUUM_PERMITTIVITY)[1:], rtol=1e-9)


def test_absorption_and_index_of_a_known_permittivity():
    """ε = (1.5 + 0.2i)²: n = 1.5, α = 2ω 0.2/c; in SI by scipy.constants."""
    f = np.array([0.0, 1.0, 3.0])
    eps = np.full(3, (1.5 + 0.2j) ** 2)
    np.testing.assert_allclose(spectra.refraction(eps), 1.5)
    per_metre = 2 * (2 * np.pi * f * 1e12) * 0.2 / constants.c
    got = spectra.absorption(f, eps) / spectra.PER_CENTIMETRE
    np.testing.assert_allclose(got, per_metre / 100, rtol=1e-12)


def test_units_against_scipy():
    np.testing.assert_allclose(spectra.WAVENUMBER, 1e12 / constants.c / 100, rtol=1e-12)
    np.testing.assert_allclose(
        1 / spectra.SIEMENS_PER_METRE,
        constants.e**2 * 1e-12 / (constants.atomic_mass * 1e-27), rtol=1e-10)
    alpha, energy = 1 / units.COULOMB_METRE2_PER_VOLT, 1 / units.JOULE
    np.testing.assert_allclose(1 / spectra.HYPERPOLARIZABILITY, alpha**2 / energy, rtol=1e-12)


# --- Kerr ---------------------------------------------------------------------------------


def test_static_kerr_limit_of_uncorrelated_linear_bodies():
    """χ(0) = Δα²/30kT per body (the orientational Kerr effect); 20 000 orientations, 4 sigma."""
    random = np.random.default_rng(4)
    bodies, frames, delta = 20, 4000, 1.9
    q = normalised(random.standard_normal((frames, bodies, 4)))
    pi = tensor_sum(rotation_matrix(q), np.diag([1.0, 1.0, 1.0 + delta]))
    square = (pi**2).sum(axis=(1, 2))
    c = np.array([square.mean(), 0.0])
    chi = spectra.kerr_susceptibility(c, 0.1, 4, KELVIN, bodies)[0].real
    sigma = square.std() / np.sqrt(frames) / square.mean()
    np.testing.assert_allclose(chi, delta**2 / (30 * units.BOLTZMANN * KELVIN), rtol=4 * sigma)


def test_kerr_response_and_susceptibility_are_transforms_of_each_other():
    t = 0.01 * np.arange(4000)
    c = np.exp(-t / 2) * (1 + t / 2)
    response = spectra.kerr_response(c, 0.01, KELVIN, 7)
    f, size = spectra.grid(4000, 0.01, 0.1)
    chi = spectra.kerr_susceptibility(c, 0.01, size, KELVIN, 7)
    for k in (0, 3, 10, 40):
        direct = np.trapezoid(response * np.exp(2j * np.pi * f[k] * t), t)
        np.testing.assert_allclose(chi[k], direct, atol=1e-4 * abs(chi[0]))


# --- librations ---------------------------------------------------------------------------


def test_harmonic_librator_shows_its_frequency_and_nothing_else():
    """Librators of 2 THz with thermal amplitudes: one line there, as wide as stated."""
    random = np.random.default_rng(6)
    t = 0.02 * np.arange(2000)
    phase = random.uniform(0, 2 * np.pi, 200)
    omega = random.rayleigh(size=200) * np.cos(2 * np.pi * 2.0 * t[:, None] + phase)
    lags = 500
    c = spectra.windowed(spectra.autocorrelation([omega[..., None]], lags)[0][:, 0], "hann")
    width = spectra.resolution("hann", 10.0)
    f, size = spectra.grid(lags, 0.02, width / 8)
    g = spectra.density_of_states(c, 0.02, size)
    assert abs(f[g.argmax()] - 2.0) < 0.02
    above = f[g > 0.5 * g.max()]
    np.testing.assert_allclose(np.ptp(above), width, atol=2 * f[1])
    near = np.abs(f - 2.0) < 2.5 * width
    assert g[near].sum() / g.sum() > 0.99


def test_free_linear_rotor_has_a_line_at_zero_alone():
    """Its angular velocity is conserved: half of the resolution's width, and nothing above."""
    omega = np.random.default_rng(8).standard_normal((1, 50, 3)) * np.ones((600, 1, 1))
    c = spectra.windowed(spectra.autocorrelation([omega], 200)[0].mean(axis=1), "hann")
    f, size = spectra.grid(200, 0.02, 0.05)
    g = spectra.density_of_states(c, 0.02, size)
    assert g.argmax() == 0
    # Of the Hann window's line (two lobes of 1/T on either side) 99.9 % lies below 2/T.
    below = f < 2 / 4.0
    assert g[below].sum() / g.sum() > 0.99


def test_free_asymmetric_top_has_the_lines_of_its_elliptic_functions():
    """ω_x, ω_y, ω_z = cn, sn, dn of a turning body: odd multiples of 1/4K for cn and sn.

    Fourier series of Jacobi's functions: Abramowitz & Stegun 16.23 (from memory); the amplitudes
    are those of Euler's equations at any energy, so one value of m is enough.
    """
    from scipy.special import ellipj, ellipk

    m, rate, interval = 0.8, 2 * np.pi * 1.1, 0.02
    k, quarter = np.sqrt(m), ellipk(m)
    nome = np.exp(-np.pi * ellipk(1 - m) / quarter)
    start = np.linspace(0, 4 * quarter, 64, endpoint=False)
    sn, cn, _, _ = ellipj(rate * interval * np.arange(3000)[:, None] + start, m)
    lags = 1500
    width = spectra.resolution("hann", lags * interval)
    f, size = spectra.grid(lags, interval, width)
    line, n = rate / (4 * quarter), np.arange(4)
    for x, shape in ((sn, 1 / (1 - nome ** (2 * n + 1))), (cn, 1 / (1 + nome ** (2 * n + 1)))):
        c = spectra.windowed(spectra.autocorrelation([x[..., None]], lags)[0][:, 0], "hann")
        g = spectra.density_of_states(c, interval, size)
        seen = np.array([g[np.abs(f - p * line) < 8 * width].sum() * f[1]
                         for p in (1, 3, 5, 7)])
        power = 0.5 * (2 * np.pi / (k * quarter) * nome ** (n + 0.5) * shape) ** 2
        np.testing.assert_allclose(seen, power / power.sum(), atol=3e-4)
        assert seen.sum() > 0.999


# --- transient ----------------------------------------------------------------------------


def test_a_probe_reads_the_permittivity_it_meets():
    """δM = ∫χ(s) E(t − s) ds of a damped oscillator and a Debye part, circular and linear probe."""
    interval, frames = 0.005, 12_000
    t = interval * np.arange(frames)
    w0, damping, a, b, tau = 2 * np.pi * 1.2, 2.0, 5.0, 3.0, 0.6
    wd = np.sqrt(w0**2 - damping**2 / 4)
    kernel = a * w0**2 * np.exp(-damping * t / 2) * np.sin(wd * t) / wd + b / tau * np.exp(-t / tau)
    envelope = np.exp(-0.5 * ((t - 3.0) / 0.4) ** 2)
    carrier = 2 * np.pi * 1.0 * (t - 3.0)
    for field in (np.outer(envelope * np.sin(carrier), [1.0, 0.0, 0.0]),
                  np.stack([envelope * np.cos(carrier), envelope * np.sin(carrier), 0 * t], 1)):
        kernel_of_rule = kernel * interval
        kernel_of_rule[0] *= 0.5
        moment = units.VACUUM_PERMITTIVITY * VOLUME * signal.fftconvolve(
            field, kernel_of_rule[:, None], axes=0)[:frames]
        f, eps, power = spectra.transient_permittivity(moment, field, interval, VOLUME, frames)
        band = power > 0.01
        omega = 2 * np.pi * f[band]
        exact = 1 + a * w0**2 / (w0**2 - omega**2 - 1j * damping * omega) \
            + b / (1 - 1j * omega * tau)
        assert band.sum() > 40
        # The trapezoid rule made δM: its end at s = 0 is worth Δt²/12 dχ/ds = 6e-4.
        np.testing.assert_allclose(eps[band], exact, atol=1e-3)
