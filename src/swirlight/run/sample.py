"""From a validated config to the sample: the system and its box, without compiled code."""

import contextlib

import numpy as np

from swirlight.errors import ConfigError, InputError
from swirlight.species.library import load_species
from swirlight.system import Interactions, System


def build_system(config):
    """The System that a config describes.

    Raises InputError for species that cannot be used.
    """
    species = tuple(_species(config, i) for i in range(len(config.sample.species)))
    forces = config.forces
    interactions = Interactions(
        cutoff=forces.cutoff,
        cutoff_form=forces.cutoff_form,
        electrostatics=forces.electrostatics,
        tolerance=forces.tolerance,
        splitting=forces.splitting,
        mesh_order=forces.mesh.order if forces.mesh else None,
        mesh_spacing=forces.mesh.spacing if forces.mesh else None,
        mesh_every=forces.mesh_every,
        reaction_permittivity=forces.reaction_permittivity,
        damping=forces.damping,
        mixing=forces.mixing,
        overrides=tuple((*p.sites, p.sigma, p.epsilon) for p in forces.pairs),
        precision=forces.precision,
    )
    counts = tuple(s.count for s in config.sample.species)
    return System(species, counts, interactions, temperature=config.sample.temperature)


def _species(config, index):
    with _about(f"sample.species[{index}].use"):
        return load_species(config.sample.species[index].use, folder=config.folder)


@contextlib.contextmanager
def _about(key):
    """Put the key before a refusal that does not name file and line itself."""
    try:
        yield
    except ConfigError:
        raise
    except InputError as error:
        raise InputError(f"{key}: {error}") from None


def box_edges(config, system):
    """(3,) edges: as given, of the start file, or of the cube of the density asked for. [nm]

    Raises InputError for a start file that cannot be used.
    """
    sample = config.sample
    if sample.begin_from is not None:
        from swirlight.store.start import load_state

        with _about("sample.begin_from"):
            return load_state(config.folder / sample.begin_from, system).box
    if sample.edges is not None:
        return np.array(sample.edges, float)
    volume = float(system.mass.sum()) / sample.density
    return np.full(3, volume ** (1 / 3))
