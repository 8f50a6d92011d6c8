"""`swirlight schema`."""

import json
from typing import Annotated

import typer


def schema(
    of: Annotated[str, typer.Argument(help="config, species or summary.")] = "config",
):
    """Print a JSON Schema, for editors and programs.

    Example: swirlight schema config > swirlight.schema.json
    """
    from swirlight.errors import InputError

    if of == "config":
        from swirlight.config import config_schema as make
    elif of == "species":
        from swirlight.species.file import species_schema as make
    elif of == "summary":
        from swirlight.run.summary import summary_schema as make
    else:
        raise InputError(f"schema: no schema of {of!r}; expected config, species or summary")
    typer.echo(json.dumps(make(), indent=2))
