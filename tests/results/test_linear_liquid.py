"""A liquid in weak light: driven response and prediction from the dark. Long; `-m slow -s`.

Small linear molecules at liquid density, whose every number is invented but for the outline,
which is that of nitrogen in the library. Collective kernels have the same relative noise for
any number of bodies, so there are few of them and many starts.
"""

import pytest

import swirlight as sw
from swirlight.results.linear import linear_response

SPECIES = """
name: oriented-rod
source: invented
sites:
  - {label: A, mass: 14 u, at: 0 0 -0.055 nm, sigma: 0.331 nm, epsilon: 0.31 kJ/mol}
  - {label: B, mass: 14 u, at: 0 0 0.055 nm, sigma: 0.331 nm, epsilon: 0.31 kJ/mol}
light_response:
  polarizability: {principal: 1.5 1.5 2.2 angstrom^3}
  gyration: 0 0 0.4 angstrom^3
"""
CONFIG = """
title: a liquid of small rods
seed: 23
sample:
  species: [{use: oriented-rod.yaml, count: 64}]
  density: 0.806 g/cm^3
  temperature: 90 K
forces: {cutoff: 0.7 nm, electrostatics: none}
light:
  - {carrier: 800 nm, peak_intensity: 2e12 W/cm^2, duration: 0.2 ps, centre: 0.5 ps}
stages:
  - {name: settle, length: 12 ps, timestep: 4 fs,
     thermostat: {method: langevin, friction: 2 /ps}}
  - {name: exposure, length: 2.4 ps, lit: true}
exposures: {kinds: [plus, minus, dark], starts: 64, spacing: 1 ps}
record: {every: 20 fs, vectors: [orientation, angular_momentum], totals_every: 20 fs}
"""


@pytest.fixture(scope="module")
def liquid(tmp_path_factory):
    folder = tmp_path_factory.mktemp("liquid")
    (folder / "oriented-rod.yaml").write_text(SPECIES)
    (folder / "liquid.yaml").write_text(CONFIG)
    return sw.launch(sw.load_config(folder / "liquid.yaml"), into=folder / "run", progress=False,
                     threads=1)


@pytest.mark.slow
@pytest.mark.parametrize("name", ["gyration", "orientation_along_beam", "polarizability",
                                  "alignment"])
def test_a_liquid_follows_its_own_fluctuations(liquid, name, table):
    """Ratio 1 within 3 combined errors, which are at most 20 %; curves do not part."""
    r = linear_response(liquid, name)
    table(f"liquid, {name}: driven / predicted, {r.starts} starts",
          f"{r.ratio:.3f} ± {r.ratio_error:.3f}", "1 ± 0.20")
    assert r.ratio_error <= 0.2
    assert abs(r.ratio - 1) < 3 * r.ratio_error
    assert r.parted_at is None
