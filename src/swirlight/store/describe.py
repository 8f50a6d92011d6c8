"""What a trajectory file says about its species, in the units of the file."""

from scipy import constants

from swirlight.store.layout import Labelled
from swirlight.units import KJ_PER_MOL


def describe_species(species):
    """Parameters of all species, for `Header.parameters["species"]`: {name: {...}}.

    species : sequence of `swirlight.species.body.Species`.
    """
    return {kind.name: _describe(kind, index) for index, kind in enumerate(species)}


def _describe(kind, index):
    described = {
        "index": index,
        "source": kind.source,
        "labels": list(kind.labels),
        "sites": Labelled(kind.sites, "nm", {"frame": "body", "origin": "centre of mass"}),
        "mass": Labelled(kind.mass, "g mol-1"),
        "charge": Labelled(kind.charge * constants.e, "C"),
        "sigma": Labelled(kind.sigma, "nm"),
        "epsilon": Labelled(kind.epsilon / KJ_PER_MOL, "kJ mol-1"),
        "inertia": Labelled(kind.inertia, "g mol-1 nm+2"),
        "frame": Labelled(kind.frame, None, {"note": "x_body = frame (x_file - centre of mass)"}),
        "mixing": kind.mixing,
        "rotational_degrees_of_freedom": kind.freedom,
    }
    if kind.heat_capacity is not None:
        described["heat_capacity"] = Labelled(
            kind.heat_capacity / KJ_PER_MOL, "kJ mol-1 K-1",
            {"per": "body", "source": kind.heat_capacity_source},
        )
    return described
