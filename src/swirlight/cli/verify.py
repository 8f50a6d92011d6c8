"""`swirlight verify`."""

import json
import pathlib
from typing import Annotated

import typer


def verify(
    path: Annotated[pathlib.Path, typer.Argument(help="A run folder, a trajectory, a start file.")],
    as_json: Annotated[bool, typer.Option("--json", help="Print the findings as JSON.")] = False,
):
    """Hold our files against the rules of the format; exit 1 if any is broken.

    Every number is read, so that damage on the disk is found.

    Example: swirlight verify runs/first
    """
    from swirlight.store.verify import verify as work

    found = work(path)
    if as_json:
        typer.echo(json.dumps({"path": str(path), "problems": found}, indent=2))
    else:
        typer.echo("\n".join(found) if found else f"{path}: every rule holds")
    if found:
        raise typer.Exit(1)
