"""`swirlight spectrum`."""

import enum
import json
import pathlib
from typing import Annotated

import typer


class Of(enum.StrEnum):
    """Of what there are spectra."""

    dipole = "dipole"
    kerr = "kerr"
    libration = "libration"
    transient = "transient"


class Window(enum.StrEnum):
    """Lag windows."""

    hann = "hann"
    gaussian = "gaussian"
    triangle = "triangle"
    none = "none"


def spectrum(
    run: Annotated[pathlib.Path, typer.Argument(help="A run folder.")],
    of: Annotated[Of, typer.Option(
        "--of", help="dipole: permittivity, absorption, index; kerr: optical-Kerr response;"
        " libration: angular velocities; transient: what a weak probe meets.")],
    kind: Annotated[str | None, typer.Option(
        help="dark, plus or minus; left out: dark, or the first there is.")] = None,
    window: Annotated[Window, typer.Option(help="Of the correlation function.")] = Window.hann,
    longest_lag: Annotated[str | None, typer.Option(
        help='Of the correlation function, "10 ps"; left out: an eighth of the record.')] = None,
    high_frequency: Annotated[float | None, typer.Option(
        help="Permittivity above all frequencies; left out: 1.")] = None,
    wavelength: Annotated[str | None, typer.Option(
        help='Of the polarizability (kerr), "800 nm".')] = None,
    species: Annotated[str | None, typer.Option(help="Which one librates.")] = None,
    as_json: Annotated[bool, typer.Option("--json", help="For programs: every frequency.")] = False,
    picture: Annotated[pathlib.Path | None, typer.Option(
        help="Where to draw; left out: spectrum-OF.png in the run folder.")] = None,
):
    """Spectra of a run with errors over its starts: a table, and a picture in THz and cm^-1.

    Example: swirlight spectrum runs/liquid --of dipole --longest-lag "10 ps"
    """
    from swirlight.cli.picture import picture_path
    from swirlight.report.spectra import draw_spectrum, spectrum_text, spectrum_values
    from swirlight.results.spectrum import spectrum as work
    from swirlight.store.run import open_run

    path = picture_path(picture, run, f"spectrum-{of.value}.png")
    options = {"high_frequency": high_frequency, "wavelength": wavelength, "species": species}
    found = work(open_run(run), of.value, kind, window.value, longest_lag,
                 **{name: value for name, value in options.items() if value is not None})
    draw_spectrum(found, path)
    typer.echo(f"picture: {path}", err=True)
    typer.echo(json.dumps(spectrum_values(found), indent=2) if as_json else spectrum_text(found))
