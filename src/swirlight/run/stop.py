"""Ctrl-C and SIGTERM: noticed between steps, in the driver and in every worker process.

The driver's handler leaves the signal's number in a small file of the run folder; whoever
moves bodies looks at it a few times a second, saves a checkpoint and returns. Looking by the
clock cannot change results: a checkpoint may be taken at any step.
"""

import os
import signal
import threading
import time

LOOK_EVERY = 0.2  # s


class StopFile:
    """Whether a stop was asked for; picklable, so that workers can carry it."""

    def __init__(self, path):
        self.path = os.fspath(path)
        self._looked = 0.0

    def requested(self):
        """The signal's number, or 0; looks at the disk at most every `LOOK_EVERY` seconds."""
        now = time.monotonic()
        if now - self._looked < LOOK_EVERY:
            return 0
        self._looked = now
        return self.look()

    def look(self):
        """The signal's number, or 0, straight from the disk."""
        try:
            with open(self.path) as file:
                return int(file.read() or signal.SIGTERM)
        except (FileNotFoundError, ValueError):
            return 0

    def ask(self, number):
        """Ask everyone to stop."""
        with open(self.path, "w") as file:
            file.write(str(int(number)))

    def clear(self):
        """Forget an earlier request."""
        try:
            os.remove(self.path)
        except FileNotFoundError:
            pass


class Signals:
    """While inside, SIGINT and SIGTERM ask for a stop; a second SIGINT interrupts at once.

    Outside the main thread no handler can be set: the block then runs without one.
    """

    def __init__(self, stop):
        self.stop, self._before = stop, {}

    def __enter__(self):
        if threading.current_thread() is threading.main_thread():
            for number in (signal.SIGINT, signal.SIGTERM):
                self._before[number] = signal.signal(number, self._handle)
        return self

    def __exit__(self, *_):
        for number, handler in self._before.items():
            signal.signal(number, handler)

    def _handle(self, number, frame):
        if self.stop.look() and number == signal.SIGINT:
            raise KeyboardInterrupt
        self.stop.ask(number)
