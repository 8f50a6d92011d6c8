"""Tasks side by side: order, failures, and workers that die."""

import os

import pytest

from swirlight.run import executor
from swirlight.run.executor import side_by_side
from swirlight.run.stop import StopFile


def square(x):
    return x * x


def fail_at_two(x):
    if x == 2:
        raise ValueError("two")
    return x


def die_at_two(x):
    if x == 2:
        os._exit(1)
    return x


def threads(_):
    import numba

    return numba.config.NUMBA_NUM_THREADS, os.environ["OMP_NUM_THREADS"]


@pytest.fixture
def stop(tmp_path):
    return StopFile(tmp_path / "stop")


def gather(function, tasks, cores, stop):
    found = []
    side_by_side(function, [(t,) for t in tasks], cores, stop, found.append)
    return found


@pytest.mark.parametrize("cores", [1, 2])
def test_every_task_once_and_a_failure_stops_nobody(cores, stop):
    assert sorted(gather(square, range(5), cores, stop)) == [0, 1, 4, 9, 16]
    found = gather(fail_at_two, range(4), cores, stop)
    assert sorted(x for x in found if isinstance(x, int)) == [0, 1, 3]
    assert [str(x) for x in found if isinstance(x, Exception)] == ["two"]


def test_a_worker_that_dies_costs_its_task_alone(stop):
    found = gather(die_at_two, range(4), 2, stop)
    assert sorted(x for x in found if isinstance(x, int)) == [0, 1, 3]
    assert sum(isinstance(x, Exception) for x in found) == 1


def test_workers_have_one_thread_and_the_driver_keeps_its_own(stop):
    before = os.environ.get("OMP_NUM_THREADS")
    assert gather(threads, range(2), 2, stop) == [(1, "1")] * 2
    assert os.environ.get("OMP_NUM_THREADS") == before


def test_without_any_worker_the_driver_gives_up(stop, monkeypatch):
    from swirlight.errors import RunError, StopRequested

    class Client:
        def submit(self, *_, **__):
            return object()

        def scheduler_info(self, **_):
            return {"workers": {}}

    def nothing_yet(*_, **__):
        raise TimeoutError

    monkeypatch.setattr("dask.distributed.wait", nothing_yet)
    monkeypatch.setattr(executor, "PATIENCE", 0.0)
    with pytest.raises(RunError, match="worker process"):
        executor._drive(Client(), square, [(1,)], stop, print, lambda: None)
    stop.ask(15)
    with pytest.raises(StopRequested):
        executor._drive(Client(), square, [(1,)], stop, print, lambda: None)
