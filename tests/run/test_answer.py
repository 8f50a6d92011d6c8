"""What a run says of its odd and even parts."""

import numpy as np
import pytest

from swirlight.run.estimate import mean_and_error
from swirlight.run.response import CLEAR, DETECTED, starts_needed, verdict


def figures(values):
    mean, error, p = mean_and_error(values)
    return {"value": float(mean), "error": float(error), "p": float(p), "starts": len(values)}


def test_verdicts():
    assert verdict(figures([1.0])).startswith("one start only")
    assert verdict(figures([0.0, 0.0])) == "no response: the twins are identical"
    assert verdict(figures([1.0, 1.01, 0.99, 1.0])) == DETECTED
    assert verdict(figures([1.0, 0.6, 0.2, 1.1])).startswith("a hint; if it is this large, some ")
    assert verdict(figures([1.0, -1.0, 0.01, 0.0])) == "not told from zero"


@pytest.mark.parametrize("values", [[1.0, 0.5, 0.0, 1.2], [1.0, -0.2, 0.4]])
def test_starts_needed_would_tell(values):
    found = figures(values)
    needed = starts_needed(found)
    assert needed > len(values)
    # the same mean and scatter from that many starts
    rest = np.array(values) - np.mean(values)
    many = np.resize(rest, needed * len(values)) * np.sqrt((needed - 1) / needed)
    many = many[:needed] - many[:needed].mean()
    many *= found["error"] * np.sqrt(len(values)) / many.std(ddof=1)
    assert figures(found["value"] + many)["p"] < CLEAR * 1.0001
