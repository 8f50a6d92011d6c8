import pytest

from tests.reference.pairs import PlainPairs


@pytest.fixture
def plain_pairs(monkeypatch):
    """Force fields take their pairs from the slow twin: nothing to compile, nothing shared."""
    monkeypatch.setattr("swirlight.forces.field.PairForces", PlainPairs)
