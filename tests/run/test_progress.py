"""Progress: whole lines in logs, a reason for a late first step, a terminal left as it was."""

import io
import time

from swirlight.run import progress


class Terminal(io.StringIO):
    """Text that counts as a terminal."""

    def isatty(self):
        return True


def test_logs_get_whole_lines_without_control_characters():
    stream = io.StringIO()
    display = progress.choose(stream=stream)
    display.phase("expose", 100)
    display.update(50, temperature=300.0)
    display.finish()
    lines = stream.getvalue().splitlines()
    assert lines[0] == "expose: 100 steps" and lines[-1].startswith("expose: 100 %")
    assert stream.getvalue().isprintable() or "\x1b" not in stream.getvalue()


def test_a_late_first_step_is_explained_once_and_only_then(monkeypatch):
    monkeypatch.setattr(progress, "PATIENCE", 0.05)
    stream = io.StringIO()
    display = progress.PlainLines(stream)
    display.phase("equilibrate", 100)
    time.sleep(0.3)
    display.update(1)
    assert stream.getvalue().count("compiling") == 1
    display.phase("expose", 100)
    display.update(1)
    time.sleep(0.3)
    assert stream.getvalue().count("compiling") == 1


def test_leaving_early_gives_the_terminal_its_cursor_back(monkeypatch):
    monkeypatch.setenv("TERM", "xterm")
    stream = Terminal()
    display = progress.choose(stream=stream)
    display.phase("equilibrate", 100)
    display.update(10)
    display.leave()
    text = stream.getvalue()
    assert "\x1b[?25l" in text and text.rfind("\x1b[?25h") > text.rfind("\x1b[?25l")
