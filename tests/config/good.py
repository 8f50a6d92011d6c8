"""A config that uses every key."""

GOOD = """\
title: Spinning up a chilled polar solvent
seed: 41
author: not given
sample:
  species:
    - {use: acetonitrile, count: 256}
    - {use: water, count: 8}
  density: 0.777 g/cm^3
  temperature: 298.15 K
  arrangement: lattice
forces:
  cutoff: 1.0 nm
  cutoff_form: switched
  electrostatics: mesh-ewald
  tolerance: 1e-4
  splitting: auto
  mesh: {order: 5, spacing: 0.1 nm}
  mesh_every: 1
  reaction_permittivity: conducting
  damping: 2.0 /nm
  mixing: lorentz-berthelot
  pairs:
    - {between: [water.O, acetonitrile.Me], sigma: 0.33 nm, epsilon: 0.8 kJ/mol}
  precision: mixed
light:
  - carrier: 1.0 THz
    peak_intensity: 2e10 W/cm^2
    envelope: gaussian
    duration: 1.0 ps
    centre: 3.0 ps
    helicity: 1
    azimuth: 0 deg
    turning: {rate: 0 rad/ps, acceleration: 0 rad/ps^2}
    phase: 0 deg
    direction: z
    train: {count: 1, period: 10 ps}
    coupling: auto
    refractive_index: 1.0
    local_field: none
    in_kinds: exposed
  - carrier: 800 nm
    fluence: 20 mJ/cm^2
    envelope: flat-top
    rise: 50 fs
    duration: 300 fs
    ellipticity: 30 deg
    direction: [0, 1, 1]
    in_kinds: same
bias_field: {vector: 0 0 1e7 V/m, from: 0 ps, to: 5 ps}
stages:
  - name: equilibrate
    length: 40 ps
    timestep: 2 fs
    thermostat: {method: langevin, friction: 2 /ps, acts_on: all}
  - {name: exposure, after_light: 6 ps, lit: true}
exposures:
  kinds: [plus, minus, dark]
  starts: 16
  spacing: 10 ps
  carrier_phases: 2
record:
  every: 20 fs
  vectors: [light_torque, torque, angular_momentum, orientation]
  precision: single
  totals_every: 10 fs
output: runs/chilled-solvent
"""
