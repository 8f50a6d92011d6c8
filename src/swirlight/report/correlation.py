"""Pictures of correlation functions: curves with their bands, and the map C(t0, lag).

Curves differ in dash as well as in shade, the map's colours are symmetric about zero and its
zero line is drawn, so that both survive greyscale.
"""

import io

import numpy as np

from swirlight.results.correlate import column_names
from swirlight.store.durable import write_bytes

SHADES = (("#1b4965", "-"), ("#c1666b", "--"), ("0.3", ":"), ("#4f772d", "-."))


def draw_correlation(path, results, labels=None):
    """Curves with 95 % bands, one panel for each result.

    results : list of `Correlation`; labels : list of texts, of the panels.
    """
    figure, panels = _figure(len(results))
    for axes, result, label in zip(panels, results, labels or [""] * len(results), strict=True):
        _draw_curves(axes, result)
        axes.set_ylabel(f"{label}\n{axis_label(result)}" if label else axis_label(result))
    panels[-1].set_xlabel("lag / ps")
    figure.suptitle(_headline(results[0], labels), fontsize=10)
    _save(path, figure)


def draw_map(path, found):
    """C(t0, lag) of a `CorrelationMap`, and where it is larger than twice its error."""
    figure, (axes,) = _figure(1, height=5.0)
    values = np.where(np.isfinite(found.values), found.values, np.nan)
    most = float(np.nanmax(np.abs(values))) or 1.0
    mesh = axes.pcolormesh(found.lags, found.origins, np.ma.masked_invalid(values), cmap="RdBu_r",
                           vmin=-most, vmax=most, shading="nearest")
    with np.errstate(divide="ignore", invalid="ignore"):
        clear = np.abs(found.values) / found.errors
    if np.nanmax(np.where(np.isfinite(clear), clear, 0.0)) > 2.0:
        axes.contour(found.lags, found.origins, np.where(np.isfinite(clear), clear, 0.0),
                     levels=[2.0], colors="0.2", linewidths=0.6)
    axes.axvline(0.0, color="0.5", linewidth=0.6)
    axes.set_xlabel("lag / ps")
    axes.set_ylabel("origin t0 from the start of the stage / ps")
    figure.colorbar(mesh, ax=axes, label=axis_label(found))
    figure.suptitle(_headline(found, None) + "; contour: twice the standard error", fontsize=10)
    _save(path, figure)


def axis_label(result):
    """E.g. "C_xy / kJ+2 mol-2"."""
    name = result.components if isinstance(result.components, str) else "C"
    name = "C" if name == "all" else f"C({name})"
    return name + (f" / ({result.unit})" if result.unit else "")


def _figure(panels, height=2.2):
    from matplotlib.backends.backend_agg import FigureCanvasAgg
    from matplotlib.figure import Figure

    figure = Figure(figsize=(7.5, 1.3 + height * panels if panels > 1 else 4.2),
                    layout="constrained")
    FigureCanvasAgg(figure)
    axes = np.atleast_1d(figure.subplots(panels, 1, sharex=True))
    for each in axes:
        each.spines[["top", "right"]].set_visible(False)
    return figure, axes


def _draw_curves(axes, result):
    names = column_names(result)
    values, band = (array.reshape(len(array), -1)
                    for array in (result.values, result.half_width()))
    for k, name in enumerate(names):
        color, dash = SHADES[k % len(SHADES)]
        axes.fill_between(result.lags, values[:, k] - band[:, k], values[:, k] + band[:, k],
                          color=color, alpha=0.2, linewidth=0)
        axes.plot(result.lags, values[:, k], color=color, linestyle=dash, linewidth=1.3,
                  label=name)
    axes.axhline(0.0, color="0.5", linewidth=0.6)
    axes.axvline(0.0, color="0.5", linewidth=0.6, linestyle=":")
    if len(names) > 1:
        axes.legend(frameon=False, fontsize=8, ncols=3)


def _headline(result, labels):
    origin = getattr(result, "origin", None)
    locked = f", locked to {origin:g} ps" if origin is not None else ""
    starts = f"{result.starts} start{'s' * (result.starts > 1)}"
    what = "C_xy − C_yx about the beam" if labels else result.title
    return f"{what}: {result.kinds}{locked}; {starts}"


def _save(path, figure):
    image = io.BytesIO()
    figure.savefig(image, format="png", dpi=130, metadata={"Software": None})
    write_bytes(path, image.getvalue())
