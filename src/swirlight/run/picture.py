"""response.png: the answer at a glance.

Three panels over one time axis: the envelope of the pulse, the odd and even response of the
angular momentum along the beam with their 95 % bands over starts, and the ledger residual.
Lines differ in dash and weight as well as in shade, so that the picture survives greyscale.
"""

import io

import numpy as np

from swirlight.analysis.statistics import half_width, mean_and_error
from swirlight.store.durable import write_bytes

ODD = {"color": "#1b4965", "linestyle": "-", "linewidth": 2.0}
EVEN = {"color": "#c1666b", "linestyle": "--", "linewidth": 1.5}


def draw_response(path, title, curve, envelope, residuals, end):
    """Write the picture.

    curve : Curves of the angular momentum along the beam.
    envelope : (times, intensities) of all exposed pulses together. [ps], [W/cm²]
    residuals : kind -> (times, energy residual per body, one row a trajectory). [ps], [kJ/mol]
    end : when the light is over. [ps]
    """
    from matplotlib.backends.backend_agg import FigureCanvasAgg
    from matplotlib.figure import Figure

    figure = Figure(figsize=(7.5, 7.0), layout="constrained")
    FigureCanvasAgg(figure)
    light, middle, ledger = figure.subplots(3, 1, sharex=True, height_ratios=(1, 2.4, 1))
    figure.suptitle(title, fontsize=11)
    _draw_envelope(light, *envelope)
    _draw_parts(middle, curve)
    _draw_residuals(ledger, residuals)
    for axes in (light, middle, ledger):
        axes.axvline(end, color="0.6", linewidth=0.8, linestyle=":")
        axes.spines[["top", "right"]].set_visible(False)
    ledger.set_xlabel("time from the start of the lit stage / ps")
    image = io.BytesIO()
    figure.savefig(image, format="png", dpi=130, metadata={"Software": None})
    write_bytes(path, image.getvalue())


def _draw_envelope(axes, times, intensity):
    axes.fill_between(times, intensity, color="0.8")
    axes.plot(times, intensity, color="0.3", linewidth=1.2)
    axes.set_ylabel("intensity\n/ (W/cm²)")
    axes.set_ylim(bottom=0)


def _draw_parts(axes, curve):
    starts = len(curve.odd)
    for values, style, name in ((curve.odd, ODD, "odd in helicity"), (curve.even, EVEN, "even")):
        if values is None:
            continue
        mean, error, _ = mean_and_error(values)
        if starts > 1:
            band = half_width(error, starts)
            axes.fill_between(curve.times, mean - band, mean + band, color=style["color"],
                              alpha=0.2, linewidth=0)
        axes.plot(curve.times, mean, label=name, **style)
    axes.axhline(0.0, color="0.5", linewidth=0.6)
    bands = "bands: 95 % over starts" if starts > 1 else "one start: no band"
    axes.legend(title=f"{starts} start{'s' * (starts > 1)}, {bands}", frameon=False, fontsize=9,
                title_fontsize=8)
    axes.set_ylabel("angular momentum along\nthe beam / ħ per body")


def _draw_residuals(axes, residuals):
    shades = {"plus": ("#1b4965", "-"), "minus": ("#c1666b", "--"), "dark": ("0.4", ":")}
    for kind, (times, rows) in residuals.items():
        color, dash = shades[kind]
        axes.plot(times, np.sqrt(np.mean(np.square(rows), axis=0)), color=color, linestyle=dash,
                  linewidth=1.2, label=kind)
    axes.legend(frameon=False, fontsize=8, ncols=3)
    axes.set_ylabel("energy residual\n/ (kJ/mol per body)")
    axes.ticklabel_format(axis="y", style="sci", scilimits=(-2, 2))
