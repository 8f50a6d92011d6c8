"""The box of a sample, from its validated config, without compiled code."""

import numpy as np

from swirlight.sample import about_key


def box_edges(config, system):
    """(3,) edges: as given, of the start file, or of the cube of the density asked for. [nm]

    Raises InputError for a start file that cannot be used.
    """
    sample = config.sample
    if sample.begin_from is not None:
        from swirlight.store.start import load_state

        with about_key("sample.begin_from"):
            return load_state(config.folder / sample.begin_from, system).box
    if sample.edges is not None:
        return np.array(sample.edges, float)
    volume = float(system.mass.sum()) / sample.density
    return np.full(3, volume ** (1 / 3))
