"""`swirlight check`: everything that can be said of a run before it starts.

Each part is a generator of `Section` and `Notice` objects from one `Subject`; adding a part
means one function and its name in `PARTS`. Nothing compiled is imported here.
"""

import numpy as np

from swirlight.errors import ConfigError, InputError
from swirlight.forces.box import check_box
from swirlight.light.build import bias_from_config, pulses_from_config
from swirlight.light.response import choose_response
from swirlight.run.exposures import list_exposures
from swirlight.run.plan import cost, light, sample, stages
from swirlight.run.plan.echo import echo
from swirlight.run.plan.page import Notice, Plan, Row, Section
from swirlight.run.plan.subject import Subject
from swirlight.run.sample import box_edges
from swirlight.sample import build_system

__all__ = ["Notice", "Plan", "Row", "Section", "check", "check_config"]

PARTS = (
    echo,
    sample.sample,
    sample.bodies,
    light.pulses,
    light.strengths,
    light.heating,
    light.bias,
    light.odd_part,
    stages.boundary,
    stages.stages,
    stages.record,
    stages.trajectories,
    cost.cost,
)


def check_config(config):
    """The Plan of a validated config.

    config : of `load_config`.
    Raises InputError, naming the key, for a sample that cannot be built, a box too small for the
    cutoff, light that a timestep cannot follow or that a species has no response for.
    """
    subject = examine(config)
    sections, warnings = [], []
    for part in PARTS:
        for found in part(subject):
            (warnings if isinstance(found, Notice) else sections).append(found)
    warnings = tuple(dict.fromkeys(warnings))  # several pulses may say the same
    return Plan(config.title, tuple(sections), warnings, lit=bool(subject.pulses))


check = check_config  # as the package calls it


def examine(config):
    """The Subject of a config; refuses what cannot run. Raises InputError as `check_config`."""
    system = _named(config, "sample", build_system, config)
    if not system.bodies:
        raise ConfigError(config.message("no bodies; at least one count must not be 0",
                                         "sample.species"))
    _named(config, "forces.pairs", _pair_tables, system)
    box = _named(config, "sample", box_edges, config, system)
    _named(config, "forces.cutoff", check_box, box, system.interactions.cutoff, system.bodies)
    _named(config, "forces.electrostatics", _require_neutral, system)
    last = config.stages[-1]
    pulses = _named(config, "light", pulses_from_config, config.light, system, last)
    for n, pulse in enumerate(pulses):
        for species in system.species:
            _named(config, f"light[{n}].carrier", choose_response, species, pulse.carrier,
                   pulse.coupling == "resolved")
    return Subject(
        config=config, system=system, box=np.asarray(box, float), pulses=pulses,
        bias=bias_from_config(config.bias_field), lit=last if pulses else None,
        lit_length=last.length if pulses else 0.0,
        exposures=tuple(list_exposures(config, pulses)),
    )


def _pair_tables(system):
    """Pair overrides name sites by the names in the species files: known only here."""
    try:
        return system.lennard_jones
    except ValueError as error:
        raise InputError(str(error)) from None


def _require_neutral(system):
    kind = system.interactions.electrostatics
    charge = float(system.charge.sum())
    if "ewald" in kind and abs(charge) > 1e-8 * max(float(np.abs(system.site_charge).sum()), 1.0):
        raise InputError(f"{kind} needs a neutral box, and this one has {charge:.6g} e")


def _named(config, key, function, *arguments):
    """Call a function; its refusal gets file, line and key before it, if it has none itself."""
    try:
        return function(*arguments)
    except ConfigError:  # of a species file: it names file, line and key
        raise
    except InputError as error:
        raise ConfigError(config.message(str(error), key)) from None
