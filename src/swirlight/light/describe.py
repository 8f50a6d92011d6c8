"""What `swirlight check` says of the light: strengths, lengths, what was decided and why.

Figures are (value, unit) pairs in the units users know. No numba here.
"""

from dataclasses import dataclass, field, replace
from math import pi

import numpy as np

from swirlight.light.pulse import SECOND, intensity_of_amplitude
from swirlight.light.regime import beats, check_steps
from swirlight.light.schedule import resolved_field
from swirlight.units import HBAR, LIGHT_SPEED, VOLT_PER_METRE

ELECTRON_VOLT = VOLT_PER_METRE * 1e9  # u nm²/ps² in 1 eV
CUT = 1e-4  # of the peak intensity: less than this lost at the ends of a stage is no matter
SAMPLES = 64  # a cycle, where E(t) is measured


@dataclass
class Description:
    """Figures by name as (value, unit), plain statements, and warnings."""

    figures: dict = field(default_factory=dict)
    notes: list = field(default_factory=list)
    warnings: list = field(default_factory=list)


def describe(pulse, timestep=None, length=None):
    """The Description of one pulse.

    timestep, length : of the lit stage, where known. [ps]
    Raises InputError where a resolved carrier has fewer than 20 steps a cycle.
    """
    said = Description()
    said.figures.update(_strength(pulse))
    said.notes.append(f"{pulse.coupling}: {pulse.reason}")
    if pulse.refractive_index == 1.0:
        said.notes.append("refractive_index 1: |𝓔|² is overestimated by the liquid's own index")
    if pulse.coupling == "resolved":
        _resolved(pulse, timestep, said)
    if length is not None:
        _cut(pulse, length, said)
    return said


def _strength(pulse):
    """Intensity, amplitude, largest field, helicity product, fluence, photon, cycles."""
    volts = pulse.amplitude / VOLT_PER_METRE
    figures = {
        "intensity": (pulse.intensity, "W/cm^2"),
        "amplitude": (volts, "V/m"),
        "largest field": (pulse.peak_field / VOLT_PER_METRE, "V/m"),
        "s3 |amplitude|^2": (pulse.s3 * volts**2, "V^2/m^2"),
        "fluence": (pulse.fluence, "J/cm^2"),
        "duration": (pulse.envelope.duration, "ps"),
        "centre": (pulse.centre, "ps"),
        "wavelength": (2.0 * pi * LIGHT_SPEED / pulse.carrier, "nm"),
        "frequency": (pulse.carrier / (2.0 * pi), "THz"),
        "photon energy": (HBAR * pulse.carrier / ELECTRON_VOLT, "eV"),
        "cycles per duration": (pulse.envelope.duration * pulse.carrier / (2.0 * pi), ""),
    }
    if pulse.local_factor != 1.0:
        figures["local field factor of |amplitude|^2"] = (pulse.local_factor**2, "")
    if pulse.count > 1:
        figures["fluence of the train"] = (pulse.count * pulse.fluence, "J/cm^2")
    return figures


def _resolved(pulse, timestep, said):
    peak, width, fluence = achieved(pulse)
    said.figures.update({
        "achieved largest field": (peak / VOLT_PER_METRE, "V/m"),
        "achieved duration": (width, "ps"),
        "achieved fluence": (fluence, "J/cm^2"),
    })
    cycles = said.figures["cycles per duration"][0]
    if cycles < 1.0:
        said.warnings.append(
            f"{cycles:.2g} cycles of the carrier in the duration: without net area such a pulse"
            " is not what its envelope says; see the achieved figures")
    if timestep is not None:
        said.figures["steps per cycle"] = (2.0 * pi / (pulse.carrier * timestep), "")
        warning = check_steps(pulse, timestep)
        if warning is not None:
            said.warnings.append(warning)


def achieved(pulse):
    """(largest |E| [u nm/ps²/e], FWHM [ps], fluence [J/cm²]) of one copy as E(t) really is.

    The width is that of ½ε0cn|𝓔 + i𝓔̇/ω|², the intensity averaged over the carrier; the fluence
    that of ε0cn E².
    """
    t = sample_times(pulse)
    field_, _ = resolved_field([replace(pulse, count=1)], t)
    slow, slow1, _ = pulse.derivatives_at(t - pulse.centre)
    shape = np.sum(np.abs(slow + 1j * slow1 / pulse.carrier) ** 2, axis=-1)
    above = np.flatnonzero(shape >= 0.5 * shape.max())
    edges = [_crossing(t, shape, i, j)
             for i, j in ((above[0] - 1, above[0]), (above[-1] + 1, above[-1]))]
    energy = np.trapezoid(np.sum(field_**2, axis=-1), t)  # of E², twice that of |𝓔|² averaged
    fluence = 2.0 * intensity_of_amplitude(1.0, pulse.refractive_index) * energy / SECOND
    largest = np.sqrt(np.sum(field_**2, axis=-1).max())
    return float(largest), float(edges[1] - edges[0]), float(fluence)


def sample_times(pulse):
    """Times that resolve the carrier over one copy, from the start of the stage. [ps]"""
    before, after = pulse.envelope.reach(1e-12)
    cycles = (before + after) * pulse.carrier / (2.0 * pi)
    count = int(min(max(cycles, 4.0) * SAMPLES, 2_000_000)) + 1
    return pulse.centre + np.linspace(-before, after, count)


def _crossing(t, shape, outer, inner):
    """Where the line between two samples passes half the maximum."""
    if not 0 <= outer < len(t):
        return t[inner]
    half = 0.5 * shape.max()
    return t[inner] + (half - shape[inner]) / (shape[outer] - shape[inner]) * (t[outer] - t[inner])


def _cut(pulse, length, said):
    """Warn of light that the stage cuts off, naming the smallest centre and length."""
    before, after = pulse.envelope.reach(CUT)
    last = float(pulse.centres[-1])
    begin = float(pulse.envelope.intensity(-pulse.centre)) if pulse.centre < before else 0.0
    end = float(pulse.envelope.intensity(length - last)) if length - last < after else 0.0
    said.figures["intensity at the start of the stage"] = (begin, "of the peak")
    said.figures["intensity at the end of the stage"] = (end, "of the peak")
    if max(begin, end) > CUT * (1.0 + 1e-6):
        centre = max(pulse.centre, before)
        shortest = centre + (last - pulse.centre) + after
        said.warnings.append(
            f"cut off by its stage at {max(begin, end):.2g} of its peak: the centre must be at"
            f" least {_up(before)} ps and the stage at least {_up(shortest)} ps long")


def _up(value):
    """Rounded up to four digits, so that the named value suffices."""
    if value <= 0.0:
        return "0"
    step = 10.0 ** (np.floor(np.log10(value)) - 3)
    return f"{np.ceil(value / step - 1e-9) * step:.4g}"


def describe_beats(pulses, system):
    """One statement for each pair of averaged pulses: how they add, and the beat."""
    lines = []
    for i, j, beat, together in beats(pulses, system):
        how = ("add as amplitudes and beat" if together
               else "add as coherency matrices (the beat is faster than the bodies)")
        period = f", one beat in {2.0 * pi / beat:.4g} ps" if beat > 0.0 else ""
        lines.append(f"light[{i}] and light[{j}] {how}: {beat / (2.0 * pi):.4g} THz apart{period}")
    return lines


def end_of_light(pulses, level=CUT):
    """When the last pulse has fallen below `level` of its peak, from the start of the stage. [ps]

    0 without pulses.
    """
    return max((p.span(level)[1] for p in pulses), default=0.0)
