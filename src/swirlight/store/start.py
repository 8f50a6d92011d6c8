"""Start files: one state of the liquid in full precision, and the way back.

    /state/  position (N, 3) unwrapped [nm], orientation (N, 4), velocity (N, 3) [nm/ps],
             angular_momentum (N, 3) [u nm²/ps], box (3,) [nm]      all float64
             species (N,)     which species each body is, by name
             step             steps taken since the run began
             generator        state of the random generator, JSON text

A checkpoint holds the same group: `load_state` reads both.
"""

import json

import h5py
import numpy as np

from swirlight.errors import InputError
from swirlight.state import State
from swirlight.store.durable import write_bytes
from swirlight.store.layout import FORMAT, Labelled, write_dataset

UNITS = {
    "position": "nm",
    "orientation": None,
    "velocity": "nm ps-1",
    "angular_momentum": "g mol-1 nm+2 ps-1",
    "box": "nm",
}
WIDTH = {"position": 3, "orientation": 4, "velocity": 3, "angular_momentum": 3}


def save_state(path, state, system=None):
    """Write a start file, whole or not at all.

    state : `swirlight.state.State`.
    system : `swirlight.system.System`; without it the file does not say which species
        its bodies are, and the reader has to know.
    Raises OSError when it cannot be written.
    """
    with h5py.File("image", "w", driver="core", backing_store=False, **FORMAT) as file:
        names = None if system is None else tuple(s.name for s in system.species)
        species = None if system is None else system.species_of
        write_state(file.create_group("state"), state, species, names)
        file.flush()
        image = file.id.get_file_image()
    write_bytes(path, image)


def write_state(group, state, species=None, names=None):
    """Write a state into an HDF5 group. species : (N,) index into names, both or neither."""
    for name, unit in UNITS.items():
        write_dataset(group, name, Labelled(getattr(state, name), unit))
    if species is not None:
        kinds = h5py.enum_dtype({n: k for k, n in enumerate(names)}, basetype="i4")
        group.create_dataset("species", data=np.asarray(species, np.int32), dtype=kinds)
    group["step"] = np.int64(state.step)
    write_dataset(group, "generator", state.generator_text())


def load_state(path, system=None):
    """Read a start file (or a checkpoint) back as a `State`.

    system : when given, the bodies must be of its species, in its order.
    Raises InputError naming the file and what is wrong with it.
    """
    try:
        with h5py.File(path, "r", locking=False) as file:
            if "state" not in file:
                raise InputError(f"{path}: not a start file (it has no /state)")
            state = read_state(file["state"], path)
            if system is not None:
                _check_species(file["state"], system, path)
    except OSError as error:
        raise InputError(f"{path}: cannot be read as a start file: {error}") from None
    return state


def read_state(group, path):
    """Read a state from an HDF5 group; raises InputError where it breaks the format's rules."""
    problems = state_problems(group)
    if problems:
        raise InputError("\n".join(f"{path}:{problem}" for problem in problems))
    arrays = {name: group[name][()] for name in UNITS}
    state = State(**arrays, step=int(group["step"][()]))
    state.set_generator(group["generator"][()].decode())
    return state


def state_problems(group):
    """What in this group breaks the rules of a state, as a list of texts; empty if nothing."""
    missing = [name for name in (*UNITS, "step", "generator") if name not in group]
    if missing:
        return [f"{group.name}: without {', '.join(missing)}"]
    problems = []

    def rule(holds, name, text):
        if not holds:
            problems.append(f"{group.name}/{name}: {text}")

    arrays = {name: group[name] for name in UNITS}
    bodies = arrays["position"].shape[0] if arrays["position"].ndim else 0
    for name, data in arrays.items():
        shape = (bodies, WIDTH[name]) if name in WIDTH else (3,)
        rule(data.shape == shape and bodies > 0, name, f"shape {data.shape}, expected {shape}")
        rule(data.dtype == np.float64, name, f"stored as {data.dtype}, expected float64")
        rule(bool(np.isfinite(data[()]).all()), name, "values that are not finite numbers")
    if not problems:
        worst = np.abs(np.linalg.norm(arrays["orientation"][()], axis=1) - 1.0).max()
        rule(worst < 1e-6, "orientation", f"not unit quaternions (off by {worst:.1e})")
        rule(bool((arrays["box"][()] > 0).all()), "box", "edges must be positive")
    if "species" in group:
        rule(group["species"].shape == (bodies,), "species", f"expected one per body, {bodies}")
    try:
        recorded = json.loads(group["generator"][()].decode())
        getattr(np.random, recorded["bit_generator"])().state = recorded
    except (ValueError, TypeError, KeyError, AttributeError) as error:
        rule(False, "generator", f"not the state of a generator ({error})")
    return problems


def species_of(group):
    """Name of the species of each body, (N,) array of texts; None when the file does not say."""
    if "species" not in group:
        return None
    kinds = h5py.check_enum_dtype(group["species"].dtype)
    names = {index: name for name, index in kinds.items()}
    return np.array([names[index] for index in group["species"][()]])


def _check_species(group, system, path):
    bodies = group["position"].shape[0]
    if bodies != system.bodies:
        raise InputError(f"{path}: holds {bodies} bodies, the sample {system.bodies}")
    found = species_of(group)
    if found is None:
        return
    asked = np.array([s.name for s in system.species])[system.species_of]
    if not np.array_equal(found, asked):
        def count(names):
            return ", ".join(f"{(names == n).sum()} {n}" for n in dict.fromkeys(names))
        raise InputError(f"{path}: holds {count(found)}; the sample is {count(asked)}")
