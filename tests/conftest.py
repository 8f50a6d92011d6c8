"""What all tests share: the table that slow tests fill, printed at the end."""

import pytest
from hypothesis import settings

# The same cases at every run: a failure is a failure for everyone.
settings.register_profile("fixed", derandomize=True)
settings.load_profile("fixed")

_rows = []


@pytest.fixture
def table():
    """Add a row to the closing table: what was measured, the figure, what is asked for."""
    return lambda what, figure, wanted: _rows.append((what, str(figure), str(wanted)))


def pytest_terminal_summary(terminalreporter):
    if not _rows:
        return
    terminalreporter.section("figures")
    widths = [max(len(row[k]) for row in _rows) for k in range(3)]
    for row in _rows:
        terminalreporter.write_line("  ".join(c.ljust(w) for c, w in zip(row, widths, strict=True)))
