"""Runs of bodies without interactions: cheap, and every start is many independent bodies."""

import swirlight as sw

ROD = """
name: lone-rod
source: invented
sites:
  - {label: A, mass: 14 u, at: 0 0 0 nm, charge: 0.4 e}
  - {label: B, mass: 19 u, at: 0 0 0.15 nm, charge: -0.4 e}
light_response:
  at: 800 nm
  polarizability: {principal: 4 4 9 angstrom^3}
  absorptive_polarizability: {principal: 0.6 0.6 0.9 angstrom^3}
  gyration: 0 0 2.5 angstrom^3
"""
SLAB = """
name: lone-slab
source: invented
sites:
  - {label: A, mass: 14 u, at: 0 0 0 nm}
  - {label: B, mass: 16 u, at: 0.15 0.02 0 nm, charge: 0.3 e}
  - {label: C, mass: 19 u, at: -0.04 0.16 0 nm, charge: -0.3 e}
light_response:
  at: 800 nm
  polarizability: {principal: 5 6 9 angstrom^3}
  absorptive_polarizability: {principal: 0.3 0.5 0.7 angstrom^3}
"""
OPTICAL = "{carrier: 800 nm, peak_intensity: 6e11 W/cm^2, duration: 0.2 ps, centre: 0.5 ps}"
TERAHERTZ = """{carrier: 1 THz, peak_field: 6e7 V/m, duration: 1 ps, centre: 2.2 ps, helicity: 1,
   coupling: resolved}"""
CONFIG = """
title: bodies that do not see each other
seed: 5
sample:
  species: [{{use: lone-rod.yaml, count: 70}}, {{use: lone-slab.yaml, count: 30}}]
  edges: [4 nm, 4 nm, 4 nm]
  temperature: 300 K
forces: {{cutoff: 0.3 nm, electrostatics: none}}
light:
  - {light}
stages:
  - {{name: settle, length: 2 ps, timestep: 20 fs,
     thermostat: {{method: langevin, friction: 3 /ps}}}}
  - {{name: exposure, length: {length}, lit: true,
     thermostat: {{method: langevin, friction: 3 /ps}}}}
exposures: {{kinds: [plus, minus, dark], starts: {starts}, spacing: 1 ps}}
record: {{every: 40 fs, vectors: [orientation, angular_momentum], totals_every: 20 fs}}
"""


def launch(folder, light=OPTICAL, length="4 ps", starts=8):
    """The finished run."""
    folder.mkdir(exist_ok=True)
    for name, text in (("lone-rod", ROD), ("lone-slab", SLAB)):
        (folder / f"{name}.yaml").write_text(text)
    path = folder / "gas.yaml"
    path.write_text(CONFIG.format(light=light, length=length, starts=starts))
    return sw.launch(sw.load_config(path), into=folder / "run", progress=False, threads=1)
