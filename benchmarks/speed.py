"""How fast the pair forces and whole steps are.

    python benchmarks/speed.py                      the table
    python benchmarks/speed.py --json --system water --bodies 4000 --threads 1
        --precision mixed --cutoff '0.9 nm'         one row, for programs

What is timed  A force call is one evaluation of the pair forces (Lennard-Jones and real-space
Ewald), without energies, from positions to forces and torques, with a list that is still
good: the least of many calls, everything compiled before. "List" is what choosing the inner
list costs, once in a few steps, and "cells" the outer one, once in a few dozen. A useful pair
is an unordered pair of sites of two bodies within the cutoff, counted once. Steps are NVE
steps of 2 fs with mesh Ewald and everything else a run needs, writing excepted.
Bodies start from a lattice with overlaps removed.
"""

import argparse
import json
import pathlib
import platform
import time
from importlib.metadata import version

import numpy as np
from scipy.spatial import cKDTree

from swirlight import units
from swirlight.compiled import numba
from swirlight.forces.field import ForceField
from swirlight.forces.laws import CoulombLaw
from swirlight.forces.pairs import PairForces
from swirlight.forces.sites import place_sites
from swirlight.motion.draw import draw_motion, draw_orientations
from swirlight.motion.step import Mover
from swirlight.run.arrange import lattice_positions, remove_overlaps
from swirlight.species.body import GENERAL, Species
from swirlight.species.frame import body_frame
from swirlight.species.library import load_species
from swirlight.state import State
from swirlight.system import Interactions, System

SPLITTING = 3.5  # 1/nm
TIMESTEP = 0.002  # ps


def five():
    """A body of five charged sites, invented for timing."""
    mass = np.array([12.0, 1.0, 19.0, 35.0, 80.0])
    charge = np.array([0.3, 0.1, -0.15, -0.15, -0.1])
    places = np.array([[0, 0, 0], [0, 0, 0.109], [0.13, 0, -0.04], [-0.085, 0.15, -0.05],
                       [-0.09, -0.165, -0.055]])
    frame = body_frame(places, mass, charge)
    return Species("five", "invented for timing", tuple("ABCDE"), frame.sites, mass, charge,
                   np.array([0.33, 0.22, 0.29, 0.34, 0.36]),
                   np.array([0.4, 0.08, 0.3, 1.1, 1.3]), frame.inertia, GENERAL, frame.rotation)


# Species, bodies per nm³. Liquids near room temperature, except that argon has none there.
SYSTEMS = {
    "water": (lambda: load_species("water"), 33.4),
    "acetonitrile": (lambda: load_species("acetonitrile"), 11.4),
    "atoms": (lambda: load_species("argon"), 20.4),
    "five": (five, 8.0),
}
TABLE = (("acetonitrile", 256), ("water", 500), ("water", 4000))


def prepare(name, bodies, precision, cutoff):
    """A system and a state of it, without overlaps."""
    make, density = SYSTEMS[name]
    species = make()
    charged = bool(species.charge.any())
    system = System((species,), (bodies,), Interactions(
        cutoff, precision=precision, electrostatics="mesh-ewald" if charged else "none",
        splitting=SPLITTING if charged else None))
    random = np.random.default_rng(1)
    box = np.full(3, (bodies / density) ** (1 / 3))
    nothing = np.zeros((bodies, 3))
    state = State(lattice_positions(bodies, box, random), draw_orientations(bodies, random),
                  nothing, nothing.copy(), box, random=random)
    remove_overlaps(system, state, ForceField(system, box))
    draw_motion(system, state)
    return system, state


def useful_pairs(system, state):
    """Pairs of sites of two bodies within the cutoff, each once."""
    lever = place_sites(system, state.position, state.orientation,
                        np.empty((len(system.type_of_site), 3)))
    owner = np.repeat(np.arange(system.bodies), np.diff(system.site_start))
    tree = cKDTree((state.position[owner] + lever) % state.box, boxsize=state.box)
    pairs = tree.query_pairs(system.interactions.cutoff, output_type="ndarray")
    return int((owner[pairs[:, 0]] != owner[pairs[:, 1]]).sum())


def least_ms(call, seconds=1.0):
    """The least time of one call among those of `seconds`, after a first one. [ms]"""
    call()
    best, end = np.inf, time.perf_counter() + seconds
    while time.perf_counter() < end:
        start = time.perf_counter()
        call()
        best = min(best, time.perf_counter() - start)
    return 1e3 * best


def time_forces(system, state, threads):
    """ms of a force call, of choosing the inner list, and of making the outer one."""
    numba.set_num_threads(threads)
    charged = system.interactions.electrostatics != "none"
    law = CoulombLaw("ewald" if charged else "none", system.interactions.cutoff, SPLITTING)
    pairs = PairForces(system, law, state.box)
    force, torque = np.zeros((2, system.bodies, 3))
    where = state.position, state.orientation
    call = least_ms(lambda: pairs.evaluate(*where, state.box, force, torque))
    inner = least_ms(lambda: pairs.neighbours.choose_inner(*where), 0.3)
    outer = least_ms(lambda: pairs.neighbours.make_outer(state.position, state.box), 0.3)
    return call, inner, outer


def steps_per_second(system, state, threads, steps=200):
    """Whole steps, after a first stretch that also settles the lists."""
    numba.set_num_threads(threads)
    state = state.copy()
    mover = Mover(system, ForceField(system, state.box), None, TIMESTEP)
    mover.begin(state)
    for _ in range(steps // 2):
        mover.advance(state, energies=False)
    start = time.perf_counter()
    for _ in range(steps):
        mover.advance(state, energies=False)
    return steps / (time.perf_counter() - start)


def measure(name, bodies, threads, precision, cutoff):
    """One row for each number of threads."""
    system, state = prepare(name, bodies, precision, cutoff)
    pairs = useful_pairs(system, state)
    for count in threads:
        call, inner, outer = time_forces(system, state, count)
        row = dict(system=name, bodies=bodies, threads=count, precision=precision,
                   cutoff_nm=cutoff, ms_per_force_call=call, useful_pairs=pairs,
                   ns_per_useful_pair=1e6 * call / pairs, ms_list=inner, ms_cells=outer)
        row["steps_per_second"] = steps_per_second(system, state, count)
        yield row


HEAD = "system        bodies threads precision  ms/call  ns/pair  list ms  cells ms  steps/s"


def machine():
    """What was measured on, with which versions; two lines."""
    try:
        found = [x for x in pathlib.Path("/proc/cpuinfo").read_text().splitlines()
                 if x.startswith("model name")]
        processor = found[0].partition(":")[2].strip()
    except (OSError, IndexError):
        processor = platform.processor() or platform.machine()
    vectors = "512-bit vectors" if "avx512f" in cpu_features() else "narrower vectors"
    versions = ", ".join(f"{name} {version(name)}" for name in
                         ("swirlight", "numba", "llvmlite", "numpy", "scipy"))
    return (f"{processor}, {numba.config.NUMBA_NUM_THREADS} cores, {vectors}\n"
            f"Python {platform.python_version()}, {versions}")


def cpu_features():
    """Names of the processor's features, as the compiler knows them."""
    from llvmlite import binding

    return [name for name, there in binding.get_host_cpu_features().items() if there]


def line(row):
    return (f"{row['system']:<13} {row['bodies']:>6} {row['threads']:>7} {row['precision']:<9}"
            f" {row['ms_per_force_call']:>8.3f} {row['ns_per_useful_pair']:>8.2f}"
            f" {row['ms_list']:>8.3f} {row['ms_cells']:>9.2f}"
            f" {row['steps_per_second']:>8.0f}")


def main():
    parser = argparse.ArgumentParser(description=__doc__,
                                     formatter_class=argparse.RawDescriptionHelpFormatter)
    parser.add_argument("--json", action="store_true", help="rows as JSON")
    parser.add_argument("--system", choices=SYSTEMS)
    parser.add_argument("--bodies", type=int)
    parser.add_argument("--threads", type=int, help="left out: one, then all")
    parser.add_argument("--precision", choices=("mixed", "double"), default="mixed")
    parser.add_argument("--cutoff", default="0.9 nm")
    wanted = parser.parse_args()
    cutoff = units.parse(wanted.cutoff, "length")
    most = numba.config.NUMBA_NUM_THREADS
    threads = [wanted.threads] if wanted.threads else sorted({1, min(2, most)})
    table = TABLE
    if wanted.system:
        table = ((wanted.system, wanted.bodies or 4000),)
    rows = []
    if not wanted.json:
        print(machine(), HEAD, sep="\n")
    for name, bodies in table:
        for row in measure(name, bodies, threads, wanted.precision, cutoff):
            rows.append(row)
            if not wanted.json:
                print(line(row), flush=True)
    if wanted.json:
        print(json.dumps(rows, indent=1))


if __name__ == "__main__":
    main()
