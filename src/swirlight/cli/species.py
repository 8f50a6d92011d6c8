"""`swirlight species`."""

import json
import pathlib
from typing import Annotated

import typer


def species(
    name: Annotated[
        str | None,
        typer.Argument(help="A library name or a species file; left out: list the library."),
    ] = None,
    as_json: Annotated[bool, typer.Option("--json", help="For programs.")] = False,
    picture: Annotated[
        pathlib.Path | None, typer.Option(help="Draw the body to this file (.png, .svg, .pdf).")
    ] = None,
):
    """List the library, or show one body: mass, inertia, body frame, dipole, response, source.

    Example: swirlight species acetonitrile --picture acetonitrile.png
    """
    from swirlight.cli.picture import picture_path
    from swirlight.errors import InputError
    from swirlight.species.describe import describe, library_text, species_text
    from swirlight.species.library import library_names, load_species

    if name is None:
        if picture is not None:
            raise InputError("--picture needs a species, for example swirlight species water"
                             " --picture water.png")
        listed = [load_species(known) for known in library_names()]
        typer.echo(json.dumps([describe(s) for s in listed], indent=2) if as_json
                   else library_text(listed))
        return
    found = load_species(name)
    if picture is not None:
        from swirlight.species.picture import draw_species

        draw_species(found, picture_path(picture))
        typer.echo(f"picture: {picture}", err=True)
    typer.echo(json.dumps(describe(found), indent=2) if as_json else species_text(found))
