"""Parts of `check` about time: stages, baths, what a timestep and a record interval resolve."""

import math

import numpy as np

from swirlight.light.describe import end_of_light
from swirlight.light.limits import which_field
from swirlight.light.regime import beats
from swirlight.run.plan.page import Notice, Row, Section, quantity

ROTATION_STEPS = 40  # timesteps in the fastest thermal rotation; librations are a few times faster
MESH_EVALUATIONS = 75  # likewise, if the mesh has a step of its own: 4.2 fs for water
THERMAL_BAND = 4.0  # thermal rates √(kT/I): hardly a body turns faster
LIBRATIONS = "librations are usually several times faster than free rotation"


def stages(subject):
    """Each stage, and how well its timestep follows the fastest rotation."""
    for n, stage in enumerate(subject.config.stages):
        key, bath = f"stages[{n}]", stage.thermostat
        rows = [
            quantity("length", stage.length, "time"),
            quantity("timestep", stage.timestep, "time"),
            Row("steps", stage.steps),
            Row("bath", "none: energy is conserved" if bath.method == "none"
                else f"{bath.method} on {bath.acts_on}"),
            Row("light", "on" if stage.lit else "off"),
        ]
        if bath.method != "none":
            rows.append(quantity("friction", bath.friction, "rate"))
        if math.isfinite(subject.rotation_period):
            steps = subject.rotation_period / stage.timestep
            rows.append(Row("steps per fastest rotation", steps, "", LIBRATIONS))
            if steps < ROTATION_STEPS:
                yield Notice("steps-per-rotation", f"{key}.timestep: {steps:.3g} timesteps in the"
                             f" fastest thermal rotation; {ROTATION_STEPS} would be"
                             f" {subject.rotation_period / ROTATION_STEPS:.3g} ps")
        every = subject.system.interactions.mesh_every
        if every > 1:
            rows.append(quantity("mesh every", every * stage.timestep, "time"))
            yield from _mesh_every(key, every * stage.timestep, subject)
        yield Section(f"{key}: {stage.name}", tuple(rows))
        if stage.lit:
            yield from _bath_on_rotation(key, stage, subject)


def _mesh_every(key, interval, subject):
    if interval > subject.rotation_period / MESH_EVALUATIONS * (1.0 + 1e-9):
        yield Notice("mesh-every", f"forces.mesh_every: in {key} the mesh acts every"
                     f" {1e3 * interval:.3g} fs; {LIBRATIONS}, and impulses that come at a"
                     " fraction of their period pump energy into them. Let them come at most"
                     f" {1e3 * subject.rotation_period / MESH_EVALUATIONS:.2g} fs apart, or watch"
                     " energy_residual")


def _bath_on_rotation(key, stage, subject):
    bath = stage.thermostat
    if bath.method == "none" or bath.acts_on == "translation" or not bath.friction:
        return
    after = max(stage.length - max(end_of_light(subject.pulses), 0.0), 0.0)
    yield Notice("bath-on-rotation", f"{key}.thermostat: it acts on rotation while the light is"
                 f" on and for {after:.3g} ps after: an induced spin relaxes within 1/friction ="
                 f" {1.0 / bath.friction:.3g} ps, whatever the liquid would do")


def record(subject):
    """What the record intervals can show: their Nyquist frequencies against all that moves."""
    settings = subject.config.record
    intervals = {"totals": settings.totals_every}
    if settings.vectors:
        intervals = {"vectors": settings.every} | intervals
    band = highest_rotation(subject)
    carrier = max((p.carrier for p in subject.pulses if p.coupling == "resolved"), default=0.0)
    beat = max((b for _, _, b, together in beats(subject.pulses, subject.system) if together),
               default=0.0)
    rows = [quantity("fastest rotations", band, "carrier",
                     f"{THERMAL_BAND:g} times the thermal rate of the fastest body; {LIBRATIONS}")]
    for name, every in intervals.items():
        rows.append(quantity(f"{name} every", every, "time"))
        rows.append(quantity(f"{name} show up to", math.pi / every, "carrier", "Nyquist"))
    yield Section("record", tuple(rows))
    for name, every in intervals.items():
        key = "record.every" if name == "vectors" else "record.totals_every"
        yield from _nyquist(key, name, every, band, carrier, beat)


def highest_rotation(subject):
    """Angular frequency above which hardly a body rotates. [rad/ps]"""
    if not math.isfinite(subject.rotation_period):
        return 0.0
    return THERMAL_BAND * 2.0 * math.pi / subject.rotation_period


def _nyquist(key, name, every, band, carrier, beat):
    limit = math.pi / every * (1.0 + 1e-9)
    if band > limit:
        yield Notice("nyquist-rotation", f"{key}: every {every:.4g} ps {name} miss the fastest"
                     f" rotations; {math.pi / band:.2g} ps would show them")
    # torques and powers of a resolved carrier go at twice its frequency
    for code, speed, what in (("nyquist-carrier", 2.0 * carrier, "twice the resolved carrier"),
                              ("nyquist-beat", beat, "the beat of the averaged pulses")):
        if speed > limit:
            yield Notice(code, f"{key}: every {every:.4g} ps {name} miss {what}, at which torques"
                         f" move; {math.pi / speed:.2g} ps would show it")


def trajectories(subject):
    """How many trajectories there are, of what kinds, and how independent their starts are."""
    exposures, settings = subject.exposures, subject.config.exposures
    kinds = list(dict.fromkeys(e.kind for e in exposures))
    rows = []
    for kind in kinds:
        own = [e for e in exposures if e.kind == kind]
        starts = len({e.start for e in own})
        rows.append(Row(kind, len(own), "trajectories",
                        _product(starts, own[0].phases)))
    rows.append(Row("trajectories", len(exposures)))
    if settings is not None and settings.starts > 1:
        rows.append(Row("spacing", "chosen while equilibrating", "", "three times the slowest"
                        " correlation time") if settings.spacing is None
                    else quantity("spacing", settings.spacing, "time"))
    yield Section("trajectories", tuple(rows))
    if subject.pulses and len({e.start for e in exposures}) < 2:
        yield Notice("one-start", "exposures.starts: one start gives no standard error: errors"
                     " come from the spread over independent starts")
    alone = {"plus", "minus"} & set(kinds)
    if subject.pulses and settings is not None and len(alone) == 1:
        yield Notice("no-twin", f"exposures.kinds: {alone.pop()} without its mirror image gives"
                     " neither even nor odd response")


def boundary(subject):
    """What the electrostatics make of an applied field."""
    said = which_field(subject.system.interactions.electrostatics)
    field = subject.bias is not None or any(p.coupling == "resolved" for p in subject.pulses)
    if said and field and np.any(subject.system.type_charge):
        yield Notice("applied-field", f"forces.electrostatics: {said}")


def _product(starts, phases):
    def counted(n, word):
        return f"{n} {word}" + "s" * (n != 1)

    return f"{counted(starts, 'start')} × {counted(phases, 'carrier phase')}"
