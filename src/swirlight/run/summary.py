"""summary.json and response.png: what a finished run says, from its files alone."""

import numpy as np

from swirlight import __version__
from swirlight.analysis.statistics import blocking_error, mean_and_error
from swirlight.config import config_hash
from swirlight.results.delivered import heating
from swirlight.results.response import respond
from swirlight.results.trajectories import Experiment
from swirlight.run.picture import draw_response, envelope
from swirlight.store.durable import write_json
from swirlight.store.run import open_run, read_json

AVERAGED = {"temperature": "K", "pressure": "bar", "potential_energy": "kJ mol-1"}
SIGNALS = ("light_impulse", "angular_momentum", "alignment")


def write_summary(work, timings):
    """Write both files into the run folder.

    work : Work, its exposures complete; timings : phase -> seconds.
    Returns the summary.
    """
    experiment = Experiment(open_run(work.folder.root), work.system, work.pulses)
    twins = {"plus", "minus"} <= set(experiment.kinds) and len(experiment) > 0
    found = {name: respond(experiment, name) for name in SIGNALS} if work.pulses and twins else {}
    bodies = work.system.bodies
    summary = {
        "version": __version__,
        "title": work.config.title,
        "seed": work.config.seed,
        "config_hash": config_hash(work.config),
        "species": {s.name: {"count": n, "source": s.source}
                    for s, n in zip(work.system.species, work.system.counts, strict=True)},
        "spacing": {"value": work.spacing["value"], "unit": "ps", "seen": work.spacing["found"]},
        "exposures": [_exposure(experiment.found, e, bodies) for e in work.exposures],
        "averages": _averages(experiment, bodies),
        "response": {name: response.parts() for name, response in found.items()},
        "ledgers": _ledgers(experiment, bodies),
        "heating": heating(experiment) if found else {},
        "timings": {name: {"value": t, "unit": "s"} for name, t in timings.items()},
        "warnings": [*(read_json(work.folder.notes) or []), *_unsettled(work)],
    }
    if found:
        draw_response(work.folder.picture, work.config.title, found["angular_momentum"],
                      envelope(work.pulses, work.config.stages[-1].length), found["light_impulse"])
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


def _exposure(found, exposure, bodies):
    totals = found.get((exposure.kind, exposure.start, exposure.phase))
    complete = totals is not None and totals.complete
    entry = {"kind": exposure.kind, "start": exposure.start, "phase": exposure.phase,
             "complete": complete}
    if complete:
        entry["steps"] = int(totals["temperature"].steps[-1])
        entry["energy_residual"] = {
            "value": float(np.abs(np.asarray(totals["energy_residual"])).max()) / bodies,
            "unit": "kJ mol-1", "per": "body", "of": "largest magnitude",
        }
        totals.close()
    return entry


def _averages(experiment, bodies):
    """Means over the unlit trajectories' time, errors over starts where there are several."""
    found = {}
    if "dark" not in experiment.kinds or not len(experiment):
        return found
    for name, unit in AVERAGED.items():
        per = bodies if name == "potential_energy" else 1
        rows = experiment.collect(lambda t, n=name, p=per: np.asarray(t[n]) / p, ["dark"])["dark"]
        value, error, _ = mean_and_error(rows.mean(axis=1))
        if len(rows) == 1:
            error = blocking_error(rows[0])
        found[name] = {"value": float(value), "error": float(error), "unit": unit, "n": len(rows)}
    return found


def _ledgers(experiment, bodies):
    """Kind -> what each cause gave to a body by the end, means over starts with errors."""
    found = {}
    for name in ("light_work", "bias_work", "bath_work", "absorbed_energy", "energy_residual"):
        rows = experiment.collect(lambda t, n=name: float(t[n][-1]) / bodies)
        found[name] = {
            kind: {"value": float(m), "error": float(e), "unit": "kJ mol-1", "per": "body"}
            for kind, values in rows.items() if len(values)
            for m, e, _ in [mean_and_error(values)]
        }
    return found


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
