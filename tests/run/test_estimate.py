"""Even and odd parts and their plain errors."""

import numpy as np
from scipy import stats

from swirlight.run.estimate import even_odd, half_width, mean_and_error


def test_parts():
    even, odd = even_odd([3.0, 4.0], [1.0, 0.0], [0.5, 1.0])
    assert even.tolist() == [1.5, 1.0] and odd.tolist() == [1.0, 2.0]
    assert even_odd([1.0], [2.0])[0] is None


def test_mean_error_and_p_are_those_of_the_t_test():
    values = np.random.default_rng(5).normal(0.3, 1.0, 12)
    mean, error, p = mean_and_error(values)
    reference = stats.ttest_1samp(values, 0.0)
    np.testing.assert_allclose([mean, p], [values.mean(), reference.pvalue], rtol=1e-12)
    low, high = reference.confidence_interval(0.95)
    np.testing.assert_allclose(half_width(error, 12), 0.5 * (high - low), rtol=1e-12)


def test_coverage_of_the_interval():
    random, starts, trials = np.random.default_rng(6), 4, 4000
    mean, error, _ = mean_and_error(random.standard_normal((starts, trials)))
    covered = (np.abs(mean) < half_width(error, starts)).mean()
    assert abs(covered - 0.95) < 4 * np.sqrt(0.95 * 0.05 / trials)  # 4 binomial sigma


def test_one_start_has_no_error_and_equal_starts_have_none_to_spread():
    assert np.isnan(mean_and_error([1.0])[1]) and np.isnan(half_width(1.0, 1))
    assert mean_and_error([2.0, 2.0])[1:] == (0.0, 0.0)
    assert mean_and_error([0.0, 0.0])[1:] == (0.0, 1.0)
