"""The permittivity that a weak probe meets at its delay behind a pump."""

import numpy as np

from swirlight import units
from swirlight.analysis import spectra
from swirlight.analysis.statistics import mean_and_error
from swirlight.errors import InputError
from swirlight.results.source import quantity, trajectories
from swirlight.results.spectral import Curve, Spectrum

BAND = 0.01  # of the largest |E(ω)|²: outside of it the probe says nothing
FADED = 0.05  # of the largest |δM|


def transient(run, kind, window, lag, high_frequency=None):
    """`Spectrum` with the permittivity within the probe's band.

    The probe is resolved light with `in_kinds: same`, the pump averaged: then the half
    difference of two carrier phases 180° apart is what the sign of the probe does.
    With `lag` the moment is taken times the window, counted from the probe's centre, which is
    the same window on the response function as long as the probe is short against the lag;
    it removes late noise. Without, the whole record counts.
    Raises InputError where the run has no such twins.
    """
    window = window if lag else "none"
    groups, said = trajectories(run, kind)
    first, phases = groups[0][0], len(groups[0])
    pump, probe = _pump_and_probe(first.parameters.get("light", {}), run, kind)
    if phases % 2:
        raise InputError(f"{run.path}: {kind} has {phases} carrier phase: a probe needs an even"
                         " number (exposures.carrier_phases: 2)")
    top = spectra.checked_high_frequency(high_frequency)
    moment, field = (
        np.array([_odd(group, name) for group in groups]) * factor
        for name, factor in (("total_dipole", units.COULOMB_METRE),
                             ("light/field", units.VOLT_PER_METRE)))
    series = quantity(first, "total_dipole")
    volume, interval = float(np.prod(first.box)), series.interval
    weight = _weight(series.times - float(probe[0]["centre"]), window, lag or 0.0)
    width = spectra.resolution(window, lag or interval * len(series))
    _, size = spectra.grid(len(series), interval, width)

    def measured(m):
        return spectra.transient_permittivity(m * weight[:, None], field[0], interval, volume,
                                              size, top)

    frequencies, values, power = measured(moment.mean(axis=0))
    band = power > BAND
    errors = _errors([measured(m)[1][band] for m in moment])
    notes = said + _notes(series.times, moment.mean(axis=0), pump, probe, top, high_frequency)
    if lag:
        notes.append(f"window {window}, {lag:.4g} ps from the centre of the probe: a sharp line"
                     f" is {width:.3g} THz wide, and what answers later is left out")
    curve = Curve(values[band], errors, "", "permittivity met by the probe")
    strength = Curve(power[band], np.zeros(band.sum()), "", "|E(ω)|² of the probe over its largest")
    return Spectrum("transient", "transient permittivity", kind, frequencies[band],
                    {"permittivity": curve, "probe": strength}, len(groups), window,
                    lag or interval * len(series), width, {}, tuple(notes))


def _weight(since, window, lag):
    """(frames,) 1 until the probe's centre, then the lag window, 0 after `lag`. [ps]"""
    if window == "none":
        return np.ones_like(since) if not lag else (since < lag).astype(float)
    x = np.clip(since / lag, 0.0, 1.0)
    return np.where(x < 1.0, spectra.WINDOWS[window](x), 0.0)


def _pump_and_probe(pulses, run, kind):
    """(pumps, probes) as the file describes them; in dark there may be no pump."""
    pumps = [p for p in pulses.values() if p["exposed"]]
    probes = [p for p in pulses.values() if not p["exposed"] and p["coupling"] == "resolved"]
    if not probes:
        raise InputError(f"{run.path}: {kind} has no probe: a carrier-resolved pulse with"
                         " in_kinds: same")
    if any(p["coupling"] == "resolved" for p in pumps):
        raise InputError(f"{run.path}: the pump is carrier-resolved, so that its phase changes"
                         " together with the probe's; a transient permittivity needs an averaged"
                         " pump")
    return pumps, probes


def _odd(group, name):
    """(frames, 3) half the difference of the first carrier phase and that 180° from it."""
    twins = group[0], group[len(group) // 2]
    plus, minus = (np.asarray(quantity(trajectory, name)) for trajectory in twins)
    for trajectory in twins:
        trajectory.close()
    return 0.5 * (plus - minus)


def _errors(samples):
    """(F,) standard errors of the mean over starts, of real and imaginary part."""
    return mean_and_error(np.real(samples))[1] + 1j * mean_and_error(np.imag(samples))[1]


def _notes(times, moment, pumps, probes, top, given):
    notes = []
    centre = float(probes[0]["centre"])
    if pumps:
        delay = centre - float(pumps[0]["centre"])
        notes.append(f"delay {delay:.4g} ps, from the centre of the first pump to that of the"
                     " probe; the sample changes while the probe and its wake last")
    else:
        notes.append("no pump in this kind: the sample at rest")
    notes.append("within the band where the probe has more than 1 % of its largest |E(ω)|²")
    notes.append(f"high-frequency permittivity {top:g}"
                 + (", as given" if given is not None else ": the bodies do not polarise"))
    size = np.linalg.norm(moment, axis=1)
    left = size[-max(len(size) // 50, 1):].mean() / size.max()
    if left > FADED:
        notes.append(f"{100 * left:.0f} % of the largest moment is left at {times[-1]:.4g} ps,"
                     " the end of the record: a longer stage would show finer structure")
    return notes
