"""`swirlight launch` and `swirlight resume`."""

import pathlib
from typing import Annotated

import typer

Set = Annotated[
    list[str],
    typer.Option("--set", metavar="KEY=VALUE",
                 help='Override one key, e.g. light[0].duration="2 ps".'),
]
Threads = Annotated[
    int | None,
    typer.Option("--threads", min=1, help="Cores to use at most; all of them if left out."),
]


def launch(
    config: Annotated[pathlib.Path, typer.Argument(help="A launch config (YAML).")],
    into: Annotated[
        pathlib.Path | None, typer.Option(help="Run folder; wins over the config's `output`.")
    ] = None,
    set_: Set = [],  # noqa: B006 (typer reads the default, nobody changes it)
    threads: Threads = None,
    quiet: Annotated[bool, typer.Option("--quiet", help="No progress.")] = False,
):
    """Run a config: equilibrate, collect starts, expose, and say what the results are.

    Example: swirlight launch configs/first-light.yaml --into runs/first
    """
    from swirlight.config import load_config
    from swirlight.run.launch import launch as work

    _report(work(load_config(config, set_), into=into, progress=not quiet, threads=threads))


def resume(
    folder: Annotated[pathlib.Path, typer.Argument(help="A run folder.")],
    threads: Threads = None,
    quiet: Annotated[bool, typer.Option("--quiet", help="No progress.")] = False,
):
    """Go on after an interruption, bit for bit as if it had not happened.

    Example: swirlight resume runs/first
    """
    from swirlight.run.launch import resume as work

    _report(work(folder, progress=not quiet, threads=threads))


def _report(run):
    from swirlight.run.answer import answer

    typer.echo(answer(run.path))
