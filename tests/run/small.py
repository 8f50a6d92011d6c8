"""A run that takes about a second: a little liquid nitrogen in an averaged pulse."""

import hashlib
import os
import pathlib
import subprocess
import sys

CONFIG = """
title: a small box
seed: 3
sample:
  species: [{use: nitrogen, count: 32}]
  density: 0.806 g/cm^3
  temperature: 77.4 K
forces: {cutoff: 0.6 nm, electrostatics: none}
light:
  - {carrier: 800 nm, peak_intensity: 1e13 W/cm^2, duration: 0.1 ps, helicity: 1}
stages:
  - {name: settle, length: 0.6 ps, timestep: 4 fs,
     thermostat: {method: langevin, friction: 2 /ps}}
  - {name: exposure, length: 0.8 ps, lit: true}
exposures: {kinds: [plus, minus, dark], starts: 2, spacing: 0.2 ps}
record: {every: 20 fs, totals_every: 20 fs}
"""


def write_config(folder, text=CONFIG):
    """Write a config; return its path."""
    path = pathlib.Path(folder) / "small.yaml"
    path.write_text(text)
    return path


def command(*arguments, **options):
    """Start `swirlight` in a process of its own."""
    return subprocess.Popen(
        [sys.executable, "-m", "swirlight", *map(str, arguments)],
        stdout=subprocess.PIPE, stderr=subprocess.PIPE, text=True, env=os.environ.copy(), **options,
    )


def finish(process, timeout=240):
    """(exit code, stdout, stderr) of a process."""
    out, error = process.communicate(timeout=timeout)
    return process.returncode, out, error


def fingerprints(folder):
    """{file: SHA-256} of every HDF5 file of a run folder."""
    folder = pathlib.Path(folder)
    return {
        str(path.relative_to(folder)): hashlib.sha256(path.read_bytes()).hexdigest()
        for path in sorted(folder.rglob("*.h5"))
    }
