"""Plans for the tests of `check`: a small config, changed key by key, and species files."""

from swirlight.config import parse_config
from swirlight.run.plan import check_config

BASE = """\
sample:
  species:
    - {use: acetonitrile, count: 108}
  density: 0.777 g/cm^3
  temperature: 298.15 K
light:
  - carrier: 800 nm
    peak_intensity: 1e9 W/cm^2
    duration: 0.4 ps
    refractive_index: 1.34
stages:
  - name: equilibrate
    length: 10 ps
    timestep: 2 fs
    thermostat: {method: langevin, friction: 2 /ps}
  - {name: exposure, length: 4 ps, lit: true}
exposures: {kinds: [plus, minus, dark], starts: 4, spacing: 2 ps}
record: {every: 20 fs, totals_every: 20 fs}
output: runs/none
"""
DARK = BASE[: BASE.index("light:")] + BASE[BASE.index("stages:"):].replace(
    "length: 4 ps, lit: true", "length: 4 ps").replace(
    "exposures: {kinds: [plus, minus, dark], starts: 4, spacing: 2 ps}\n", "")

ROD = """\
name: rod
source: invented for a test
sites:
  - {{label: A, at: 0 0 -0.1 nm, charge: {charge} e, mass: 10 u, sigma: 0.3 nm, epsilon: 60 K}}
  - {{label: B, at: 0 0 0.1 nm, charge: -{charge} e, mass: 10 u, sigma: 0.3 nm, epsilon: 60 K}}
"""


def rod(folder, response="", charge=0.0, name="rod"):
    """Path of a species file: two masses of 10 u, 0.2 nm apart, with some light response."""
    path = folder / f"{name}.yaml"
    text = ROD.format(charge=charge).replace("name: rod", f"name: {name}")
    path.write_text(text + (f"light_response:\n{response}" if response else ""))
    return path


def config(*overrides, text=BASE, folder="."):
    """The base config with `--set` overrides."""
    return parse_config(text, folder=folder, overrides=overrides)


def plan(*overrides, text=BASE, folder="."):
    """The Plan of the base config with overrides."""
    return check_config(config(*overrides, text=text, folder=folder))


def rod_plan(folder, *overrides, response="", charge=0.0, text=BASE):
    """A Plan whose only species is a `rod`."""
    rod(folder, response, charge)
    text = text.replace("use: acetonitrile, count: 108", "use: rod.yaml, count: 256")
    return plan(*overrides, text=text, folder=folder)


def value(plan, name, section=None):
    """The value of the only row of a name."""
    found = {row.value for row in plan.find(name, section)}
    assert len(found) == 1, f"{name}: {found}"
    return found.pop()
