"""What a run will cost: bytes counted against the real tables, steps and time by hand."""

import math

import numpy as np
import pytest

from swirlight.observe.totals import TOTALS
from swirlight.observe.vectors import VECTORS, chosen
from swirlight.run.plan import cost as plan_cost
from swirlight.run.plan import examine
from swirlight.run.rates import expected_rate, record_rate, workload
from tests.run.plans import DARK, config, plan, value


@pytest.fixture(autouse=True)
def own_cache(tmp_path, monkeypatch):
    monkeypatch.setenv("XDG_CACHE_HOME", str(tmp_path))


def test_counts_are_those_of_what_is_recorded():
    for name, vector in VECTORS.items():
        if name != "image":
            assert plan_cost.COMPONENTS.get(name, 3) == math.prod(vector.shape), name
    assert [v.name for v in chosen(("position",))] == ["position", "image"]
    numbers = lambda lit: sum(  # noqa: E731
        math.prod(t.shape) for t in TOTALS.values() if lit or not t.lit)
    assert (plan_cost.TOTALS_DARK, plan_cost.TOTALS_LIT) == (numbers(False), numbers(True))


def test_disk_of_a_trajectory():
    subject = examine(config("record.vectors=[torque, orientation, axes, position]",
                             "record.totals_every=40 fs"))
    vectors = 201 * 108 * (4 * (3 + 4 + 9 + 3) + 4 * 3)
    totals = 101 * 8 * plan_cost.TOTALS_LIT
    assert plan_cost.disk_bytes(subject)["trajectory"] == vectors + totals
    double = examine(config("record.precision=double", "record.vectors=[torque]"))
    assert plan_cost.disk_bytes(double)["trajectory"] == 201 * (
        108 * 24 + 8 * plan_cost.TOTALS_LIT)


def test_disk_of_everything():
    found = plan()
    subject = examine(config())
    quiet = 10.0 + 3 * 2.0
    preparation = (round(quiet / 0.02) + 1) * 8 * plan_cost.TOTALS_DARK + 4 * 108 * 13 * 8
    disk = plan_cost.disk_bytes(subject)
    assert disk["preparation"] == preparation
    assert value(found, "disk in all") == pytest.approx(
        (12 * disk["trajectory"] + preparation) / 2**20)


def test_steps_and_time(monkeypatch):
    monkeypatch.setattr(plan_cost, "core_count", lambda: 2)
    found = plan()
    assert value(found, "steps of preparation") == 5000 + 3 * 1000
    assert value(found, "steps of a trajectory") == 2000
    assert value(found, "steps in all") == 8000 + 12 * 2000
    alone, beside = value(found, "rate on 2 threads"), value(found, "rate on 1 thread")
    assert alone > beside
    seconds = 8000 / alone + 6 * 2000 / beside
    assert value(found, "time") == pytest.approx(seconds / 60)
    assert "from a table" in found.find("rate on 1 thread")[0].note


def test_measured_rates_win_and_are_named(monkeypatch):
    monkeypatch.setattr(plan_cost, "core_count", lambda: 2)
    subject = examine(config())
    for threads, rate in ((1, 1000.0), (2, 1500.0)):
        record_rate(workload(subject.system, subject.box, threads), rate)
    found = plan()
    assert value(found, "rate on 1 thread") == 1000.0
    assert "measured on this machine for this system" in found.find("rate on 1 thread")[0].note
    assert value(found, "time") == pytest.approx((8000 / 1500 + 6 * 2000 / 1000) / 60)


def test_one_trajectory_uses_all_cores(monkeypatch):
    monkeypatch.setattr(plan_cost, "core_count", lambda: 4)
    found = plan(text=DARK)
    assert value(found, "processes side by side") == 1
    assert found.find("rate on 4 threads") and not found.find("rate on 1 thread")


def test_open_spacing_is_said():
    found = plan("exposures={kinds: [plus, minus], starts: 4}")
    assert value(found, "steps of preparation") == 5000
    assert "without the spacing" in found.find("steps of preparation")[0].note
    assert value(found, "spacing") == "chosen while equilibrating"


def test_memory_grows_with_the_sample():
    small = plan_cost.memory_bytes(examine(config()))
    large = plan_cost.memory_bytes(examine(config("sample.species[0].count=10800")))
    assert plan_cost.PROCESS_BYTES < small < large
    # sites and bodies, and a hundred times the pairs and mesh points
    assert large - plan_cost.PROCESS_BYTES > 20 * (
        small - plan_cost.PROCESS_BYTES - plan_cost.SEGMENT_BYTES)


def test_free_space_looks_at_what_exists(tmp_path):
    assert plan_cost.free_bytes(tmp_path / "not" / "there") == pytest.approx(
        plan_cost.free_bytes(tmp_path), rel=0.1)


def test_rate_of_a_box_depends_on_what_it_should():
    subject = examine(config())
    base = workload(subject.system, subject.box)
    assert workload(subject.system, subject.box) == base
    for change in ("forces.cutoff=0.9 nm", "forces.precision=double",
                   "forces.electrostatics=direct-ewald", "sample.species[0].count=200"):
        other = examine(config(change))
        assert workload(other.system, other.box).key != base.key, change
    for change in ("forces.electrostatics=none", "forces.mesh_every=2"):
        faster = examine(config(change))
        assert workload(faster.system, faster.box).table > base.table
        assert workload(faster.system, faster.box).key != base.key
    assert workload(subject.system, subject.box, threads=2).table > base.table


def test_expected_rate_of_nothing_measured_is_the_table():
    subject = examine(config())
    load = workload(subject.system, subject.box)
    assert expected_rate(load).steps_per_second == load.table
    assert np.isfinite(load.table)
