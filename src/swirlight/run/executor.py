"""Several trajectories side by side: one single-threaded worker process per core.

Tasks are idempotent (their effect is files in the run folder, their value a small record),
because a Dask scheduler starts a task again when its worker dies. Nothing durable is kept in
the cluster: the disk is the truth.
"""

import contextlib
import os
import signal
import sys
import time

from swirlight.errors import RunError, StopRequested

PATIENCE = 60.0  # s without any worker process before the driver gives up
ONE_THREAD = {
    "NUMBA_NUM_THREADS": "1",
    "OMP_NUM_THREADS": "1",
    "OPENBLAS_NUM_THREADS": "1",
    "MKL_NUM_THREADS": "1",
    "OMP_WAIT_POLICY": "PASSIVE",
}


def side_by_side(function, tasks, cores, stop, each=lambda task, record: None,
                 tick=lambda: None, here=None):
    """Call ``function(*task)`` for every task; call ``each(task, result)`` as results arrive.

    function : importable by name; workers do not see the script that called this.

    cores : how many run at once; with one core (or one task) they run here, in order.
    here : what to call in place of `function` when they do, as it need not be picklable.
    stop : StopFile; tasks look at it themselves, the driver only when no worker is left.
    tick : called about once a second in the driver while workers are busy.
    A task that raises does not stop the others: its exception is handed to `each` as its
    result, and so is that of a task whose worker dies again and again. Raises RunError when no
    worker process can be kept alive.
    """
    if cores == 1 or len(tasks) == 1:
        for task in tasks:
            try:
                record = (here or function)(*task)
            except Exception as error:
                record = error
            each(task, record)
        return
    with _cluster(min(cores, len(tasks))) as client:
        _drive(client, function, tasks, stop, each, tick)


def _drive(client, function, tasks, stop, each, tick):
    from dask.distributed import wait

    pending = {
        client.submit(function, *task, pure=False, retries=0, priority=-i): task
        for i, task in enumerate(tasks)
    }
    seen = time.monotonic()
    while pending:
        if client.nthreads():
            seen = time.monotonic()
        elif stop.look():
            raise StopRequested(0, stop.look())
        elif time.monotonic() - seen > PATIENCE:
            raise RunError("every worker process has died and none could be started again;"
                           " what is complete is kept: see what kills them, then resume")
        try:
            done = wait(list(pending), timeout=1.0, return_when="FIRST_COMPLETED").done
        except TimeoutError:
            done = set()
        tick()
        for future in done:
            each(pending.pop(future), future.exception() or future.result())


@contextlib.contextmanager
def _cluster(workers):
    """An embedded cluster on loopback; its processes are spawned with one thread each."""
    import dask
    from dask.distributed import Client, LocalCluster

    settings = {
        "distributed.worker.daemon": True,
        "distributed.admin.tick.limit": "1h",  # a kernel may hold a worker's loop for long
        "distributed.comm.timeouts.connect": "30s",
        "distributed.scheduler.allowed-failures": 2,
        "distributed.worker.memory.terminate": False,
        "distributed.worker.memory.pause": False,
        "distributed.worker.memory.spill": False,
        "distributed.worker.memory.target": False,
        "distributed.logging": {"distributed": "error", "bokeh": "error"},
    }
    with dask.config.set(settings), _environment(ONE_THREAD), _hidden_script():
        cluster = LocalCluster(
            n_workers=workers, threads_per_worker=1, processes=True, host="127.0.0.1",
            dashboard_address="127.0.0.1:0", worker_dashboard_address="127.0.0.1:0",
            silence_logs=50, memory_limit=0,
        )
        with cluster, Client(cluster) as client:
            client.register_worker_callbacks(_ignore_interrupts)  # of later workers too
            yield client


def _ignore_interrupts():
    """Ctrl-C reaches the whole process group; only the driver may decide what it means."""
    with contextlib.suppress(ValueError):
        signal.signal(signal.SIGINT, signal.SIG_IGN)


@contextlib.contextmanager
def _hidden_script():
    """Keep spawned workers from importing the driver's script.

    They need nothing of it, and one that calls `launch` outside of ``if __name__ ==
    "__main__":`` would call it again in every worker. What multiprocessing finds the script
    by is taken from the main module meanwhile.
    """
    names = vars(sys.modules["__main__"])
    before = {name: names[name] for name in ("__file__", "__spec__") if name in names}
    names.pop("__file__", None)
    names["__spec__"] = None
    try:
        yield
    finally:
        names.update(before)


@contextlib.contextmanager
def _environment(values):
    before = {name: os.environ.get(name) for name in values}
    os.environ.update(values)
    try:
        yield
    finally:
        for name, value in before.items():
            if value is None:
                os.environ.pop(name, None)
            else:
                os.environ[name] = value
