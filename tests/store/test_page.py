"""The page on the file format names everything that can be in a file, with its unit."""

import importlib.resources

from swirlight.observe.totals import TOTALS
from swirlight.observe.vectors import VECTORS


def test_the_page_lists_every_vector_and_total():
    page = importlib.resources.files("swirlight").joinpath("docs/file-format.md")
    rows = [line for line in page.read_text(encoding="utf-8").splitlines() if line.startswith("|")]
    for item in (*VECTORS.values(), *TOTALS.values()):
        found = [row for row in rows if f"`{item.name}`" in row]
        assert found, f"{item.name} is not on the page"
        if item.unit is not None:
            assert any(f"`{item.unit}`" in row for row in found), f"{item.name}: {item.unit}"
