"""`swirlight check`."""

import pathlib
from typing import Annotated

import typer

from swirlight.cli.launch import Set


def check(
    config: Annotated[pathlib.Path, typer.Argument(help="A launch config (YAML).")],
    set_: Set = [],  # noqa: B006 (typer reads the default, nobody changes it)
    as_json: Annotated[bool, typer.Option("--json", help="For programs.")] = False,
):
    """Validate a config and say what the run will be: figures, limits, warnings, cost.

    Nothing is run and nothing is written.

    Example: swirlight check configs/first-light.yaml --set light[0].peak_intensity="2e10 W/cm^2"
    """
    from swirlight.config import load_config
    from swirlight.run.plan import check_config

    plan = check_config(load_config(config, set_))
    typer.echo(plan.to_json() if as_json else str(plan))
