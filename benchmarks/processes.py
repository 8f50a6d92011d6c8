"""Two trajectories side by side, each a process with one thread, against one alone.

    python processes.py       such a process: a rate [steps/s] for each line it is sent
"""

import os
import subprocess
import sys
import time

import numpy as np
from timing import nothing_compiled

from swirlight.run.executor import ONE_THREAD

BODIES, SECONDS = 256, 1.5
HEAD = ("bodies", "steps/s alone", "each of two", "both over one")
NOTE = f"""\
{BODIES} acetonitrile with mesh Ewald, {SECONDS:g} s at a time, one and two processes in turns."""


class Worker:
    """A process that follows a trajectory of its own."""

    def __init__(self):
        self.process = subprocess.Popen(
            [sys.executable, __file__], stdin=subprocess.PIPE, stdout=subprocess.PIPE, text=True,
            env=os.environ | ONE_THREAD)
        self.answer()  # the first comes when it is ready

    def go(self):
        self.process.stdin.write("go\n")
        self.process.stdin.flush()

    def answer(self):
        return float(self.process.stdout.readline())

    def end(self):
        self.process.stdin.close()
        self.process.wait()


def rows(rounds):
    """The one row of the table."""
    workers = [Worker(), Worker()]
    alone, each = np.empty(rounds), np.empty((rounds, 2))
    for k in range(rounds):
        one = workers[k % 2]
        one.go()
        alone[k] = one.answer()
        for worker in workers:
            worker.go()
        each[k] = [worker.answer() for worker in workers]
    for worker in workers:
        worker.end()
    yield [BODIES, f"{np.median(alone):.0f}", f"{np.median(each):.0f}",
           f"{np.median(each.sum(axis=1) / alone):.2f}"]


def main():
    from starts import liquid
    from steps import Trajectory
    from systems import CUTOFF, as_in_a_run

    trajectory = Trajectory(as_in_a_run("acetonitrile", BODIES),
                            liquid("acetonitrile", BODIES, CUTOFF)).settled()
    print(0.0, flush=True)
    for _ in sys.stdin:
        steps, start = 0, time.perf_counter()
        with nothing_compiled():
            while (passed := time.perf_counter() - start) < SECONDS:
                trajectory()
                steps += 1
        print(steps / passed, flush=True)


if __name__ == "__main__":
    main()
