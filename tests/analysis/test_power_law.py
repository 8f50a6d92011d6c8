"""Exponents over a sweep: right, with honest intervals, and the threshold where it belongs."""

import numpy as np
import pytest

from swirlight.analysis.power_law import line, power_law
from swirlight.analysis.statistics import mean_and_error

X = np.array([1.0, 2.0, 4.0, 8.0])


STEEP, FLAT = (0.5, 0.7, 1.0, 2.0), (1.0, 1.0, 1.0, 1.0)  # scatter of one start at each x


@pytest.mark.parametrize(("starts", "scatter"), [
    (8, STEEP), *(pytest.param(*case, marks=pytest.mark.slow)
                  for case in ((16, STEEP), (8, FLAT), (16, FLAT)))])
def test_coverage_of_exponents(starts, scatter, table, monkeypatch):
    """Response = x. 8 starts: within 3 points; 16: within 3 binomial sigma."""
    from swirlight.analysis import power_law as module

    plain, trials, hits, found = module.studentised_interval, 2000, np.zeros(2), []
    levels = np.array([0.68, 0.95])

    def both(values, function, random):
        low, high = plain(values, function, random, levels, 600)
        found.append((low, high))
        return low[1], high[1]

    monkeypatch.setattr(module, "studentised_interval", both)
    random = np.random.default_rng([11, starts])
    for _ in range(trials):
        power_law(X, X + np.array(scatter) * random.standard_normal((starts, 4)), random)
        low, high = found.pop()
        hits += (low <= 1.0) & (high >= 1.0)
    for level, covered in zip(levels, hits / trials, strict=True):
        allowed = 0.03 if starts == 8 else 3 * np.sqrt(level * (1 - level) / trials)
        table(f"coverage of exponents at {starts} starts, scatter {scatter}", f"{covered:.3f}",
              f"{level}±{allowed:.3f}")
        assert abs(covered - level) < allowed


def test_an_exact_power_law_with_relative_noise():
    """Every start the same law with its own factor: the exponent is exact."""
    factors = 1 + 0.2 * np.random.default_rng(1).standard_normal((9, 1))
    found = power_law(X, -3.0 * factors * X**2, np.random.default_rng(2))
    assert found.exponent == pytest.approx(2.0, abs=1e-9)
    assert found.factor == pytest.approx(3.0 * factors.mean())
    assert found.error == pytest.approx(0.0, abs=1e-9)


def test_at_the_threshold_every_second_repeat_is_a_detection():
    """Signal x², scatter 10, 200 starts: the threshold lies inside the sweep. Signal and error are
    known there to some 3 %, which moves the fraction found by 0.05; 3 of them."""
    random = np.random.default_rng(3)
    found = power_law(X, X**2 + 10 * random.standard_normal((200, 4)), random, level=0.01)
    assert X[0] < found.threshold < X[-1]
    repeats = found.threshold**2 + 10 * random.standard_normal((200, 2000))
    assert np.mean(mean_and_error(repeats)[2] < 0.01) == pytest.approx(0.5, abs=0.15)


def test_no_threshold_where_noise_grows_as_fast():
    random = np.random.default_rng(3)
    growing = X * (1 + 0.1 * X * random.standard_normal((10, 4)))
    assert np.isnan(power_law(X, growing, random).threshold)


def test_few_starts_have_no_interval_and_zeros_are_refused():
    values = X + 0.1 * np.random.default_rng(5).standard_normal((5, 4))
    assert np.isnan(power_law(X, values, np.random.default_rng(1)).interval).all()
    with pytest.raises(ValueError, match="no logarithm"):
        power_law(X, np.zeros((5, 4)), np.random.default_rng(1))


def test_line_is_the_weighted_least_squares_one():
    random = np.random.default_rng(6)
    y, weights = random.standard_normal(4), random.uniform(0.5, 2, 4)
    np.testing.assert_allclose(line(X, y, weights), np.polyfit(X, y, 1, w=np.sqrt(weights)))
