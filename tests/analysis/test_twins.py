"""Even and odd parts, and the gain of pairing."""

import numpy as np
import pytest

from swirlight.analysis.twins import even_odd, pairing_gain


def test_parts():
    even, odd = even_odd([3.0, 4.0], [1.0, 0.0], [0.5, 1.0])
    assert even.tolist() == [1.5, 1.0] and odd.tolist() == [1.0, 2.0]
    assert even_odd([1.0], [2.0])[0] is None


def test_gain_of_shared_noise_and_of_none():
    """Correlation c of twins gives 1/(1 − c); 20000 starts know a variance to 1 %: 4 sigma."""
    random, n = np.random.default_rng(3), 20000
    shared, one, two = random.standard_normal((3, n, 2))
    c = np.array([0.9, 0.0])
    pair = [np.sqrt(c) * shared + np.sqrt(1 - c) * own for own in (one, two)]
    np.testing.assert_allclose(pairing_gain(*pair), 1 / (1 - c), rtol=4 * np.sqrt(2) * 0.01)


@pytest.mark.filterwarnings("error")
def test_gain_at_the_ends():
    assert pairing_gain([1.0, 2.0, 4.0], [0.0, 1.0, 3.0]) == np.inf
    assert np.isnan(pairing_gain([1.0, 1.0], [2.0, 2.0])) and np.isnan(pairing_gain([1.0], [2.0]))
