"""summary.json and response.png: what a finished run says, from its files alone."""

import numpy as np

from swirlight import __version__, units
from swirlight.analysis.statistics import blocking_error, mean_and_error
from swirlight.config import config_hash
from swirlight.run.picture import draw_response
from swirlight.run.response import at_the_end_of_light, collect, curves, end_of_light, open_all
from swirlight.store.durable import write_json
from swirlight.store.run import open_run, read_json

AVERAGED = {"temperature": "K", "pressure": "bar", "potential_energy": "kJ mol-1"}


def write_summary(work, timings):
    """Write both files into the run folder.

    work : Work, its exposures complete; timings : phase -> seconds.
    Returns the summary.
    """
    run = open_all(open_run(work.folder.root), work.exposures)
    found = curves(run, work.exposures, work.pulses) if work.pulses else {}
    bodies = work.system.bodies
    summary = {
        "version": __version__,
        "title": work.config.title,
        "seed": work.config.seed,
        "config_hash": config_hash(work.config),
        "species": {s.name: {"count": n, "source": s.source}
                    for s, n in zip(work.system.species, work.system.counts, strict=True)},
        "spacing": {"value": work.spacing["value"], "unit": "ps", "seen": work.spacing["found"]},
        "exposures": [_exposure(run, e, bodies) for e in work.exposures],
        "averages": _averages(run, work.exposures, bodies),
        "response": at_the_end_of_light(found, work.pulses) if found else {},
        "ledgers": _ledgers(run, work.exposures, bodies),
        "heating": _heating(run, work) if found else {},
        "timings": {name: {"value": t, "unit": "s"} for name, t in timings.items()},
        "warnings": [*(read_json(work.folder.notes) or []), *_unsettled(work)],
    }
    if found:
        _draw(run, work, found)
    write_json(work.folder.summary, summary)
    return summary


def _unsettled(work):
    """A warning when equilibration was too short for the correlation times it is meant to show."""
    open_ends = [f"{what} of {name}" for name, times in work.spacing["found"].items()
                 for what, time in times.items() if not time["settled"]]
    if not open_ends:
        return []
    return [["spacing-too-short", "exposures.spacing: left out, and the last unlit stage is too"
             f" short to see the memory of {', '.join(open_ends)} fade: the starts may depend on"
             " one another; lengthen that stage, or give the spacing"]]


def _exposure(run, exposure, bodies):
    key = (exposure.kind, exposure.start, exposure.phase)
    complete = key in run and run[key].complete
    entry = {"kind": exposure.kind, "start": exposure.start, "phase": exposure.phase,
             "complete": complete}
    if complete:
        totals = run[key]
        entry["steps"] = int(totals["temperature"].steps[-1])
        entry["energy_residual"] = {
            "value": float(np.abs(np.asarray(totals["energy_residual"])).max()) / bodies,
            "unit": "kJ mol-1", "per": "body", "of": "largest magnitude",
        }
        totals.close()
    return entry


def _averages(run, exposures, bodies):
    """Means over the unlit trajectories' time, errors over starts where there are several."""
    found = {}
    kind = "dark" if any(e.kind == "dark" for e in exposures) else None
    if kind is None:
        return found
    for name, unit in AVERAGED.items():
        per_start = collect(run, exposures, lambda t, n=name: np.mean(np.asarray(t[n])))[kind]
        if not len(per_start):
            continue
        per = bodies if name == "potential_energy" else 1
        if len(per_start) > 1:
            value, error, _ = mean_and_error(per_start / per)
            error = float(error)
        else:
            series = np.asarray(run[kind, exposures[0].start, 0][name]) / per
            value, error = series.mean(), blocking_error(series)
        found[name] = {"value": float(value), "error": error, "unit": unit, "n": len(per_start)}
    return found


def _ledgers(run, exposures, bodies):
    """Kind -> what each cause gave to a body by the end, means over starts with errors."""
    found = {}
    for name, unit, per in (("light_work", "kJ mol-1", bodies), ("bias_work", "kJ mol-1", bodies),
                            ("bath_work", "kJ mol-1", bodies),
                            ("absorbed_energy", "kJ mol-1", bodies),
                            ("energy_residual", "kJ mol-1", bodies)):
        rows = collect(run, exposures, lambda t, n=name: float(t[n][-1]))
        found[name] = {
            kind: {"value": float(m), "error": float(e), "unit": unit, "per": "body"}
            for kind, values in rows.items() if len(values)
            for m, e, _ in [mean_and_error(values / per)]
        }
    return found


def _heating(run, work):
    """How warm it gets: the run's own thermometer, and what the light gave over C_V."""
    def after_light(trajectory):
        kelvin = trajectory["temperature"]
        first = int(np.searchsorted(kelvin.times, end_of_light(work.pulses)))
        return float(np.mean(kelvin[min(first, len(kelvin) - 1):]))

    rows = collect(run, work.exposures, after_light)
    lit = [kind for kind in ("plus", "minus") if kind in rows]
    if not lit or not len(rows[lit[0]]):
        return {}
    absorbed = collect(run, work.exposures, lambda t: float(t["absorbed_energy"][-1]))
    energy = np.mean([absorbed[k] for k in lit]) * units.KJ_PER_MOL
    capacity, known = _heat_capacity(work.system)
    done = collect(run, work.exposures, lambda t: float(t["light_work"][-1]))
    mechanical = np.mean([done[k] for k in lit]) * units.KJ_PER_MOL
    found = {
        "work_over_heat_capacity": {"value": float(mechanical / capacity), "unit": "K"},
        "absorbed_over_heat_capacity": {
            "value": float(energy / capacity), "unit": "K",
            "heat_capacity": "of the species' files" if known else
            "kinetic part alone where no heat capacity is given: an upper bound",
        },
    }
    if "dark" in rows:  # without the dark twin there is nothing to take it from
        value, error, _ = mean_and_error(np.mean([rows[k] for k in lit], axis=0) - rows["dark"])
        found["own_temperature"] = {"value": float(value), "error": float(error), "unit": "K",
                                    "of": "lit less dark, mean from the end of the light on"}
    return found


def _heat_capacity(system):
    """(C_V of the box, whether every species gives its own). [u nm²/ps²/K]"""
    total, known = 0.0, True
    for species, count in zip(system.species, system.counts, strict=True):
        own = species.heat_capacity
        known = known and own is not None
        kinetic = 0.5 * units.BOLTZMANN * (3 + species.freedom)
        total += count * (kinetic if own is None else own)
    return total, known


def _draw(run, work, found):
    times = np.linspace(0.0, work.config.stages[-1].length, 1000)
    intensity = sum(_intensity(pulse, times) for pulse in work.pulses)
    bodies = work.system.bodies
    curve = found["angular_momentum"]
    rows = collect(run, work.exposures,
                   lambda t: np.asarray(t["energy_residual"])[curve.rows] / bodies)
    residuals = {kind: (curve.times, values) for kind, values in rows.items()}
    draw_response(work.folder.picture, work.config.title, curve, (times, intensity), residuals,
                  end_of_light(work.pulses))


def _intensity(pulse, times):
    """Intensity of a pulse and all its copies. [W/cm²]"""
    shapes = [np.abs(pulse.amplitude_at(times - centre)) ** 2 for centre in pulse.centres]
    return pulse.intensity / pulse.amplitude**2 * np.sum(shapes, axis=(0, 2)) if pulse.amplitude \
        else np.zeros_like(times)


def summary_schema():
    """JSON Schema of summary.json."""
    figure = {
        "type": "object",
        "properties": {"value": {"type": ["number", "null"]}, "error": {"type": ["number", "null"]},
                       "unit": {"type": "string"}, "p": {"type": ["number", "null"]},
                       "at": {"type": "object"}, "n": {"type": "integer"}},
        "required": ["value", "unit"],
    }
    parts = {"type": "object", "properties": {"odd": figure, "even": figure}}
    exposure = {
        "type": "object",
        "properties": {"kind": {"enum": ["plus", "minus", "dark"]}, "start": {"type": "integer"},
                       "phase": {"type": "integer"}, "steps": {"type": "integer"},
                       "complete": {"type": "boolean"}, "energy_residual": figure},
        "required": ["kind", "start", "phase", "complete"],
    }
    properties = {
        "version": {"type": "string"}, "title": {"type": "string"}, "seed": {"type": "integer"},
        "config_hash": {"type": "string"}, "species": {"type": "object"}, "spacing": figure,
        "exposures": {"type": "array", "items": exposure},
        "averages": {"type": "object", "additionalProperties": figure},
        "response": {"type": "object", "additionalProperties": parts},
        "ledgers": {"type": "object", "additionalProperties": {
            "type": "object", "additionalProperties": figure}},
        "heating": {"type": "object", "additionalProperties": figure},
        "timings": {"type": "object", "additionalProperties": figure},
        "warnings": {"type": "array"},
    }
    return {
        "$schema": "https://json-schema.org/draft/2020-12/schema",
        "title": "swirlight summary", "type": "object", "properties": properties,
        "required": sorted(properties),
    }
