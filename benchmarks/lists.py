"""Neighbour lists against the pairs of a k-d tree."""

import numpy as np
from force_calls import ForceCall
from scipy.spatial import cKDTree
from starts import liquid
from systems import CUTOFF, with_plain_cutoff
from timing import Contender, in_turns, median_ms, ratio

REACH = 1.0  # nm, between centres
SIZES = (("water", 4000), ("water", 32000), ("atoms", 4000), ("atoms", 32000))
HEAD = ("system", "bodies", "list ms", "tree ms", "tree/list", "in use ms", "force call ms")
NOTE = f"""\
list: making it anew, from sorting the bodies to a full row for each, both ways, of all bodies
with any two sites within cutoff and skin; the cutoff is chosen so that centres reach {REACH} nm.
tree: building a periodic k-d tree of the centres and asking it for the pairs within
{REACH} nm, as an array. in use: making the list for the {CUTOFF} nm cutoff; a few of the force
calls given beside it go by before it is due again. One thread, mixed precision."""


def list_of_reach(name, bodies, state):
    """The call that makes a list of bodies whose centres are within REACH."""
    def reach_of(cutoff):
        call = ForceCall(with_plain_cutoff(name, bodies, cutoff=cutoff), state)
        call()
        near = call.pairs.neighbours
        return near, cutoff + 2 * near.radius + near.skin

    trial = CUTOFF - 0.3
    near, reach = reach_of(trial + REACH - reach_of(trial)[1])
    if not np.isclose(reach, REACH):
        raise RuntimeError(f"the list reaches {reach:.4f} nm instead of {REACH} nm")
    return lambda: near.make(state.position, state.orientation, state.box)


def table(quick, rounds):
    for name, bodies in SIZES[:1] if quick else SIZES:
        state = liquid(name, bodies, CUTOFF)
        place = state.position % state.box % state.box
        force_call = ForceCall(with_plain_cutoff(name, bodies), state)
        force_call()
        times = in_turns({
            "list": Contender(list_of_reach(name, bodies, state)),
            "tree": Contender(lambda place=place, box=state.box: cKDTree(
                place, boxsize=box).query_pairs(REACH, output_type="ndarray")),
            "used": Contender(lambda near=force_call.pairs.neighbours, state=state:
                              near.make(state.position, state.orientation, state.box)),
            "call": Contender(force_call),
        }, rounds)
        yield [name, bodies, f"{median_ms(times['list']):.2f}", f"{median_ms(times['tree']):.1f}",
               f"{ratio(times['tree'], times['list']):.1f}", f"{median_ms(times['used']):.2f}",
               f"{median_ms(times['call']):.2f}"]
