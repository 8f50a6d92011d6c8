"""From a validated config to the system, without compiled code."""

import contextlib

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
    with about_key(f"sample.species[{index}].use"):
        return load_species(config.sample.species[index].use, folder=config.folder)


@contextlib.contextmanager
def about_key(key):
    """Put the key before a refusal that does not name file and line itself."""
    try:
        yield
    except ConfigError:
        raise
    except InputError as error:
        raise InputError(f"{key}: {error}") from None
