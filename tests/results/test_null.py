"""The null experiment: plus and minus are dark runs of different starts, and nothing is found."""

from dataclasses import replace

import numpy as np
import pytest
from scipy import stats

from swirlight.config import load_config
from swirlight.results.observables import find_observable
from swirlight.results.response import Response
from swirlight.run.launch import launch

STARTS, FRAMES, APART = 16, 10, 5  # frames of 40 fs between segments
CONFIG = """
title: dark liquid nitrogen
seed: 8
sample:
  species: [{use: nitrogen, count: 32}]
  density: 0.806 g/cm^3
  temperature: 77.4 K
forces: {cutoff: 0.6 nm, electrostatics: none}
stages:
  - {name: settle, length: 4 ps, timestep: 4 fs,
     thermostat: {method: langevin, friction: 2 /ps}}
  - {name: observe, length: 1200 ps}
record: {every: 1200 ps, totals_every: 40 fs, vectors: [orientation]}
"""


@pytest.mark.slow
def test_dark_runs_of_different_starts_give_uniform_p_values(tmp_path, table):
    """62 experiments of 16 starts, each with 0.36 ps; p of the peak and of the mean over time of
    the three components of the total angular momentum, which is forgotten within 0.2 ps; by
    Kolmogorov-Smirnov, which fails once in 1000 seeds."""
    path = tmp_path / "config.yaml"
    path.write_text(CONFIG)
    run = launch(load_config(path), into=tmp_path / "run", progress=False, threads=1)
    spin = find_observable("angular_momentum").read(run["dark", 0])
    whole = len(spin) // (FRAMES + APART)
    starts = spin[: whole * (FRAMES + APART)].reshape(whole, FRAMES + APART, 3)[:, :FRAMES]
    starts = np.random.default_rng(1).permutation(starts)
    experiments = starts[: len(starts) // (2 * STARTS) * 2 * STARTS].reshape(
        -1, 2, STARTS, FRAMES, 3)
    assert len(experiments) >= 60
    null = Response(find_observable("angular_momentum"), 0.04 * np.arange(FRAMES), None, None, None,
                    np.zeros((STARTS, 1, FRAMES)), np.eye(3)[2], (0.0, 1.0))
    peaks, means = [], []
    for plus, minus in experiments:
        for axis in range(3):
            found = replace(null, plus=plus[..., axis], minus=minus[..., axis]).significance["odd"]
            peaks.append(found.peak_p)
            means.append(found.integrated_p)
    for name, values in (("peak", peaks), ("mean", means)):
        p = stats.kstest(values, "uniform").pvalue
        table(f"null experiment of dark runs, p of the {name}, KS", f"p = {p:.2g}", "> 0.001")
        assert p > 0.001
