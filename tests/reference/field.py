"""The electric part of a force field, measured: with the Lennard-Jones part turned off."""

from dataclasses import replace

import numpy as np

from swirlight.system import System


def without_lennard_jones(system, **interactions):
    """The same system with every ε = 0, and some interactions changed."""
    bare = tuple(replace(s, epsilon=np.zeros_like(s.epsilon)) for s in system.species)
    return System(bare, system.counts, replace(system.interactions, **interactions),
                  system.temperature)


def copied(forces):
    """Forces with arrays of their own."""
    return replace(forces, force=forces.force.copy(), torque=forces.torque.copy())


def rms(array):
    """Root of the mean square over rows of vectors."""
    return float(np.sqrt((np.asarray(array) ** 2).sum(axis=-1).mean()))
