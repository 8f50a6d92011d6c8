"""`swirlight convert`."""

import enum
import pathlib
from typing import Annotated

import typer


class Format(enum.StrEnum):
    """What other tools read."""

    xyz = "xyz"
    csv = "csv"
    npz = "npz"


def convert(
    run: Annotated[pathlib.Path, typer.Argument(help="A run folder, or one trajectory file.")],
    to: Annotated[Format, typer.Option("--to", help="xyz: sites; csv: tables; npz: arrays.")],
    into: Annotated[
        pathlib.Path | None,
        typer.Option(help="Folder to write to; left out: one named after the format, in the run."),
    ] = None,
    only: Annotated[
        str | None,
        typer.Option(metavar="NAME[,NAME]", help="Only these quantities (csv and npz)."),
    ] = None,
):
    """Leave for other tools: write trajectories as plain text or NumPy files.

    Example: swirlight convert runs/first --to csv --only angular_momentum,temperature
    """
    from swirlight.store.convert import convert as work

    names = [name.strip() for name in only.split(",")] if only else []
    for path in work(run, to.value, into=into, only=names):
        typer.echo(path)
