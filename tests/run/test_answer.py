"""What a run says of its odd and even parts."""

from swirlight.analysis.statistics import mean_and_error, starts_needed
from swirlight.run.answer import DETECTED, verdict


def figures(values):
    mean, error, p = mean_and_error(values)
    needed = starts_needed(float(mean), float(error) * len(values) ** 0.5)
    return {"value": float(mean), "error": float(error), "p": float(p), "starts": len(values),
            "starts_needed": needed}


def test_verdicts():
    assert verdict(figures([1.0])).startswith("one start only")
    assert verdict(figures([0.0, 0.0])) == "no response: the twins are identical"
    assert verdict(figures([1.0, 1.01, 0.99, 1.0])) == DETECTED
    assert verdict(figures([1.0, 0.6, 0.2, 1.1])).startswith("a hint; if it is this large, some ")
    assert verdict(figures([1.0, -1.0, 0.01, 0.0])) == "not told from zero"
    assert verdict(figures([float("nan"), float("nan")])) == "not defined"  # alignment of atoms
