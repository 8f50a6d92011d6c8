"""Correlation sums against plain double loops, identities, and what the mean and norm do."""

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from swirlight.analysis.correlation import by_lag, lagged_sums, locked_sums
from swirlight.analysis.samples import over_pieces, over_starts


def noise(seed, frames, bodies, components, offset=0.0):
    return np.random.default_rng(seed).normal(size=(frames, bodies, components)) + offset


def direct(a, b, longest, begin, end, first_mean, second_mean):
    """(lags, p, q) by the definition, origins in [begin, end); NaN without one."""
    found = np.full((2 * longest + 1, a.shape[2], b.shape[2]), np.nan)
    for lag in range(-longest, longest + 1):
        sums, count = 0.0, 0
        for t0 in range(begin, end):
            if 0 <= t0 + lag < len(a):
                for body in range(a.shape[1]):
                    sums = sums + np.outer(a[t0, body] - first_mean, b[t0 + lag, body]
                                           - second_mean)
                    count += 1
        if count:
            found[lag + longest] = sums / count
    return found


@pytest.mark.parametrize("itself", [True, False])
@given(seed=st.integers(0, 2**31), frames=st.integers(2, 12), bodies=st.integers(1, 3),
       pieces=st.integers(1, 3), part=st.floats(0, 1), offset=st.floats(-10, 10))
def test_transforms_equal_the_double_loop(itself, seed, frames, bodies, pieces, part, offset):
    longest, pieces = int(part * (frames - 1)), min(pieces, frames)
    a = noise(seed, frames, bodies, 3, offset)
    b = a if itself else noise(seed + 1, frames, bodies, 2, offset)
    sums = lagged_sums([(a, b)], longest, pieces)
    means = (np.arange(3.0), np.arange(b.shape[2]) - 1.0)
    for first, second in ((np.zeros(3), np.zeros(b.shape[2])), means):
        found = sums.correlation(first[None, None], second[None, None])
        for k in range(pieces):
            plain = direct(a, b, longest, sums.edges[k], sums.edges[k + 1], first, second)
            np.testing.assert_allclose(found[k], plain, rtol=0, atol=1e-10 * (1 + offset**2))
    np.testing.assert_array_equal(sums.correlation(),
                                  sums.correlation(*(0 * m[None, None] for m in means)))


def test_long_series_in_float32_equal_the_double_loop():
    a = noise(3, 3000, 2, 2).astype(np.float32)
    found = lagged_sums([(a, a)], 40).correlation()[0]
    d = a.astype(float)
    for lag in (-40, -1, 0, 7, 40):
        head, tail = (d[:len(d) - lag], d[lag:]) if lag >= 0 else (d[-lag:], d[:lag])
        plain = np.einsum("tnp,tnq->pq", head, tail) / (2 * len(head))
        np.testing.assert_allclose(found[lag + 40], plain, rtol=0, atol=1e-10)


@given(seed=st.integers(0, 2**31), frames=st.integers(1, 40), pieces=st.integers(1, 4),
       cut=st.integers(1, 4))
def test_identities(seed, frames, pieces, cut):
    a, b = noise(seed, frames, 5, 2, 1.0), noise(seed + 1, frames, 5, 3)
    pieces = min(pieces, frames)
    sums = lagged_sums([(a, b)], frames - 1, pieces)
    # Every product of two instants occurs once: the sum over all lags is that of the totals.
    np.testing.assert_allclose(sums.products.sum(axis=(0, 1)),
                               np.einsum("np,nq->pq", a.sum(axis=0), b.sum(axis=0)), atol=1e-9)
    # Parseval: the lag zero is the mean product, and for one vector the mean square.
    own = lagged_sums([(a, a)], frames - 1, pieces)
    zero = own.joined().correlation()[0, frames - 1]
    np.testing.assert_allclose(np.diag(zero), own.joined().moments()[2].ravel(), atol=1e-12)
    np.testing.assert_allclose(np.diag(zero), (a**2).mean(axis=(0, 1)), atol=1e-12)
    # One vector with itself: C_xy(-t) = C_yx(t), exactly so for all origins.
    whole = own.joined().correlation()[0]
    np.testing.assert_allclose(whole[::-1], whole.swapaxes(1, 2), atol=1e-12)
    # Pieces add up to the whole, blocks of bodies to all bodies.
    one = lagged_sums([(a, b)], frames - 1)
    np.testing.assert_allclose(sums.joined().products, one.products, atol=1e-10)
    parts = lagged_sums([(a[:, :cut], b[:, :cut]), (a[:, cut:], b[:, cut:])], frames - 1)
    np.testing.assert_allclose(parts.correlation(), one.correlation(), atol=1e-11)
    np.testing.assert_array_equal(one.origins[0], frames - abs(one.lags))


def test_wrong_lags_and_no_bodies_are_refused():
    a = noise(1, 5, 1, 1)
    with pytest.raises(ValueError, match="a lag of 5 frames in a record of 5"):
        lagged_sums([(a, a)], 5)
    with pytest.raises(ValueError, match="no block"):
        lagged_sums([], 1)


def test_fixed_origins_equal_the_definition():
    a, b = noise(1, 9, 4, 3, 0.5), noise(2, 9, 4, 2)
    origins = [0, 5, 8]
    sums = locked_sums([(a[:, :3], b[:, :3]), (a[:, 3:], b[:, 3:])], origins)
    plain = np.einsum("onp,tnq->otpq", a[origins], b) / 4
    np.testing.assert_allclose(sums.correlation(), plain, atol=1e-13)
    first, second = a[origins].mean(axis=1)[:, None], b.mean(axis=1)[None]
    about = np.einsum("onp,tnq->otpq", a[origins] - first, b - second[0][:, None]) / 4
    np.testing.assert_allclose(sums.correlation(first, second), about, atol=1e-13)
    lags, shifted = by_lag(plain, origins)
    for row, t0 in enumerate(origins):
        for k, lag in enumerate(lags):
            if 0 <= t0 + lag < 9:
                np.testing.assert_array_equal(shifted[row, k], plain[row, t0 + lag])
            else:
                assert np.isnan(shifted[row, k]).all()


WEIGHTS = np.array([[[0.0, 1, 0], [-1, 0, 0], [0, 0, 0]], [[1, 0, 0], [0, 0, 0], [0, 0, 0]]])


def make_starts(count, repeats, seed=0):
    return [[noise(100 * s + r + seed, 30, 3, 3, 0.7) for r in range(repeats)]
            for s in range(count)]


@pytest.mark.parametrize("subtract", [False, True])
def test_the_mean_of_the_samples_has_the_common_mean_and_norm(subtract):
    starts = make_starts(4, 2)
    sums = [[lagged_sums([(a, a)], 6) for a in start] for start in starts]
    samples, mean = over_starts(sums, WEIGHTS, normalised=True, subtract_mean=subtract)
    data = np.array(starts)  # start, repeat, frame, body, component
    centre = data.mean(axis=(0, 1, 2, 3)) if subtract else np.zeros(3)
    square = ((data - centre) ** 2).mean(axis=(0, 1, 2, 3))
    plain = np.mean([direct(a, a, 6, 0, 30, centre, centre) for start in starts for a in start],
                    axis=0)
    norm = 2 * np.sqrt(square[0] * square[1])
    np.testing.assert_allclose(mean[0, :, 0], (plain[:, 0, 1] - plain[:, 1, 0]) / norm, atol=1e-12)
    np.testing.assert_allclose(mean[0, :, 1], plain[:, 0, 0] / square[0], atol=1e-12)
    np.testing.assert_allclose(samples.mean(axis=0), mean, atol=1e-12)
    assert abs(mean[0, 6, 1] - 1.0) < 1e-12 and np.ptp(samples[:, 0, 6, 1]) < 1e-12


def test_spread_of_the_samples_is_that_of_repeated_estimates():
    """Delta method: the error over 16 starts against the scatter of 400 such estimates.

    Both are known to about 4 %; the tolerance is four times that.
    """
    estimates, errors = [], []
    for trial in range(400):
        sums = [[lagged_sums([(a, a)], 2)] for (a,) in make_starts(16, 1, 10_000 * trial)]
        samples, mean = over_starts(sums, WEIGHTS[1:], True, True)
        estimates.append(mean[0, 4, 0])
        errors.append(samples[:, 0, 4, 0].std(ddof=1) / 4)
    assert np.std(estimates) == pytest.approx(np.sqrt(np.mean(np.square(errors))), rel=0.16)


def test_where_the_norm_is_zero_there_is_no_number():
    a = noise(1, 10, 2, 3)
    a[:4] = 0.0  # a pulse that has not come yet
    sums = [[locked_sums([(a, a)], [6])]]
    _, mean = over_starts(sums, WEIGHTS, normalised=True)
    assert np.isnan(mean[0, :4]).all() and np.isfinite(mean[0, 4:]).all()


def test_pieces_of_one_start_give_the_function_of_all_origins():
    a = noise(5, 64, 2, 3, 0.3)
    parted = lagged_sums([(a, a)], 40, 16)
    samples, mean = over_pieces(parted, WEIGHTS, normalised=True, subtract_mean=True)
    _, whole = over_starts([[lagged_sums([(a, a)], 40)]], WEIGHTS, True, True)
    np.testing.assert_allclose(mean, whole, atol=1e-12)
    assert samples.shape == (16, 1, 81, 2)
    # 24 origins have a partner 40 frames later: those of the first six pieces.
    assert np.isfinite(samples[:6, 0, -1]).all() and np.isnan(samples[6:, 0, -1]).all()
