"""Tasks side by side: order, failures, and workers that die."""

import os
import subprocess
import sys

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
    side_by_side(function, [(t,) for t in tasks], cores, stop,
                 lambda task, record: found.append((task[0], record)))
    return found


@pytest.mark.parametrize("cores", [1, 2])
def test_every_task_once_and_a_failure_stops_nobody(cores, stop):
    assert sorted(gather(square, range(5), cores, stop)) == [(x, x * x) for x in range(5)]
    found = dict(gather(fail_at_two, range(4), cores, stop))
    assert str(found.pop(2)) == "two"
    assert found == {0: 0, 1: 1, 3: 3}


def test_a_worker_that_dies_costs_its_task_alone(stop):
    found = dict(gather(die_at_two, range(4), 2, stop))
    assert isinstance(found.pop(2), Exception)
    assert found == {0: 0, 1: 1, 3: 3}


def test_workers_have_one_thread_and_the_driver_keeps_its_own(stop):
    before = os.environ.get("OMP_NUM_THREADS")
    assert sorted(gather(threads, range(2), 2, stop)) == [(0, (1, "1")), (1, (1, "1"))]
    assert os.environ.get("OMP_NUM_THREADS") == before


UNGUARDED = """
from swirlight.run.executor import side_by_side
from swirlight.run.stop import StopFile

print("the script runs", flush=True)
side_by_side(divmod, [(7, 4), (9, 4)], 2, StopFile("stop"), print)
print(__file__)
"""


def test_a_script_without_a_guard_runs_once(tmp_path):
    """Workers that imported it would start clusters of their own."""
    script = tmp_path / "script.py"
    script.write_text(UNGUARDED)
    done = subprocess.run([sys.executable, script], cwd=tmp_path, capture_output=True, text=True,
                          timeout=100)
    assert done.returncode == 0, done.stderr
    first, *results, last = done.stdout.splitlines()
    assert first == "the script runs" and last == str(script)
    assert sorted(results) == ["(7, 4) (1, 3)", "(9, 4) (2, 1)"]


def test_without_any_worker_the_driver_gives_up(stop, monkeypatch):
    from swirlight.errors import RunError, StopRequested

    class Client:
        def submit(self, *_, **__):
            return object()

        def nthreads(self):
            return {}

    def nothing_yet(*_, **__):
        raise TimeoutError

    monkeypatch.setattr("dask.distributed.wait", nothing_yet)
    monkeypatch.setattr(executor, "PATIENCE", 0.0)
    with pytest.raises(RunError, match="worker process"):
        executor._drive(Client(), square, [(1,)], stop, print, lambda: None)
    stop.ask(15)
    with pytest.raises(StopRequested):
        executor._drive(Client(), square, [(1,)], stop, print, lambda: None)
