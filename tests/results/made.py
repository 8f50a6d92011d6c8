"""Run folders whose vectors are made up, so that every correlation function is known."""

import h5py
import numpy as np

from swirlight.store.layout import Element, Header, lay_out

INTERVAL, TIMESTEP = 0.1, 0.01  # ps
CONFIG = """
title: made up
sample:
  species: [{use: water, count: 6}]
  density: 1 g/cm^3
  temperature: 300 K
light:
  - {carrier: 1 THz, peak_intensity: 1e10 W/cm^2, duration: 1 ps, in_kinds: IN_KINDS}
stages:
  - {name: settle, length: 1 ps, timestep: 10 fs}
  - {name: exposure, length: 3 ps, lit: true}
exposures: {kinds: [plus, minus, dark], starts: STARTS, spacing: 1 ps, carrier_phases: PHASES}
"""
PLAIN = """
title: made up
sample:
  species: [{use: water, count: 6}]
  density: 1 g/cm^3
  temperature: 300 K
stages: [{name: observe, length: 3 ps, timestep: 10 fs}]
"""
SHAPES = {"orientation": (4,)}
UNITS = {"torque": "kJ mol-1", "angular_momentum": "g mol-1 nm+2 ps-1", "total_dipole": "C m",
         "temperature": "K"}
GENERAL, LINEAR, ATOM = (1.0, 1.7, 2.3), (1.5, 1.5, 0.0), (0.0, 0.0, 0.0)


def write_config(folder, starts=3, phases=2, in_kinds="exposed", text=CONFIG):
    """config.yaml of a folder, which is made."""
    folder.mkdir(parents=True, exist_ok=True)
    for word, value in (("STARTS", starts), ("PHASES", phases), ("IN_KINDS", in_kinds)):
        text = text.replace(word, str(value))
    (folder / "config.yaml").write_text(text)
    return folder


def write_trajectory(path, vectors, inertia=(GENERAL,), lit=True, beam=(0.0, 0.0, 1.0), every=10):
    """One final file.

    vectors : {name: (frames, N, ...), of totals (frames, ...)}; inertia : of each species, which
    share the bodies evenly; lit : whether resolved light acts.
    """
    bodies = max((v.shape[1] for n, v in vectors.items() if not _is_total(n)), default=6)
    names = tuple(f"species-{k}" for k in range(len(inertia)))
    species = np.sort(np.arange(bodies) % len(names))
    elements = tuple(
        Element(name, "observables" if _is_total(name) else "particles", value.shape[1:],
                np.float64, UNITS.get(name), every)
        for name, value in vectors.items())
    parameters = {"species": {n: {"inertia": np.array(moments)}
                              for n, moments in zip(names, inertia, strict=True)},
                  "beam": np.array(beam)}
    if lit:
        parameters["light"] = {"0": {"coupling": "resolved", "exposed": True}}
    header = Header("nobody", TIMESTEP, 0, np.ones(3), species, names, np.ones(bodies), elements,
                    parameters)
    rows = {name: len(value) for name, value in vectors.items()}
    with h5py.File(path, "w") as file:
        places = lay_out(file, header, dict.fromkeys(rows, 0), rows, final=True)
        for name, value in vectors.items():
            places[name][...] = value


def _is_total(name):
    return name.startswith("total_") or name in ("temperature",)


def write_run(folder, make, starts=3, phases=2, **options):
    """A whole run; make : (kind, start, phase) -> vectors. Returns the folder."""
    write_config(folder, starts, phases)
    for start in range(starts):
        for kind in ("plus", "minus", "dark"):
            for phase in range(phases if kind != "dark" else 1):
                ending = f"-p{phase}" if phase else ""
                write_trajectory(folder / f"{kind}-{start:03d}{ending}.h5",
                                 make(kind, start, phase), lit=kind != "dark", **options)
    return folder


def noise(kind, start, phase, frames=31, bodies=6):
    """Vectors without any structure, different in every trajectory."""
    seed = [("plus", "minus", "dark").index(kind), start, phase]
    random = np.random.default_rng(seed)
    q = random.normal(size=(frames, bodies, 4))
    return {
        "torque": random.normal(size=(frames, bodies, 3)) + 0.4,
        "angular_momentum": random.normal(size=(frames, bodies, 3)),
        "orientation": q / np.linalg.norm(q, axis=-1, keepdims=True),
        "total_dipole": random.normal(size=(frames, 3)),
        "temperature": random.normal(size=frames),
    }
