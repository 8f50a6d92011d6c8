"""What is recorded at which tick: the bridge from the observe room to the store."""

import numpy as np

from swirlight.observe import totals, vectors
from swirlight.rotation import body_axes
from swirlight.run.spacing import WATCHED
from swirlight.store.layout import Element


class Recorder:
    """Frames of one trajectory, due by ticks.

    system : System; beam : (3,) axis that projections refer to.
    record : the config's record section.
    clock : Clock of the trajectory.
    with_vectors : whether vectors are recorded (else totals only).
    lit : whether light or a bias field acts, so that their totals exist.
    watch : also record a few bodies' momenta and axes, to find the spacing of starts.
    """

    def __init__(self, system, beam, record, clock, with_vectors, lit, watch=False):
        self.system, self.beam = system, beam
        self._totals = tuple(t for t in totals.TOTALS.values() if lit or not t.lit)
        self._totals_every = clock.stride(record.totals_every)
        self._vectors = vectors.chosen(record.vectors) if with_vectors else ()
        self._vectors_every = clock.stride(record.every) if with_vectors else 0
        self._real = np.float32 if record.precision == "single" else np.float64
        self._watched = watched_bodies(system) if watch else None
        self.latest = {"temperature": None, "residual": None}

    @property
    def elements(self):
        """Store Elements of everything recorded."""
        n = self.system.bodies
        found = [
            Element(v.name, "particles", (n, *v.shape), np.int32 if v.integer else self._real,
                    v.unit, self._vectors_every, v.attributes)
            for v in self._vectors
        ] + [
            Element(t.name, "observables", t.shape, np.float64, t.unit, self._totals_every,
                    t.attributes)
            for t in self._totals
        ]
        if self._watched is not None:
            shape = (len(self._watched), 3)
            found += [
                Element("watched/angular_momentum", "observables", shape, np.float32,
                        "g mol-1 nm+2 ps-1", self._totals_every, {"frame": "laboratory"},
                        ("watched", "component")),
                Element("watched/axis_z", "observables", shape, np.float32, None,
                        self._totals_every, {"frame": "laboratory"}, ("watched", "component")),
            ]
        return tuple(found)

    def energies_due(self, tick):
        """Whether this tick's energies will be read."""
        return tick % self._totals_every == 0

    def frames(self, tick, state, mover):
        """{element name: frame} of everything due at this tick; empty if nothing is."""
        due = {}
        if self._vectors and tick % self._vectors_every == 0:
            due = {v.name: v.sample(self.system, state, mover.load) for v in self._vectors}
        if self.energies_due(tick):
            due |= totals.sample(mover, state, self._totals, self.beam)
            self.latest = {
                "temperature": float(due["temperature"]),
                "residual": float(due["energy_residual"]) / self.system.bodies,
            }
            if self._watched is not None:
                rows = self._watched
                due["watched/angular_momentum"] = state.angular_momentum[rows]
                due["watched/axis_z"] = body_axes(state.orientation[rows])[:, 2]
        return due


def watched_bodies(system):
    """Indices of the first `WATCHED` bodies of each species that can rotate."""
    first = np.concatenate([[0], np.cumsum(system.counts)])
    return np.concatenate([
        np.arange(first[k], min(first[k] + WATCHED, first[k + 1]))
        for k, s in enumerate(system.species) if s.freedom > 0
    ] or [np.arange(0)])
