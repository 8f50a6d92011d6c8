"""response.png: the answer at a glance.

Panels over one time axis: the envelope of the pulse, the odd and even response along the beam with
their 95 % bands over starts, the dark runs likewise, and what pairing gains. Lines differ in dash
and weight as well as in shade, so that the picture survives greyscale.
"""

import io
import pathlib

import numpy as np

from swirlight.analysis.statistics import half_width, mean_and_error
from swirlight.light.exposure import exposed
from swirlight.store.durable import write_bytes

ODD = {"color": "#1b4965", "linestyle": "-", "linewidth": 2.0}
EVEN = {"color": "#c1666b", "linestyle": "--", "linewidth": 1.5}
IMPULSE = {"color": "0.15", "linestyle": "-.", "linewidth": 1.2}
DARK = {"color": "0.35", "linestyle": ":", "linewidth": 1.5}
GAIN_SHOWN = 1e12  # a larger gain is a matter of rounding


def envelope(pulses, length):
    """(times [ps], intensity [W/cm²]) of all exposed pulses and their copies, over a stage."""
    times = np.linspace(0.0, length, 1000)
    return times, sum(_intensity(pulse, times) for pulse in exposed(pulses) or pulses)


def _intensity(pulse, times):
    shapes = [np.abs(pulse.amplitude_at(times - centre)) ** 2 for centre in pulse.centres]
    return pulse.intensity / pulse.amplitude**2 * np.sum(shapes, axis=(0, 2)) if pulse.amplitude \
        else np.zeros_like(times)


def draw_response(path, title, response, light, impulse=None):
    """Write the picture of a Response, along the beam.

    path : .png, .svg or .pdf; light : (times, intensities) of `envelope`; impulse : Response of
    the light impulse, drawn beside that of the angular momentum, which decays from it.
    """
    from matplotlib.backends.backend_agg import FigureCanvasAgg
    from matplotlib.figure import Figure

    along, dark = response.along, response.dark is not None
    figure = Figure(figsize=(7.5, 9.0 if dark else 7.5), layout="constrained")
    FigureCanvasAgg(figure)
    panels = figure.subplots(3 + dark, 1, sharex=True,
                             height_ratios=(1, 2.4, 1.4, 1.2) if dark else (1, 2.4, 1.2))
    figure.suptitle(title, fontsize=11)
    _draw_envelope(panels[0], *light)
    beside = response.observable.name == "angular_momentum"
    _draw_parts(panels[1], response, impulse if beside else None)
    if dark:
        _draw_band(panels[2], along.times, along.dark, "dark", DARK)
        panels[2].legend(frameon=False, fontsize=9)
        panels[2].set_ylabel(f"dark{_unit(response)}")
    _draw_gain(panels[-1], along)
    for axes in panels:
        axes.axvline(response.span[1], color="0.6", linewidth=0.8, linestyle=":")
        axes.spines[["top", "right"]].set_visible(False)
    panels[-1].set_xlabel("time from the start of the lit stage / ps")
    image = io.BytesIO()
    kind = pathlib.Path(path).suffix[1:]
    said = {"Software": None} if kind == "png" else {}
    figure.savefig(image, format=kind, dpi=130, metadata=said)
    write_bytes(path, image.getvalue())


def _draw_envelope(axes, times, intensity):
    axes.fill_between(times, intensity, color="0.8")
    axes.plot(times, intensity, color="0.3", linewidth=1.2)
    axes.set_ylabel("intensity\n/ (W/cm²)")
    axes.set_ylim(bottom=0)


def _draw_band(axes, times, values, name, style):
    """Mean over starts with the 95 % band of Student's t. values : (starts, T)."""
    mean, error, _ = mean_and_error(values)
    if len(values) > 1:
        band = half_width(error, len(values))
        axes.fill_between(times, mean - band, mean + band, color=style["color"], alpha=0.2,
                          linewidth=0)
    axes.plot(times, mean, label=name, **style)


def _draw_parts(axes, response, impulse):
    along, starts = response.along, response.starts
    for part, name, style in (("odd", "odd in helicity", ODD), ("even", "even", EVEN)):
        values = along.of_starts(part)
        if values is not None:
            _draw_band(axes, along.times, values, name, style)
    if impulse is not None:
        _draw_band(axes, impulse.times, impulse.along.of_starts("odd"),
                   "odd impulse that the light delivered", IMPULSE)
    axes.axhline(0.0, color="0.5", linewidth=0.6)
    bands = "bands: 95 % over starts" if starts > 1 else "one start: no band"
    axes.legend(title=f"{starts} start{'s' * (starts > 1)}, {bands}", frameon=False, fontsize=9,
                title_fontsize=8)
    vector = " along\nthe beam" if response.observable.symmetry != "scalar" else "\n"
    axes.set_ylabel(f"{response.observable.label}{vector}{_unit(response)}")


def _unit(response):
    return f" / {response.unit}".replace("hbar", "ħ per body") if response.unit else ""


def _draw_gain(axes, along):
    gains = [(along.gain, "twins of opposite helicity", ODD)]
    if along.phase_gain is not None:
        gains.append((along.phase_gain, f"{along.odd_by_phase.shape[1]} carrier phases", EVEN))
    for gain, name, style in gains:
        shown = np.where(gain < GAIN_SHOWN, gain, np.nan)
        axes.plot(along.times, shown, label=name, **style)
    axes.axhline(1.0, color="0.5", linewidth=0.6)
    axes.set_yscale("log")
    axes.set_ylabel("variance ratio\nby pairing")
    axes.legend(frameon=False, fontsize=8)
