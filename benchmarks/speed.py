"""How fast the pair forces and whole steps are.

    python benchmarks/speed.py             all tables; some ten minutes on an idle machine
    python benchmarks/speed.py --quick     their main rows, in a minute or two
    python benchmarks/speed.py --json --system water --bodies 4000 --threads 1
        --precision mixed --cutoff '0.9 nm'         one row as a JSON object, for programs

Times are medians of several rounds, ratios medians of the ratios of measurements taken in
turns (timing.py); nothing is compiled while it is timed.
"""

import argparse
import json
import time

import beginning
import force_calls
import lists
import machine
import memory
import numpy as np
import processes
import steps
from starts import liquid
from systems import CUTOFF, SYSTEMS, useful_pairs, with_plain_cutoff
from timing import ROUNDS, Contender, in_turns, median_ms

from swirlight import units
from swirlight.compiled import numba
from swirlight.errors import InputError

QUICK_ROUNDS = GROWTH_ROUNDS = 5


def one_row(name, bodies, threads, precision, cutoff):
    """Everything about one system, as a dict.

    Steps are taken under the same forces as the force calls, and the wave vectors that belong
    to them: plain cut-off, fixed splitting, mesh Ewald for charges.
    """
    system, state = with_plain_cutoff(name, bodies, precision, cutoff), liquid(name, bodies, cutoff)
    numba.set_num_threads(threads)
    call = force_calls.ForceCall(system, state)
    call()
    near = call.pairs.neighbours
    times = in_turns({
        "call": Contender(call, threads),
        "list": Contender(lambda: near.make(state.position, state.orientation, state.box), threads),
    })
    walk = in_turns({"step": Contender(steps.Trajectory(system, state).settled(), threads)},
                    seconds=0.3, least=steps.BLOCK, average=np.mean)
    pairs, ms = useful_pairs(system, state), median_ms(times["call"])
    return dict(system=name, bodies=bodies, threads=threads, precision=precision,
                cutoff_nm=cutoff, cutoff_form=system.interactions.cutoff_form,
                ms_per_force_call=ms, useful_pairs=pairs, ns_per_useful_pair=1e6 * ms / pairs,
                ms_list=median_ms(times["list"]),
                steps_per_second=float(1 / np.median(walk["step"])))


def show(title, note, head, rows):
    """Print a table row by row, as rows come."""
    widths = [max(len(name), 6) for name in head]
    widths[0] = max(widths[0], 14)

    def line(cells):
        print("  ".join(f"{cell!s:<{w}}" if k == 0 else f"{cell!s:>{w}}" for k, (cell, w)
                        in enumerate(zip(cells, widths, strict=True))), flush=True)

    print(f"\n{title}\n{note}", flush=True)
    line(head)
    for row in rows:
        line(row)


def all_tables(quick):
    """Print everything."""
    rounds = QUICK_ROUNDS if quick else ROUNDS
    threads = [1, 2] if numba.config.NUMBA_NUM_THREADS > 1 else [1]
    began = time.perf_counter()
    print(*machine.heading(), sep="\n")
    show("1. Pair forces", f"{force_calls.NOTE}\n{force_calls.smallest_box()}", force_calls.HEAD,
         force_calls.table(quick, threads, rounds))
    show("2. Lists", lists.NOTE, lists.HEAD, lists.table(quick, rounds))
    meshes = []
    show("3. Whole steps", steps.NOTE, steps.HEAD,
         steps.table(quick, threads, rounds, meshes.append))
    print(*meshes, sep="\n")
    show("   What a step is spent on", steps.SHARE_NOTE, steps.SHARE_HEAD,
         steps.shares(threads, rounds))
    if not quick:
        meshes.clear()
        show("4. Growth", steps.GROWTH_NOTE, steps.GROWTH_HEAD,
             steps.growth(GROWTH_ROUNDS, meshes.append))
        print(*meshes, sep="\n")
        show("   Memory", memory.NOTE, memory.HEAD, memory.rows())
    show("5. Side by side", processes.NOTE, processes.HEAD, processes.rows(rounds))
    show("6. Beginning", beginning.NOTE, beginning.HEAD, beginning.rows())
    print(f"\nmeasured in {time.perf_counter() - began:.0f} s; threads run by"
          f" {numba.threading_layer()}; {machine.load()}")


def main():
    parser = argparse.ArgumentParser(description=__doc__,
                                     formatter_class=argparse.RawDescriptionHelpFormatter)
    parser.add_argument("--quick", action="store_true", help="only the main rows")
    parser.add_argument("--json", action="store_true", help="one row, as a JSON object")
    parser.add_argument("--system", choices=SYSTEMS, help="of the row; water if not given")
    parser.add_argument("--bodies", type=int, default=4000)
    parser.add_argument("--threads", type=int, default=1)
    parser.add_argument("--precision", choices=("mixed", "double"), default="mixed")
    parser.add_argument("--cutoff", default=f"{CUTOFF} nm")
    wanted = parser.parse_args()
    if not wanted.json and not wanted.system:
        all_tables(wanted.quick)
        return
    if not 1 <= wanted.threads <= numba.config.NUMBA_NUM_THREADS:
        parser.error(f"--threads: 1 to {numba.config.NUMBA_NUM_THREADS} here")
    try:
        row = one_row(wanted.system or "water", wanted.bodies, wanted.threads, wanted.precision,
                      units.parse_quantity(wanted.cutoff, "length"))
    except InputError as error:
        parser.error(str(error))
    if wanted.json:
        print(json.dumps(row, indent=1))
    else:
        print("\n".join(f"{name:<20} {value}" for name, value in row.items()))


if __name__ == "__main__":
    main()
