"""How fast this machine moves bodies: measured rates, kept from run to run.

``rates.json`` in the user's cache folder holds the last measured steps per second of each
workload. One that was never run here is estimated from the machine's last measurement of any
other, scaled by the work in a step; on a machine without measurements, from a table.
"""

import contextlib
import json
import math
import os
import pathlib
from dataclasses import dataclass

MOST = 200  # rates kept; the oldest go first

# Work of one step on one core (AVX-512, 2 GHz), measured for this package.
SECONDS_PER_STEP = 4.0e-5  # whatever the size
SECONDS_PER_BODY = 1.2e-7
SECONDS_PER_PAIR = {"mixed": 2.0e-9, "double": 3.3e-9}  # of sites inside the cut-off
SECONDS_PER_MESH_CHARGE = {"mixed": 3.2e-7, "double": 5.5e-7}  # spread, transform, gather
SECONDS_PER_WAVE = 4.2e-9  # of direct Ewald: charge times wave vector
FURTHER_CORE = 0.8  # what each core after the first adds


@dataclass(frozen=True)
class Workload:
    """What decides the rate, as text, and what the table says. [steps/s]"""

    key: str
    table: float


@dataclass(frozen=True)
class Rate:
    """Steps per second, and in words where the figure comes from."""

    steps_per_second: float
    source: str


def rates_file():
    """Where measured rates are kept."""
    base = os.environ.get("XDG_CACHE_HOME") or pathlib.Path.home() / ".cache"
    return pathlib.Path(base) / "swirlight" / "rates.json"


def workload(system, box, threads=1):
    """The Workload of one trajectory of `system` in `box` [nm] on `threads` cores."""
    forces = system.interactions
    parts = [f"{n} {s.name}" for s, n in zip(system.species, system.counts, strict=True)]
    parts += [
        f"cutoff {forces.cutoff:.4g} nm", forces.electrostatics, f"tolerance {forces.tolerance:g}",
        *([f"mesh every {forces.mesh_every} steps"] if forces.mesh_every > 1 else []),
        forces.precision, f"volume {math.prod(box):.2g} nm^3", f"{threads} threads",
    ]
    shared = (
        SECONDS_PER_BODY * system.bodies
        + SECONDS_PER_PAIR[forces.precision] * pair_count(system, box)
        + _electrostatics(system, box)
    )
    seconds = SECONDS_PER_STEP + shared / (1.0 + FURTHER_CORE * (threads - 1))
    return Workload(", ".join(parts), 1.0 / seconds)


def pair_count(system, box):
    """Pairs of sites inside the cut-off, at the mean density. [1]"""
    sites = len(system.type_of_site)
    sphere = 4.0 / 3.0 * math.pi * system.interactions.cutoff**3
    return 0.5 * sites * (sites - 1) * min(sphere / math.prod(box), 1.0)


def _electrostatics(system, box):
    """Seconds a step in reciprocal space. [s]"""
    forces = system.interactions
    charges = int((system.site_charge != 0.0).sum())
    if forces.electrostatics == "mesh-ewald":
        return SECONDS_PER_MESH_CHARGE[forces.precision] * charges / forces.mesh_every
    if forces.electrostatics != "direct-ewald" or not charges:
        return 0.0
    # exp(−α²rc²) and exp(−k²/4α²) both at the tolerance
    depth = math.sqrt(math.log(1.0 / forces.tolerance))
    longest = 2.0 * depth * (forces.splitting or depth / forces.cutoff)
    waves = 0.5 * 4.0 / 3.0 * math.pi * longest**3 * math.prod(box) / (2.0 * math.pi) ** 3
    return SECONDS_PER_WAVE * charges * waves


def record_rate(load, steps_per_second):
    """Keep a measured rate of a Workload; a cache folder that cannot be written is no error."""
    if not 0.0 < steps_per_second < 1e9:
        return
    rates = _read()
    rates.pop(load.key, None)  # the newest stands last
    rates[load.key] = {"steps_per_second": float(steps_per_second), "table": load.table}
    path = rates_file()
    partial = path.with_name(f"{path.name}.{os.getpid()}.tmp")
    with contextlib.suppress(OSError):
        path.parent.mkdir(parents=True, exist_ok=True)
        partial.write_text(json.dumps(dict(list(rates.items())[-MOST:]), indent=1))
        os.replace(partial, path)


def expected_rate(load):
    """The Rate to expect of a Workload."""
    rates = _read()
    if load.key in rates:
        return Rate(rates[load.key]["steps_per_second"], "measured on this machine for this system")
    if rates:
        last = list(rates.values())[-1]
        return Rate(load.table * last["steps_per_second"] / last["table"],
                    "scaled from the last rate measured on this machine, for another system")
    return Rate(load.table, "from a table, good to a factor of 2: nothing was measured on this"
                            " machine yet")


def _read():
    """The rates kept; damaged or missing ones are as if never measured."""
    try:
        found = json.loads(rates_file().read_text())
    except (OSError, ValueError):
        return {}
    return {k: r for k, r in found.items() if _sound(r)} if isinstance(found, dict) else {}


def _sound(rate):
    return isinstance(rate, dict) and all(
        isinstance(rate.get(name), float) and 0.0 < rate[name] < math.inf
        for name in ("steps_per_second", "table")
    )
