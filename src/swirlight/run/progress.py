"""Progress for people: one live line on a terminal, whole plain lines anywhere else.

Everything goes to stderr. A plain line appears per 10 % or 30 s, whichever is later, and at
the end of a phase, after its files are closed.
"""

import sys
import threading
import time

PATIENCE = 3.0  # s without a first step before the reason is told
STARTING = ("no step yet: starting up, and compiling if this kind of sample is new on this machine"
            " (once, up to a minute or two)")


class Silent:
    """The progress of `launch(..., progress=False)`."""

    def phase(self, name, total):
        """A new phase of `total` steps begins."""

    def update(self, done, **facts):
        """`done` steps of the phase are finished; facts: temperature, residual, what."""

    def finish(self):
        """The phase is over and its files are closed."""

    def say(self, text):
        """One line that stays."""

    def leave(self):
        """The work is over, or has been interrupted."""


class PlainLines(Silent):
    """Lines for logs; no control characters."""

    def __init__(self, stream=None):
        self.stream = stream or sys.stderr
        self._started, self._waiting = False, threading.Timer(PATIENCE, self.say)
        self._begin("", 0)

    def phase(self, name, total):
        self._begin(name, total)
        self.say(f"{name}: {total} steps")
        self._expect_compilation()

    def update(self, done, **facts):
        now = time.monotonic()
        self._first = self._first or (now, done)
        self._waiting.cancel()
        if done < self._said + 0.1 * self._total or now < self._said_at + 30.0:
            return
        self._said, self._said_at = done, now
        self.say(f"{self._name}: " + _line(done, self._total, self._pace(done, now), facts))

    def finish(self):
        self.leave()
        self.say(f"{self._name}: 100 %, {time.monotonic() - self._began:.1f} s")

    def say(self, text):
        print(text, file=self.stream, flush=True)

    def leave(self):
        self._waiting.cancel()

    def _expect_compilation(self):
        """No silent pause: say what takes so long when the first step does not come."""
        if not self._started:  # later phases find everything compiled
            self._started = True
            self._waiting = threading.Timer(PATIENCE, self.say, [STARTING])
            self._waiting.daemon = True
            self._waiting.start()

    def _begin(self, name, total):
        self._name, self._total, self._said, self._first = name, total, 0, None
        self._began = self._said_at = time.monotonic()

    def _pace(self, done, now):
        then, before = self._first
        return (done - before) / (now - then) if now > then else 0.0


class LiveLine(PlainLines):
    """A bar that redraws itself, for terminals."""

    def __init__(self, stream=None):
        from rich.console import Console
        from rich.progress import BarColumn, Progress, TextColumn

        super().__init__(stream)
        self._bar = Progress(
            TextColumn("{task.description}"), BarColumn(bar_width=30),
            TextColumn("{task.fields[line]}"),
            console=Console(file=self.stream), transient=True,
        )
        self._task = None

    def phase(self, name, total):
        self._begin(name, total)
        self._bar.start()
        self._task = self._bar.add_task(name, total=total, line="")
        self._expect_compilation()

    def update(self, done, **facts):
        now = time.monotonic()
        self._first = self._first or (now, done)
        self._waiting.cancel()
        line = _line(done, self._total, self._pace(done, now), facts)
        self._bar.update(self._task, completed=done, line=line)

    def finish(self):
        super().finish()
        self._bar.remove_task(self._task)

    def leave(self):
        super().leave()
        self._bar.stop()  # gives the terminal its cursor back

    def say(self, text):
        self._bar.console.print(text, highlight=False, markup=False)


def choose(wanted=True, stream=None):
    """The progress that suits where stderr goes; Silent when not `wanted`."""
    if not wanted:
        return Silent()
    stream = stream or sys.stderr
    return LiveLine(stream) if stream.isatty() else PlainLines(stream)


def _line(done, total, pace, facts):
    parts = [f"{100 * done / max(total, 1):.0f} %"]
    if pace > 0:
        parts += [f"{pace:.0f} steps/s", f"{_clock((total - done) / pace)} left"]
    if facts.get("temperature") is not None:
        parts.append(f"{facts['temperature']:.0f} K")
    if facts.get("residual") is not None:
        parts.append(f"energy residual {facts['residual']:.1e} kJ/mol a body")
    if facts.get("what"):
        parts.append(facts["what"])
    return ", ".join(parts)


def _clock(seconds):
    minutes, seconds = divmod(int(round(seconds)), 60)
    hours, minutes = divmod(minutes, 60)
    if hours:
        return f"{hours} h {minutes:02d} min"
    return f"{minutes} min {seconds:02d} s" if minutes else f"{seconds} s"
