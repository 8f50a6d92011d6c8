"""`swirlight status`."""

import json
import pathlib
from typing import Annotated

import typer


def status(
    folder: Annotated[pathlib.Path, typer.Argument(help="A run folder.")],
    as_json: Annotated[bool, typer.Option("--json", help="For programs.")] = False,
):
    """Say what is done, how fast it goes, what is left and what failed; also while it runs.

    Example: swirlight status runs/first
    """
    from swirlight.run.status import read_status, status_text

    found = read_status(folder)
    typer.echo(json.dumps(found, indent=2) if as_json else status_text(found))
