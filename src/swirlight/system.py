"""What does not change during a run: the species, how many of each, and how they interact."""

from dataclasses import dataclass, field
from functools import cached_property

import numpy as np

from swirlight.species.body import Species


@dataclass(frozen=True)
class Interactions:
    """How sites act on each other; every length in nm, every None chosen automatically.

    cutoff_form : "switched", "tail-corrected", "force-shifted" or "plain" (Lennard-Jones part).
    electrostatics : "mesh-ewald", "direct-ewald", "reaction-field", "damped-shifted" or "none".
    tolerance : of the Ewald force, relative to its rms.
    splitting : Ewald α. [1/nm]
    mesh_order, mesh_spacing : of the mesh. [1], [nm]
    mesh_every : steps from one calculation of the mesh part to the next.
    reaction_permittivity : ε_RF; inf means conducting.
    damping : of the damped shifted force. [1/nm]
    mixing : between different species.
    overrides : ((species, label), (species, label), sigma [nm], epsilon [u nm²/ps²]) entries.
    precision : "mixed" or "double".
    """

    cutoff: float
    cutoff_form: str = "switched"
    electrostatics: str = "mesh-ewald"
    tolerance: float = 1e-4
    splitting: float | None = None
    mesh_order: int | None = None
    mesh_spacing: float | None = None
    mesh_every: int = 1
    reaction_permittivity: float = np.inf
    damping: float = 2.0
    mixing: str = "lorentz-berthelot"
    overrides: tuple = ()
    precision: str = "mixed"


@dataclass(frozen=True)
class System:
    """N rigid bodies of a few species, listed species by species.

    The site types of all species are numbered through: those of species k are the rows
    ``type_start[k]:type_start[k+1]`` of every per-type array. The sites of all bodies are
    numbered through likewise: those of body i are ``site_start[i]:site_start[i+1]``.
    """

    species: tuple[Species, ...]
    counts: tuple[int, ...]
    interactions: Interactions
    temperature: float = field(default=298.15)  # K, of the thermostats and of drawn velocities

    @cached_property
    def bodies(self):
        """N, the number of bodies."""
        return sum(self.counts)

    @cached_property
    def species_of(self):
        """(N,) int32, the species of each body."""
        return np.repeat(np.arange(len(self.species), dtype=np.int32), self.counts)

    @cached_property
    def type_start(self):
        """(species + 1,) int32, first site type of each species."""
        sizes = [len(s.labels) for s in self.species]
        return np.concatenate([[0], np.cumsum(sizes)]).astype(np.int32)

    @cached_property
    def site_start(self):
        """(N + 1,) int32, first site of each body."""
        sizes = np.diff(self.type_start)[self.species_of]
        return np.concatenate([[0], np.cumsum(sizes)]).astype(np.int32)

    @cached_property
    def type_of_site(self):
        """(S,) int32, the type of every site of every body."""
        parts = [
            np.tile(np.arange(self.type_start[k], self.type_start[k + 1], dtype=np.int32), n)
            for k, n in enumerate(self.counts)
        ]
        return np.concatenate(parts)

    def _per_type(self, name):
        return np.ascontiguousarray(np.concatenate([getattr(s, name) for s in self.species]), float)

    @cached_property
    def type_position(self):
        """(types, 3) body-frame positions. [nm]"""
        return self._per_type("sites")

    @cached_property
    def type_charge(self):
        """(types,) [e]"""
        return self._per_type("charge")

    @cached_property
    def site_charge(self):
        """(S,) charge of every site of every body. [e]"""
        return self.type_charge[self.type_of_site]

    @cached_property
    def mass(self):
        """(N,) [u]"""
        return np.array([s.total_mass for s in self.species])[self.species_of]

    @cached_property
    def charge(self):
        """(N,) net charge of each body. [e]"""
        return np.array([s.total_charge for s in self.species])[self.species_of]

    @cached_property
    def dipole(self):
        """(N, 3) dipole of each body's charges about its centre of mass, body frame. [e nm]"""
        return np.array([s.dipole for s in self.species])[self.species_of]

    @cached_property
    def inertia(self):
        """(N, 3) principal moments. [u nm²]"""
        return np.array([s.inertia for s in self.species])[self.species_of]

    @cached_property
    def inverse_inertia(self):
        """(N, 3) reciprocal principal moments, 0 where the moment is 0. [1/(u nm²)]"""
        i = self.inertia
        return np.divide(1.0, i, out=np.zeros_like(i), where=i > 0)

    @cached_property
    def freedom(self):
        """(N,) int32 rotational degrees of freedom of each body: 0, 2 or 3."""
        return np.array([s.freedom for s in self.species], dtype=np.int32)[self.species_of]

    @cached_property
    def lennard_jones(self):
        """Two (types, types) tables, σ [nm] and ε [u nm²/ps²] between site types, symmetric.

        Inside one species its own mixing rule holds, between species that of the
        interactions; overrides win. Lorentz 1881 and Berthelot 1898: arithmetic σ,
        geometric ε; "geometric" takes the geometric mean of both.
        """
        sigma, epsilon = self._per_type("sigma"), self._per_type("epsilon")
        owner = np.repeat(np.arange(len(self.species)), np.diff(self.type_start))
        inner = np.array([s.mixing == "geometric" for s in self.species])[owner]
        geometric = np.where(
            owner[:, None] == owner[None, :],
            inner[:, None],
            self.interactions.mixing == "geometric",
        )
        arithmetic_mean = 0.5 * (sigma[:, None] + sigma[None, :])
        geometric_mean = np.sqrt(sigma[:, None] * sigma[None, :])
        s = np.where(geometric, geometric_mean, arithmetic_mean)
        e = np.sqrt(epsilon[:, None] * epsilon[None, :])
        for (name_a, label_a), (name_b, label_b), s_ab, e_ab in self.interactions.overrides:
            for a in self._types_named(name_a, label_a):
                for b in self._types_named(name_b, label_b):
                    s[a, b] = s[b, a] = s_ab
                    e[a, b] = e[b, a] = e_ab
        return s, e

    def _types_named(self, name, label):
        found = [
            self.type_start[k] + j
            for k, s in enumerate(self.species) if s.name == name
            for j, own in enumerate(s.labels) if own == label
        ]
        if not found:
            there = dict.fromkeys(f"{s.name}.{own}" for s in self.species for own in s.labels)
            raise ValueError(f"no site {name}.{label} in this sample; it has {', '.join(there)}")
        return found
