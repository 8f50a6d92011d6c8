"""A small engine for the tests of the store: a random walk that records, checkpoints, resumes.

Everything it records depends on all steps before, so that a resume which loses or
repeats a single one shows in the bytes of the final file.
"""

import pathlib
import sys

import numpy as np

from swirlight.state import State
from swirlight.store.layout import Element, Header, Labelled
from swirlight.store.writer import TrajectoryWriter, load_checkpoint

BOX = np.array([2.0, 2.5, 3.0])
BODIES, STEPS, SEGMENT = 7, 40, 16
SPECIES = {  # labels and sites in the body frame [nm]
    "leaning top (invented)": (["A", "B", "C"], np.array(
        [[0.1, 0.0, 0.0], [-0.05, 0.08, 0.0], [-0.05, -0.08, 0.02]])),
    "argon": (["Ar"], np.zeros((1, 3))),
}
SPECIES_OF = np.array([0] * 5 + [1] * 2)


def describe(labels, sites):
    numbers = np.linspace(0.1, 0.3, len(labels))
    return {"labels": labels, "sites": Labelled(sites, "nm", {"frame": "body"}),
            "mass": Labelled(numbers, "g mol-1"), "charge": Labelled(numbers, "C"),
            "sigma": Labelled(numbers, "nm"), "epsilon": Labelled(numbers, "kJ mol-1")}


def header(first_step=100, bodies=BODIES, **changes):
    per_body = {"frame": "laboratory"}
    elements = (
        Element("position", "particles", (bodies, 3), np.float32, "nm", 4, per_body),
        Element("image", "particles", (bodies, 3), np.int32, None, 4),
        Element("orientation", "particles", (bodies, 4), np.float32, None, 4),
        Element("torque", "particles", (bodies, 3), np.float64, "kJ mol-1", 8, per_body),
        Element("temperature", "observables", (), np.float64, "K", 2, {"per": "box"}),
        Element("light/amplitude", "observables", (3, 2), np.float64, "V m-1", 2),
    )
    settings = dict(
        author="nobody in particular", timestep=0.002, first_step=first_step, box=BOX,
        species=np.resize(SPECIES_OF, bodies), species_names=tuple(SPECIES),
        mass=np.resize(SPECIES_OF, bodies) + 1.0, elements=elements,
        parameters={"config": "title: ångström\n", "seed": 41,
                    "species": {name: describe(*kind) for name, kind in SPECIES.items()}},
    )
    return Header(**{**settings, **changes})


def first_state(bodies=BODIES, first_step=100):
    random = np.random.default_rng(5)
    orientation = random.normal(size=(bodies, 4))
    orientation /= np.linalg.norm(orientation, axis=1)[:, None]
    return State(random.random((bodies, 3)), orientation, random.normal(size=(bodies, 3)),
                 random.normal(size=(bodies, 3)), BOX, step=first_step, random=random)


def advance(state):
    state.step += 1
    state.velocity += state.random.normal(size=state.velocity.shape)
    state.position += 0.1 * state.velocity
    state.orientation += 0.1 * state.random.normal(size=state.orientation.shape)
    state.orientation /= np.linalg.norm(state.orientation, axis=1)[:, None]


def frames(state, elements, first_step):
    image = np.floor(state.position / BOX)
    every = {
        "position": state.position - image * BOX,
        "image": image,
        "orientation": state.orientation,
        "torque": np.cross(state.position, state.velocity),
        "temperature": float((state.velocity**2).mean()),
        "light/amplitude": state.position[:3, :2],
    }
    due = {e.name for e in elements if (state.step - first_step) % e.every == 0}
    return {name: value for name, value in every.items() if name in due}


def run(workdir, final, steps=STEPS, segment=SEGMENT, checkpoint_every=9, stop=None, **changes):
    """Begin or go on, until the final file is there; with `stop`, only to that step."""
    if pathlib.Path(final).exists():
        return
    head = header(**changes)
    saved = load_checkpoint(workdir)
    if saved is None:
        state = first_state(len(head.species), head.first_step)
        writer = TrajectoryWriter.create(workdir, head, segment)
        writer.append(state.step, frames(state, head.elements, head.first_step))
    else:
        state = saved.payload["state"]
        writer = TrajectoryWriter.reopen(workdir, head, segment, saved)
        assert saved.step == state.step == saved.payload["nested"]["step"]
    try:
        while state.step < head.first_step + steps:
            advance(state)
            due = frames(state, head.elements, head.first_step)
            if due:
                writer.append(state.step, due)
            if writer.seal_due(state.step) or state.step % checkpoint_every == 0:
                writer.checkpoint(state.step, {"state": state, "nested": {"step": state.step}})
            if state.step == stop:
                return
        writer.finish(final)
    finally:
        writer.close()


if __name__ == "__main__":  # a writer of its own, for the tests that kill one
    run(sys.argv[1], sys.argv[2], steps=int(sys.argv[3]), segment=400, checkpoint_every=50)
