"""The few exceptions that users see.

Each keeps its fields as positional arguments, so that it survives pickling:
worker processes hand their exceptions back to the driver.
"""


class SwirlightError(Exception):
    """Base of everything this package raises on purpose; exit code 1."""


class InputError(SwirlightError):
    """Something the user wrote cannot be used; exit code 2, nothing was written."""


class ConfigError(InputError):
    """One or more places of a YAML file that cannot be used.

    lines : the messages, each ``FILE:LINE:COL: key: what was given, what is expected``.
    """

    def __init__(self, lines):
        self.lines = (lines,) if isinstance(lines, str) else tuple(lines)
        super().__init__(self.lines)

    def __str__(self):
        return "\n".join(self.lines)


class RunError(SwirlightError):
    """The work itself failed (a trajectory blew up, a disk ran full); exit code 1."""


class StopRequested(SwirlightError):
    """Ctrl-C or SIGTERM arrived; everything up to `step` has been saved.

    signal : the signal's number; the exit code is 128 + signal.
    """

    def __init__(self, step, signal):
        self.step, self.signal = step, signal
        super().__init__(step, signal)
