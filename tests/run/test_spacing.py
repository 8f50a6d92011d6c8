"""Integrated correlation times against processes whose times are known."""

import numpy as np

from swirlight.run.spacing import autocorrelation, integrated_time, second_rank


def ornstein_uhlenbeck(tau, interval, frames, bodies, seed):
    random = np.random.default_rng(seed)
    c = np.exp(-interval / tau)
    x = random.standard_normal((bodies, 3))
    out = np.empty((frames, bodies, 3))
    for k in range(frames):
        out[k] = x
        x = c * x + np.sqrt(1 - c * c) * random.standard_normal(x.shape)
    return out


def test_autocorrelation_is_the_direct_double_loop():
    series = np.random.default_rng(1).standard_normal((40, 3, 2))
    direct = np.array([
        np.mean([(series[t] * series[t + lag]).sum() for t in range(40 - lag)])
        for lag in range(20)
    ])
    np.testing.assert_allclose(autocorrelation(series), direct / direct[0], atol=1e-12)


def test_time_of_an_ornstein_uhlenbeck_process():
    tau, interval, frames, bodies = 0.4, 0.05, 4000, 8
    got, settled = integrated_time(ornstein_uhlenbeck(tau, interval, frames, bodies, 2), interval)
    assert settled
    # relative variance of a windowed time: 2(2M+1)/frames (Madras & Sokal 1988), M = 5 tau
    window = 5 * tau / interval
    error = tau * np.sqrt(2 * (2 * window + 1) / (frames * bodies * 3))
    # the cut at 5 tau leaves out exp(-5) of the sum; 4 sigma
    assert abs(got - tau * (1 - np.exp(-5))) < 4 * error + interval**2 / (12 * tau)


def test_a_record_too_short_says_so():
    slow = np.linspace(1.0, 0.9, 50)[:, None, None] * np.ones((50, 4, 3))
    assert integrated_time(slow, 0.1)[1] is False


def test_second_rank_components_carry_p2():
    random = np.random.default_rng(3)
    a, b = (v / np.linalg.norm(v) for v in random.standard_normal((2, 3)))
    assert np.isclose(second_rank(a) @ second_rank(b), 0.5 * (3 * (a @ b) ** 2 - 1), atol=1e-14)
