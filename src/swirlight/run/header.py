"""What a trajectory file says about where it comes from, beside its frames."""

from scipy import constants

from swirlight import __version__, units
from swirlight.light.exposure import exposed
from swirlight.motion.freedom import conserves_momentum, degrees_of_freedom
from swirlight.motion.thermostats import make_thermostat
from swirlight.store.layout import Header, Labelled

KJ = 1.0 / units.KJ_PER_MOL


def file_header(work, legs, clock, box, elements, about):
    """The store Header of one trajectory.

    work : Work; legs, clock : of the trajectory; box : (3,) [nm]; elements : what is recorded.
    about : what kind of trajectory it is, as plain values (kind, start, phase).
    """
    system, config = work.system, work.config
    parameters = {
        "config": work.folder.config_file.read_text(encoding="utf-8"),
        "seed": config.seed,
        "version": __version__,
        "about": about,
        "stages": _stages(system, legs),
        "species": {s.name: _species(s, n)
                    for s, n in zip(system.species, system.counts, strict=True)},
    }
    pulses = legs[-1].pulses
    if pulses:
        parameters["light"] = {str(i): _pulse(p) for i, p in enumerate(pulses)}
    if work.pulses:
        parameters["beam"] = Labelled(work.beam, attributes={"of": "the first exposed pulse"})
    return Header(
        author=config.author, timestep=clock.tick, first_step=0, box=box,
        species=system.species_of, species_names=tuple(s.name for s in system.species),
        mass=system.mass, elements=elements, parameters=parameters,
    )


def _stages(system, legs):
    found = {}
    for index, leg in enumerate(legs):
        thermostat = make_thermostat(system, **leg.thermostat)
        kept = conserves_momentum(system, thermostat, leg)
        freedom = degrees_of_freedom(system, kept)
        found[f"{index}-{leg.name}"] = {
            "steps": leg.steps,
            "timestep": Labelled(leg.timestep, "ps"),
            "thermostat": leg.thermostat["method"],
            "freedom_translation": freedom.translation,
            "freedom_rotation": freedom.rotation,
        }
    return found


def _species(species, count):
    return {
        "count": count,
        "source": species.source,
        "labels": list(species.labels),
        "sites": Labelled(species.sites, "nm", {"frame": "body"}),
        "mass": Labelled(species.mass, "g mol-1"),
        "charge": Labelled(species.charge * constants.e, "C"),
        "sigma": Labelled(species.sigma, "nm"),
        "epsilon": Labelled(species.epsilon * KJ, "kJ mol-1"),
        "inertia": Labelled(species.inertia, "g mol-1 nm+2"),
        "frame": Labelled(species.frame, attributes={"note": "body = frame @ file's frame"}),
    }


def _pulse(pulse):
    return {
        "s3": pulse.s3,
        "carrier": Labelled(pulse.carrier, "rad ps-1"),
        "amplitude": Labelled(pulse.amplitude / units.VOLT_PER_METRE, "V m-1"),
        "intensity": Labelled(pulse.intensity, "W cm-2"),
        "centre": Labelled(pulse.centre, "ps"),
        "duration": Labelled(pulse.envelope.duration, "ps"),
        "phase": Labelled(pulse.phase, "rad"),
        "direction": pulse.beam,
        "coupling": pulse.coupling,
        "exposed": bool(exposed((pulse,))),
    }
