"""A spectrum as a table, as plain values for programs, and as a picture."""

import io
import re

import numpy as np

from swirlight.analysis.spectra import WAVENUMBER
from swirlight.store.durable import write_bytes

ROWS = 24
SHADES = (("#1b4965", "-"), ("#c1666b", "--"), ("#5f0f40", ":"))


def spectrum_text(found, rows=ROWS):
    """The table: label, notes, figures, at most `rows` frequencies."""
    lines = [f"{found.label}, {found.kind}, {found.starts} start{'s' * (found.starts != 1)}"]
    lines += [f"  {name}  {_with_error(value, error)} {unit}".rstrip()
              for name, (value, error, unit) in found.figures.items()]
    columns = [(f"{name}{part}" + (f" [{curve.unit}]" if curve.unit else ""), values, errors)
               for name, curve in found.curves.items()
               for part, values, errors in _parts(curve)]
    names = ["THz", "cm^-1", *(name for name, _, _ in columns)]
    table = [names]
    for k in _chosen(found.frequencies, rows):
        table.append([f"{found.frequencies[k]:.4g}", f"{found.wavenumbers[k]:.4g}",
                      *(_with_error(v[k], e[k]) for _, v, e in columns)])
    widths = [max(map(len, column)) for column in zip(*table, strict=True)]
    lines += ["", *("  ".join(cell.rjust(w) for cell, w in zip(row, widths, strict=True))
                    for row in table), ""]
    return "\n".join(lines + [f"- {note}" for note in found.notes])


def _parts(curve):
    if np.iscomplexobj(curve.values):
        yield "'", curve.values.real, curve.errors.real
        yield "''", curve.values.imag, curve.errors.imag
    else:
        yield "", curve.values, curve.errors


def _with_error(value, error):
    """Value ± error to two digits of the error, with one common power of ten where it is needed."""
    if not np.isfinite(error) or error == 0.0:
        return f"{value:.4g}"
    size = max(abs(value), error)
    if error < 1e-5 * size:
        return f"{value:.7g} ± {error:.1g}"
    power = int(np.floor(np.log10(size)))
    power = 0 if -3 <= power < 5 else power
    digits = max(0, 1 - int(np.floor(np.log10(error / 10.0**power))))
    both = f"{value / 10.0**power:.{digits}f} ± {error / 10.0**power:.{digits}f}"
    return f"({both})e{power}" if power else both


def _chosen(frequencies, rows):
    """The first row and others spread evenly over the logarithm of the frequency."""
    if len(frequencies) <= rows:
        return np.arange(len(frequencies))
    first = 1 if frequencies[0] == 0.0 else 0
    wanted = np.geomspace(frequencies[first], frequencies[-1], rows - 1)
    nearest = np.abs(frequencies[None] - wanted[:, None]).argmin(axis=1)
    return np.unique(np.concatenate([[0], nearest]))


def spectrum_values(found):
    """Plain values for programs; numbers that are not there are None."""
    values = {
        "of": found.of, "label": found.label, "kind": found.kind, "starts": found.starts,
        "window": found.window, "longest_lag": {"value": found.longest_lag, "unit": "ps"},
        "resolution": {"value": found.resolution, "unit": "THz"},
        "figures": {name: {"value": value, "error": _plain([error])[0], "unit": unit}
                    for name, (value, error, unit) in found.figures.items()},
        "frequency": {"values": _plain(found.frequencies), "unit": "THz"},
        "wavenumber": {"values": _plain(found.wavenumbers), "unit": "cm^-1"},
        "curves": {name: _curve(curve) for name, curve in found.curves.items()},
        "notes": list(found.notes),
    }
    if found.response is not None:
        values["response"] = {"lag": {"values": _plain(found.lags), "unit": "ps"},
                              **_curve(found.response)}
    return values


def _curve(curve):
    about = {"unit": curve.unit, "meaning": curve.meaning}
    if not np.iscomplexobj(curve.values):
        return {**about, "values": _plain(curve.values), "errors": _plain(curve.errors)}
    return {**about, **{
        f"{part}_{name}": _plain(getattr(numbers, part[:4]))
        for part in ("real", "imaginary")
        for name, numbers in (("values", curve.values), ("errors", curve.errors))}}


def _plain(numbers):
    return [float(x) if np.isfinite(x) else None for x in numbers]


def draw_spectrum(found, path):
    """Write the picture. path : .png, .svg or .pdf."""
    image, kind = io.BytesIO(), path.suffix[1:]
    spectrum_figure(found).savefig(image, format=kind, dpi=130,
                                   metadata={"Software": None} if kind == "png" else None)
    write_bytes(path, image.getvalue())


def spectrum_figure(found):
    """A matplotlib Figure: a panel a curve, bands of one standard error, THz below, cm^-1 above."""
    from matplotlib.backends.backend_agg import FigureCanvasAgg
    from matplotlib.figure import Figure

    panels = _panels(found)
    figure = Figure(figsize=(7.0, 1.2 + 2.3 * len(panels)), layout="constrained")
    FigureCanvasAgg(figure)
    figure.suptitle(f"{found.label} ({found.kind}, {found.starts}"
                    f" start{'s' * (found.starts != 1)})", fontsize=11)
    rows = figure.subplots(len(panels), 1, sharex=True, squeeze=False)[:, 0]
    for axes, (title, lines) in zip(rows, panels, strict=True):
        for (name, values, errors), (colour, dash) in zip(lines, SHADES, strict=False):
            axes.fill_between(found.frequencies, values - errors, values + errors, color=colour,
                              alpha=0.2, linewidth=0)
            axes.plot(found.frequencies, values, color=colour, linestyle=dash, label=name)
        axes.set_ylabel(title)
        axes.axhline(0.0, color="0.6", linewidth=0.6)
        axes.spines["right"].set_visible(False)
        if len(lines) > 1:
            axes.legend(frameon=False, fontsize=9)
    if found.of in ("dipole", "kerr"):
        rows[-1].set_xscale("log")
    rows[-1].set_xlim(*_range(found))
    rows[-1].set_xlabel(f"frequency / THz   (a sharp line is {found.resolution:.2g} THz wide)")
    above = rows[0].secondary_xaxis(
        "top", functions=(lambda f: f * WAVENUMBER, lambda k: k / WAVENUMBER))
    above.set_xlabel("wavenumber / cm$^{-1}$")
    return figure


def _panels(found):
    """[(label of the axis, [(name, values, errors)])]; librations share one."""
    panels = {}
    for name, curve in found.curves.items():
        title = "density of states" if found.of == "libration" else name.replace("_", " ")
        unit = f" / ({_raised(curve.unit)})" if curve.unit else ""
        lines = panels.setdefault(title + unit, [])
        for part, values, errors in _parts(curve):
            word = {"": name.replace("_", " "), "'": "real part", "''": "imaginary part"}[part]
            lines.append((word, values, np.nan_to_num(errors)))
    return list(panels.items())


def _raised(unit):
    """A unit with its powers raised, for matplotlib."""
    return re.sub(r"\^(-?[0-9])", r"$^{\1}$", unit)


def _range(found):
    """Frequencies shown: from half the resolution, or 0; librations up to where they end."""
    f = found.frequencies
    if found.of == "transient":
        return f[0], f[-1]
    if found.of in ("dipole", "kerr"):
        return 0.5 * found.resolution, f[-1]
    sums = np.cumsum(sum(c.values for c in found.curves.values()))
    return 0.0, f[np.searchsorted(sums, 0.995 * sums[-1])]
