"""Everything that `swirlight response` says of a run, as plain numbers."""

from dataclasses import asdict, dataclass

import numpy as np

from swirlight.results.delivered import control, delivered, heating
from swirlight.results.observables import OBSERVABLES, find_observable
from swirlight.results.response import CLEAR, Response, respond
from swirlight.results.trajectories import Experiment
from swirlight.store.run import open_run

TURNING = ("light_impulse", "angular_momentum")  # the signals that the answer rests on


@dataclass(frozen=True)
class Overview:
    """experiment : Experiment; drawn : the Response to draw; impulse : that of the light impulse;
    content : plain numbers, texts."""

    experiment: Experiment
    drawn: Response
    impulse: Response
    content: dict


def overview(folder, of=None, level=CLEAR):
    """The `Overview` of a run folder.

    of : name of one observable, drawn and tabulated besides those that the answer rests on;
        None: all that were recorded and are not zero in all kinds, the angular momentum drawn.
    level : p for which starts are planned.
    Raises InputError as `swirlight.response` does.
    """
    experiment = Experiment(open_run(folder))
    drawn = respond(experiment, of or "angular_momentum")
    names = [find_observable(of).name] if of else _recorded(experiment)
    found = {name: drawn if name == drawn.observable.name else respond(experiment, name)
             for name in dict.fromkeys([*TURNING, *names])}
    found = {name: r for name, r in found.items() if name in TURNING or of or not _empty(r)}
    content = {
        "title": experiment.config.title, "starts": len(experiment), "level": level,
        "response": {name: r.parts(level=level) for name, r in found.items()},
        "pairing": _pairing(found["angular_momentum"]),
        "delivered": {name: asdict(figure) for name, figure in delivered(experiment).items()},
        "heating": heating(experiment), "control": control(experiment), "notes": _notes(found),
        "drawn": _curves(drawn),
    }
    return Overview(experiment, drawn, found["light_impulse"], content)


def _recorded(experiment):
    first = experiment.first("plus")
    names = [name for name, o in OBSERVABLES.items() if o.source in first]
    first.close()
    return names


def _empty(response):
    """Whether there is nothing at all: a thermostat's impulse without thermostat, the alignment
    of atoms."""
    kinds = [response.plus, response.minus]
    return not any(np.any(np.nan_to_num(values)) for values in kinds)


def _pairing(response):
    """What the twins gain for the angular momentum at the end of the light."""
    row = response.row_at(response.span[1])
    phases = response.phase_gain
    return {"at": float(response.times[row]), "gain": float(response.gain[row]),
            "parted": response.parted, "phases": response.odd_by_phase.shape[1],
            "phase_gain": None if phases is None else float(phases[row])}


def _notes(found):
    """Notes of all; those that not all share name their observable."""
    shared = set.intersection(*(set(r.notes) for r in found.values()))
    notes = [note for note in next(iter(found.values())).notes if note in shared]
    for response in found.values():
        notes += [f"{response.observable.label}: {note}" for note in response.notes
                  if note not in shared]
    return notes


def _curves(response):
    along = response.along
    peaks = {part: asdict(response.peak(part)) for part in ("odd", "even")
             if along.of_starts(part) is not None and not np.isnan(along.of_starts(part)).any()}
    return {
        "observable": response.observable.name, "unit": response.unit, "along": "beam",
        "times": along.times, "odd": along.odd, "odd_error": along.odd_error, "even": along.even,
        "even_error": along.even_error, "gain": along.gain, "phase_gain": along.phase_gain,
        "peak": peaks,
    }
