"""How far apart the starts must lie to be independent.

Left to itself, the spacing is three times the slowest integrated correlation time of the
angular momentum and of P1 and P2 of a body axis, of each species, seen while equilibrating.
"""

import numpy as np

# Correlation times after which the sum ends (Madras & Sokal, J. Stat. Phys. 50, 109 (1988)).
WINDOW = 5.0
SAFETY = 3.0
WATCHED = 64  # bodies of each species that are watched


def autocorrelation(series):
    """C(lag)/C(0) of vectors, averaged over bodies and all origins, by FFT.

    series : (frames, bodies, components).
    Returns (frames // 2,): longer lags have too few origins.
    """
    frames, power = len(series), 0.0
    for body in np.moveaxis(series, 1, 0):  # one at a time: transforms of all would not fit
        spectrum = np.fft.rfft(body, n=2 * frames, axis=0)
        power = power + (spectrum.real**2 + spectrum.imag**2).sum(axis=1)
    raw = np.fft.irfft(power, n=2 * frames)[: frames // 2]
    c = raw / (frames - np.arange(frames // 2))
    return c / c[0]


def integrated_time(series, interval):
    """Integrated correlation time τ = ∫C(t)/C(0) dt, cut at the first lag ≥ 5 τ. [ps]

    series : (frames, bodies, components), `interval` apart [ps].
    Returns (τ, settled): settled is False when the record ended before the window did.
    """
    c = autocorrelation(series)
    # trapezoid from lag 0: τ(m) = interval (Σ_0^m c − (c_0 + c_m)/2)
    tau = interval * (np.cumsum(c) - 0.5 * (1.0 + c))
    lags = interval * np.arange(len(c))
    closed = np.flatnonzero((lags >= WINDOW * tau) & (lags > 0))
    if len(closed):
        return max(float(tau[closed[0]]), interval), True
    return float(tau.max()), False


def second_rank(axis):
    """The five independent components of u u − 1/3, whose autocorrelation is that of P2.

    axis : (..., 3) unit vectors. Returns (..., 5), scaled so that the squares sum to 1.
    """
    x, y, z = np.moveaxis(axis, -1, 0)
    root3 = np.sqrt(3.0)
    return np.stack([
        root3 * x * y, root3 * y * z, root3 * x * z,
        0.5 * root3 * (x * x - y * y), 0.5 * (3 * z * z - 1),
    ], axis=-1)


def correlation_times(momentum, axis, interval):
    """Integrated times of one species. [ps]

    momentum, axis : (frames, bodies, 3) angular momentum and a body axis, laboratory frame.
    Returns {name: (τ, settled)} for "angular momentum", "P1", "P2".
    """
    return {
        "angular momentum": integrated_time(momentum, interval),
        "P1": integrated_time(axis, interval),
        "P2": integrated_time(second_rank(axis), interval),
    }
