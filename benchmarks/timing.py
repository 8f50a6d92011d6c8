"""Times to be compared are taken in turns, because a machine's speed drifts.

In every round each contender is called for a while; its figure is the median time of its calls,
or their mean where not every call does the same. A time is the median over the rounds, a ratio
the median of the ratios of the rounds.
"""

import contextlib
import time
from collections.abc import Callable
from dataclasses import dataclass

import numpy as np

from swirlight.compiled import numba

ROUNDS = 7


@dataclass(frozen=True)
class Contender:
    """A call to be timed on so many threads."""

    call: Callable
    threads: int = 1


@contextlib.contextmanager
def nothing_compiled():
    """Raise RuntimeError when numba compiled anything inside the block."""
    from numba.core import event

    with event.install_recorder("numba:compile") as recorder:
        yield
    if recorder.buffer:
        raise RuntimeError("something was compiled while it was timed")


def _seconds(contender, calls):
    readings = np.empty(calls + 1)
    readings[0] = time.perf_counter()
    for k in range(calls):
        contender.call()
        readings[k + 1] = time.perf_counter()
    return np.diff(readings)


def in_turns(contenders, rounds=ROUNDS, seconds=0.1, least=1, average=np.median):
    """Seconds a call of each contender in each round: {name: (rounds,)}.

    contenders : {name: Contender}.
    seconds : that each may take in a round; least : calls it makes in any case.
    average : of the calls of a round.
    """
    calls = {}
    for name, contender in contenders.items():
        numba.set_num_threads(contender.threads)
        contender.call()
        calls[name] = max(least, int(seconds / _seconds(contender, 1)[0]))
    found = {name: np.empty(rounds) for name in contenders}
    with nothing_compiled():
        for k in range(rounds):
            for name, contender in contenders.items():
                numba.set_num_threads(contender.threads)
                if calls[name] > 1:
                    contender.call()  # after others had the caches and threads were started
                found[name][k] = average(_seconds(contender, calls[name]))
    return found


def median_ms(times):
    return 1e3 * float(np.median(times))


def ratio(slow, fast):
    """Median over rounds of how many times longer the first took."""
    return float(np.median(slow / fast))
