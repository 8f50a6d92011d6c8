"""`swirlight response`."""

import json
import pathlib
from typing import Annotated

import typer


def response(
    folder: Annotated[pathlib.Path, typer.Argument(help="A run folder.")],
    of: Annotated[
        str | None, typer.Option(metavar="NAME", help="One observable; left out: all of them.")
    ] = None,
    level: Annotated[
        float, typer.Option(min=1e-9, max=0.5, help="p for which starts are planned.")
    ] = 0.001,
    linear: Annotated[
        bool,
        typer.Option("--linear", help="Beside the limit of weak light, told from the dark runs."),
    ] = False,
    as_json: Annotated[bool, typer.Option("--json", help="For programs.")] = False,
    picture: Annotated[
        pathlib.Path | None,
        typer.Option(help="Where the picture goes; left out: response-NAME.png in the folder."),
    ] = None,
):
    """Say whether the pulse turns the molecules, how surely, and which signal shows it.

    Example: swirlight response runs/first --of angular_momentum
    """
    from swirlight.cli.picture import picture_path
    from swirlight.results.observables import find_observable
    from swirlight.results.overview import TURNING, overview
    from swirlight.run.picture import draw_response, envelope
    from swirlight.run.response_text import response_text
    from swirlight.store.durable import plain

    if linear:
        return _linear(folder, of, as_json, picture_path(picture, folder, "response-linear.png"))
    path = picture_path(picture, folder, f"response-{find_observable(of or TURNING[1]).name}.png")
    found = overview(folder, of, level)
    experiment = found.experiment
    draw_response(path, experiment.config.title, found.drawn,
                  envelope(experiment.pulses, experiment.config.stages[-1].length), found.impulse)
    typer.echo(json.dumps(plain(found.content), indent=2, ensure_ascii=False) if as_json
               else response_text(found.content))
    typer.echo(f"picture: {path}", err=True)


def _linear(folder, of, as_json, path):
    from swirlight.report.linear import draw_linear, linear_text, linear_values
    from swirlight.results.linear import linear_overview, linear_response

    found = [linear_response(folder, of)] if of else linear_overview(folder)
    draw_linear(path, found)
    typer.echo(json.dumps(linear_values(found), indent=2, ensure_ascii=False) if as_json
               else linear_text(found))
    typer.echo(f"picture: {path}", err=True)
