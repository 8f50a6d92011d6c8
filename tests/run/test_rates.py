"""Measured rates, kept from run to run."""

import json

import pytest

from swirlight.run import rates
from swirlight.run.rates import Workload, expected_rate, record_rate


@pytest.fixture(autouse=True)
def own_cache(tmp_path, monkeypatch):
    monkeypatch.setenv("XDG_CACHE_HOME", str(tmp_path))


WATER, ARGON = Workload("water", 100.0), Workload("argon", 1000.0)


def test_last_measurement_wins():
    record_rate(WATER, 80.0)
    record_rate(WATER, 90.0)
    found = expected_rate(WATER)
    assert found.steps_per_second == 90.0
    assert found.source == "measured on this machine for this system"


def test_other_systems_are_scaled_by_the_last_one_measured():
    record_rate(ARGON, 500.0)
    record_rate(WATER, 80.0)
    found = expected_rate(Workload("new", 10.0))
    assert found.steps_per_second == pytest.approx(8.0)
    assert "scaled" in found.source
    record_rate(ARGON, 500.0)  # measured again: now the last
    assert expected_rate(Workload("new", 10.0)).steps_per_second == pytest.approx(5.0)


def test_nothing_measured():
    found = expected_rate(WATER)
    assert found.steps_per_second == 100.0 and "table" in found.source


@pytest.mark.parametrize("rate", [0.0, -1.0, float("nan"), float("inf")])
def test_senseless_rates_are_not_kept(rate):
    record_rate(WATER, rate)
    assert not rates.rates_file().exists()


@pytest.mark.parametrize("text", [
    "", "{", "[]", '{"water": 3}', '{"water": {"steps_per_second": "fast", "table": 1.0}}',
    '{"water": {"steps_per_second": -1.0, "table": 1.0}}', '{"water": {"steps_per_second": 5.0}}'])
def test_damaged_files_are_as_if_never_measured(text):
    rates.rates_file().parent.mkdir(parents=True)
    rates.rates_file().write_text(text)
    assert "table" in expected_rate(WATER).source
    record_rate(WATER, 80.0)
    assert expected_rate(WATER).steps_per_second == 80.0


def test_the_oldest_go_first(monkeypatch):
    monkeypatch.setattr(rates, "MOST", 3)
    for n in range(5):
        record_rate(Workload(f"system {n}", 100.0), 50.0)
    assert list(json.loads(rates.rates_file().read_text())) == ["system 2", "system 3", "system 4"]


def test_a_cache_that_cannot_be_written_is_no_error(tmp_path, monkeypatch):
    (tmp_path / "file").write_text("")
    monkeypatch.setenv("XDG_CACHE_HOME", str(tmp_path / "file"))
    record_rate(WATER, 80.0)
    assert "table" in expected_rate(WATER).source
