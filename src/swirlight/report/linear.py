"""Driven response over the limit of weak light: as a table, as plain values, as a picture."""

import io

import numpy as np

from swirlight.analysis.statistics import half_width
from swirlight.store.durable import write_bytes

DARK, LIT = "#1b4965", "#c1666b"
ROWS = 8
TITLE = "driven, and the limit of weak light told from the dark runs"


def linear_text(responses, rows=ROWS):
    """A block of lines for each `LinearResponse`, at most `rows` times in each."""
    return "\n\n".join(_block(r, rows) for r in responses)


def _block(r, rows):
    unit = f" [{r.unit}]" if r.unit else ""
    lines = [f"{r.observable}, {r.part} part{unit}: {r.label}, {r.starts} starts,"
             f" kernels cut at {r.lag:.3g} ps"]
    for row in np.unique(np.linspace(0, len(r.times) - 1, rows + 1).astype(int)[1:]):
        line = f"  {r.times[row]:8.3f} ps   predicted {_number(r.values[row], r.errors[row])}"
        if r.driven is not None:
            line += f"   driven {_number(r.driven[row], r.driven_errors[row])}"
        lines.append(line)
    return "\n".join([*lines, f"  {verdict(r)}", *(f"  - {note}" for note in r.notes)])


def verdict(r):
    """What the comparison of a `LinearResponse` with the driven one says, in words."""
    if r.driven is None:
        return "no driven response beside it: plus and minus are needed, for an even part dark too"
    if not np.isfinite(r.ratio):
        return "no ratio: nothing is predicted at lowest order, or there is one start only"
    said = f"driven over predicted {r.ratio:.3f} ± {r.ratio_error:.3f}, "
    if not np.isfinite(r.p):
        return said + "from too few starts to tell whether they part"
    if r.parted_at is None:
        return said + f"no parting beyond errors (p = {r.p:.2g})"
    if r.label == "estimate":
        return said + f"the estimate fails from {r.parted_at:.3g} ps on (p = {r.p:.2g})"
    return said + (f"they part at {r.parted_at:.3g} ps (p = {r.p:.2g}): at {r.intensity:.3g} W/cm²"
                   " the response is no longer linear")


def linear_values(responses):
    """{observable: plain values} for programs."""
    return {r.observable: {
        "part": r.part, "unit": r.unit, "label": r.label, "starts": r.starts,
        "intensity": {"value": r.intensity, "unit": "W cm-2"},
        "lag": {"value": r.lag, "unit": "ps"}, "times": _list(r.times),
        "predicted": _list(r.values), "predicted_error": _list(r.errors),
        "driven": _list(r.driven), "driven_error": _list(r.driven_errors),
        "ratio": {"value": _plain(r.ratio), "error": _plain(r.ratio_error)}, "p": _plain(r.p),
        "parted_at": r.parted_at, "notes": list(r.notes),
    } for r in responses}


def draw_linear(path, responses):
    """A panel for each response: predicted (dashed) and driven, with 95 % bands."""
    from matplotlib.backends.backend_agg import FigureCanvasAgg
    from matplotlib.figure import Figure

    figure = Figure(figsize=(7.5, 1.0 + 2.2 * len(responses)), layout="constrained")
    FigureCanvasAgg(figure)
    panels = np.atleast_1d(figure.subplots(len(responses), 1, sharex=True))
    for axes, r in zip(panels, responses, strict=True):
        axes.spines[["top", "right"]].set_visible(False)
        axes.axhline(0.0, color="0.6", linewidth=0.6)
        _curve(axes, r, r.values, r.errors, DARK, "--", f"{r.label}, from the dark")
        if r.driven is not None:
            _curve(axes, r, r.driven, r.driven_errors, LIT, "-", "driven")
        if r.parted_at is not None:
            axes.axvline(r.parted_at, color="0.3", linestyle=":", linewidth=1.0)
        name = r.observable.replace("_", " ")
        axes.set_ylabel(f"{name}\n{r.part}" + (f" / {r.unit}" if r.unit else ""), fontsize=8)
        axes.legend(frameon=False, fontsize=8)
    panels[-1].set_xlabel("time from the start of the lit stage / ps")
    figure.suptitle(TITLE, fontsize=10)
    buffer = io.BytesIO()
    figure.savefig(buffer, format=path.suffix[1:], dpi=150)
    write_bytes(path, buffer.getvalue())


def _curve(axes, r, values, errors, color, dash, label):
    band = np.nan_to_num(half_width(errors, r.starts))
    axes.fill_between(r.times, values - band, values + band, color=color, alpha=0.2, linewidth=0)
    axes.plot(r.times, values, color=color, linestyle=dash, linewidth=1.3, label=label)


def _number(value, error):
    return f"{value:+.4g}" + (f" ± {error:.2g}" if np.isfinite(error) else "")


def _plain(value):
    return float(value) if np.isfinite(value) else None


def _list(values):
    return None if values is None else [_plain(v) for v in values]
