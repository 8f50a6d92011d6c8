"""`swirlight correlate`."""

import enum
import json
import math
import pathlib
from typing import Annotated

import typer

ROWS = 40  # of the table; --json has every lag


class Frame(enum.StrEnum):
    """Seen from where."""

    lab = "lab"
    body = "body"


class Kind(enum.StrEnum):
    """Which runs: kinds, or their differences start by start."""

    dark = "dark"
    plus = "plus"
    minus = "minus"
    odd = "odd"
    even = "even"


def correlate(
    run: Annotated[pathlib.Path, typer.Argument(help="A run folder.")],
    of: Annotated[
        str | None,
        typer.Option(metavar="VECTOR[,VECTOR]", help="A recorded vector, axis_x, axis_y, axis_z, a"
                     " total such as total_dipole; two: the first with the second."),
    ] = None,
    components: Annotated[
        str,
        typer.Option(metavar="xy", help="xy is ⟨x(t0) y(t0+t)⟩; a sum such as xy-yx or xx+yy+zz; "
                     "several with commas; or all."),
    ] = "xy",
    frame: Annotated[Frame, typer.Option(help="Seen from the laboratory or the body.")] = Frame.lab,
    locked_to: Annotated[
        str | None,
        typer.Option(metavar="TIME", help='One origin, such as "2.5 ps" of the stage; left out: '
                     "all origins."),
    ] = None,
    longest_lag: Annotated[str | None, typer.Option(metavar="TIME")] = None,
    kind: Annotated[
        Kind | None,
        typer.Option(help="odd: (plus − minus)/2; even: (plus + minus)/2 − dark. Left out: dark, "
                     "when locked plus."),
    ] = None,
    species: Annotated[str | None, typer.Option(metavar="NAME", help="Its bodies only.")] = None,
    normalised: Annotated[bool, typer.Option("--normalised")] = False,
    subtract_mean: Annotated[bool, typer.Option("--subtract-mean")] = False,
    signature: Annotated[
        bool,
        typer.Option("--signature", help="In place of --of: the helicity signature C_xy − C_yx "
                     "about the beam of axis–axis, axis–L and L–L."),
    ] = False,
    as_json: Annotated[bool, typer.Option("--json", help="For programs: every lag.")] = False,
    picture: Annotated[
        pathlib.Path | None, typer.Option(help="Left out: into the run folder.")
    ] = None,
):
    """Time correlation functions with errors over independent starts: table and picture.

    Example: swirlight correlate runs/first --of axis_z,angular_momentum --components xy-yx
    """
    from swirlight.errors import InputError
    from swirlight.report.correlation import draw_correlation, draw_map
    from swirlight.results.correlate import correlate as work
    from swirlight.results.correlate import correlation_map, helicity_signature
    from swirlight.store.run import open_run

    if (of is None) != signature:
        raise InputError("expected either --of VECTOR[,VECTOR], for example --of angular_momentum, "
                         "or --signature")
    if picture is not None and picture.suffix != ".png":
        raise InputError(f"--picture {picture}: needs a name that ends in .png")
    if picture is not None and not picture.absolute().parent.is_dir():
        raise InputError(f"--picture {picture}: there is no folder {picture.parent}")
    opened = open_run(run)
    choice = {"longest_lag": longest_lag, "kinds": kind and kind.value, "species": species}
    if signature:
        found = helicity_signature(opened, locked_to=locked_to, **choice)
        name = "signature"
    else:
        first, _, second = of.partition(",")
        choice |= {"with_vector": second or None, "frame": frame.value, "normalised": normalised,
                   "subtract_mean": subtract_mean}
        wanted = components if "," not in components else components.split(",")
        found = {of: work(opened, first, wanted, locked_to=locked_to, **choice)}
        name = f"{of.replace(',', '-with-')}-{components}"
    place = picture or run / f"correlation-{name}-{next(iter(found.values())).kinds}.png"
    draw_correlation(place, list(found.values()), list(found) if signature else None)
    typer.echo(f"picture: {place}", err=True)
    if locked_to is not None and not signature and isinstance(wanted, str) and wanted != "all":
        place = place.with_name(f"{place.stem}-map{place.suffix}")
        draw_map(place, correlation_map(opened, first, wanted, **choice))
        typer.echo(f"picture: {place}", err=True)
    if as_json:
        typer.echo(json.dumps([_plain(result) for result in found.values()], indent=2))
    else:
        typer.echo("\n\n".join(_table(name, result) for name, result in found.items()))


def _columns(result):
    """(names, (lags, n) values, (lags, n) half widths of the 95 % intervals)"""
    from swirlight.results.correlate import column_names

    return column_names(result), *(array.reshape(len(array), -1)
                                   for array in (result.values, result.half_width()))


def _table(name, result):
    names, values, widths = _columns(result)
    origin = "" if result.origin is None else f", locked to {result.origin:g} ps"
    starts = f"{result.starts} starts" if result.starts > 1 else "one start"
    lines = [f"{name}: {result.title}, {result.kinds}{origin}, {starts}",
             f"unit: {result.unit or 'none'}; ± is half of the 95 % interval", *result.notes,
             "  ".join(["   lag / ps", *(f"{n:>12}{'±':>12}" for n in names)])]
    zero = int(abs(result.lags).argmin())
    stride = -(-len(result.lags) // ROWS)
    for k in range(zero % stride, len(result.lags), stride):
        cells = [f"{v:12.4g}{w:12.2g}" for v, w in zip(values[k], widths[k], strict=True)]
        lines.append("  ".join([f"{result.lags[k]:11.4g}", *cells]))
    if stride > 1:
        lines.append(f"one of {stride} lags; --json has all")
    return "\n".join(lines)


def _plain(result):
    names, values, widths = _columns(result)
    return {
        "title": result.title, "kinds": result.kinds, "starts": result.starts,
        "unit": result.unit, "notes": result.notes,
        "locked_to": None if result.origin is None else {"value": result.origin, "unit": "ps"},
        "lags": {"value": result.lags.tolist(), "unit": "ps"},
        "components": {
            name: {"value": _numbers(values[:, k]), "half_width_95": _numbers(widths[:, k])}
            for k, name in enumerate(names)
        },
    }


def _numbers(array):
    """A list in which NaN, that JSON does not know, is null."""
    return [None if math.isnan(number) else number for number in array.tolist()]
