"""Error bars that keep their promise, and tests that do not cry wolf."""

import numpy as np
import pytest
from scipy import stats

from swirlight.analysis.statistics import (
    blocking_error,
    function_of_means,
    half_width,
    largest_t,
    mean_and_error,
    smallest_p,
    starts_needed,
    studentised_interval,
)

LEVELS = np.array([0.68, 0.95])


def ratio(means):
    return means[..., 0] / means[..., 1]


def test_mean_error_and_p_are_those_of_the_t_test():
    values = np.random.default_rng(5).normal(0.3, 1.0, 12)
    mean, error, p = mean_and_error(values)
    reference = stats.ttest_1samp(values, 0.0)
    np.testing.assert_allclose([mean, p], [values.mean(), reference.pvalue], rtol=1e-12)
    low, high = reference.confidence_interval(0.95)
    np.testing.assert_allclose(half_width(error, 12), 0.5 * (high - low), rtol=1e-12)


def test_one_start_has_no_error_and_equal_starts_have_none_to_spread():
    assert np.isnan(mean_and_error([1.0])[1]) and np.isnan(half_width(1.0, 1))
    assert mean_and_error([2.0, 2.0])[1:] == (0.0, 0.0)
    assert mean_and_error([0.0, 0.0])[1:] == (0.0, 1.0)
    assert np.isnan(mean_and_error([np.nan, np.nan])).all()


@pytest.mark.parametrize("starts", [4, 8, 16])
def test_coverage_of_means(starts, table):
    trials = 4000
    mean, error, _ = mean_and_error(np.random.default_rng(6).standard_normal((starts, trials)))
    for level in LEVELS:
        covered = (np.abs(mean) < half_width(error, starts, level)).mean()
        allowed = 3 * np.sqrt(level * (1 - level) / trials)  # 3 binomial sigma
        table(f"coverage of means at {starts} starts", f"{covered:.3f}", f"{level}±{allowed:.3f}")
        assert abs(covered - level) < allowed


@pytest.mark.parametrize("starts", [8, 16])
def test_coverage_of_ratios(starts, table):
    """Means 1 and 2, scatter 0.4 of one start."""
    random, trials, hits = np.random.default_rng(3), 2000, np.zeros(2)
    for _ in range(trials):
        values = np.array([1.0, 2.0]) + 0.4 * random.standard_normal((starts, 2))
        low, high = studentised_interval(values, ratio, random, LEVELS, 600)
        hits += (low <= 0.5) & (high >= 0.5)
    for level, covered in zip(LEVELS, hits / trials, strict=True):
        # 16 starts: 3 binomial sigma; 8 starts: 3 points, as the method itself is approximate
        allowed = 0.03 if starts == 8 else 3 * np.sqrt(level * (1 - level) / trials)
        table(f"coverage of ratios at {starts} starts", f"{covered:.3f}", f"{level}±{allowed:.3f}")
        assert abs(covered - level) < allowed


def test_no_bootstrap_below_eight_starts():
    values = np.random.default_rng(1).normal(1.0, 0.1, (7, 2))
    assert np.isnan(studentised_interval(values, ratio, np.random.default_rng(1))).all()


def test_jackknife_error_of_a_mean_is_the_standard_error():
    values = np.random.default_rng(2).standard_normal((9, 1))
    value, error = function_of_means(values, lambda m: m[..., 0])
    mean, reference, _ = mean_and_error(values[:, 0])
    np.testing.assert_allclose([value, error], [mean, reference], rtol=1e-12)


def walks(random, starts):
    """(starts, 40): times strongly correlated, as those of one trajectory are."""
    return random.standard_normal((starts, 40)).cumsum(axis=1)


def test_p_is_uniform_where_there_is_nothing(table):
    """Kolmogorov-Smirnov on 300 null experiments of 16 starts; fails once in 1000 seeds."""
    random = np.random.default_rng(7)
    p = [largest_t(walks(random, 16), random)[0] for _ in range(300)]
    found = stats.kstest(p, "uniform").pvalue
    table("null p-values uniform, 16 starts, KS", f"p = {found:.2g}", "> 0.001")
    assert found > 0.001


def test_largest_t_against_all_patterns_one_by_one():
    values = walks(np.random.default_rng(8), 6) + 2.0
    t = [abs(stats.ttest_1samp(values * signs[:, None], 0.0).statistic).max()
         for signs in np.array(np.meshgrid(*[[1, -1]] * 6)).reshape(6, -1).T]
    seen = abs(stats.ttest_1samp(values, 0.0).statistic)
    p, largest, index, smallest = largest_t(values, np.random.default_rng(1))
    assert p == pytest.approx(np.mean(np.array(t) >= seen.max() * (1 - 1e-9)))
    assert largest == pytest.approx(seen.max()) and index == seen.argmax()
    assert smallest == smallest_p(6) == 1 / 32


def test_largest_t_of_a_clear_signal_of_none_and_of_one_start():
    random = np.random.default_rng(9)
    assert largest_t(walks(random, 16) * 1e-3 + 1.0, random)[0] == smallest_p(16) == 1 / 4096
    assert largest_t(np.zeros((5, 3)), random)[:3] == (1.0, 0.0, 0)
    assert largest_t(np.ones((5, 3)), random)[0] == 1 / 16
    assert np.isnan(largest_t(np.ones((1, 3)), random)[0])
    assert np.isnan(largest_t(np.full((5, 3), np.nan), random)[0])


@pytest.mark.parametrize(("mean", "scatter", "level", "power"),
                         [(1, 1, 0.001, 0.5), (-1, 2, 0.001, 0.5), (1, 2, 0.05, 0.9)])
def test_starts_needed_reach_what_they_promise(mean, scatter, level, power):
    """20000 repeats with that many starts, and with one fewer: 4 binomial sigma."""
    random, needed = np.random.default_rng(11), starts_needed(mean, scatter, level, power)
    allowed = 4 * np.sqrt(power * (1 - power) / 20000)
    for starts, sign in ((needed, 1), (needed - 1, -1)):
        values = mean + scatter * random.standard_normal((starts, 20000))
        reached = np.mean(mean_and_error(values)[2] < level)
        assert sign * (reached - power) > -allowed


def test_starts_needed_at_the_ends():
    assert starts_needed(1.0, 0.0) == 2
    assert starts_needed(0.0, 1.0, most=50) == starts_needed(0.001, 1.0, most=50) == 51
    assert starts_needed(1.0, np.nan, most=50) == starts_needed(np.nan, 1.0, most=50) == 51


def test_blocking_error_of_white_and_of_correlated_noise():
    random, n = np.random.default_rng(4), 2**14
    white = random.standard_normal(n)
    # the largest of 10 levels; the last, of 16 blocks, scatters by 1/sqrt(30) = 18 %: 4 of them
    assert 0.97 / np.sqrt(n) < blocking_error(white) < 1.75 / np.sqrt(n)
    c, slow = 0.9, np.empty(n)
    slow[0] = 0.0
    for k in range(1, n):
        slow[k] = c * slow[k - 1] + np.sqrt(1 - c * c) * white[k]
    true = np.sqrt((1 + c) / (1 - c) / n)  # of an AR(1) process's mean, unit variance
    assert 0.85 * true < blocking_error(slow) < 1.75 * true
    assert np.isnan(blocking_error(white[:15])) and np.isfinite(blocking_error(white[:16]))
