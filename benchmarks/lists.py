"""Neighbour lists: the outer one against a k-d tree's pairs, and the inner one."""

import numpy as np
from force_calls import ForceCall
from scipy.spatial import cKDTree
from starts import liquid
from systems import CUTOFF, with_plain_cutoff
from timing import Contender, in_turns, median_ms, ratio

REACH = 1.0  # nm, between centres
SIZES = (("water", 4000), ("water", 32000), ("atoms", 4000), ("atoms", 32000))
HEAD = ("system", "bodies", "outer ms", "tree ms", "tree/outer", "inner ms", "force call ms")
NOTE = f"""\
outer: sorting the bodies into cells and listing, for each, all bodies with centres within
{REACH} nm, both ways; the cutoff is chosen so that with the sites' reach and the skin it comes to
that. tree: building a periodic k-d tree of the centres and asking it for the pairs within
{REACH} nm, as an array. inner: choosing from an outer list made for the {CUTOFF} nm cutoff those
with any two sites within cutoff and skin; a few of the force calls given beside it go by before
it is due again. One thread, mixed precision."""


def outer_list(name, bodies, state):
    """The call that makes an outer list that reaches REACH."""
    def reach_of(cutoff):
        call = ForceCall(with_plain_cutoff(name, bodies, cutoff=cutoff), state)
        call()
        near = call.pairs.neighbours
        return near, cutoff + 2 * near.radius + near.outer_skin

    trial = CUTOFF - 0.3
    near, reach = reach_of(trial + REACH - reach_of(trial)[1])
    if not np.isclose(reach, REACH):
        raise RuntimeError(f"the outer list reaches {reach:.4f} nm instead of {REACH} nm")
    return lambda: near.make_outer(state.position, state.box)


def table(quick, rounds):
    for name, bodies in SIZES[:1] if quick else SIZES:
        state = liquid(name, bodies, CUTOFF)
        place = state.position % state.box % state.box
        force_call = ForceCall(with_plain_cutoff(name, bodies), state)
        force_call()
        times = in_turns({
            "outer": Contender(outer_list(name, bodies, state)),
            "tree": Contender(lambda place=place, box=state.box: cKDTree(
                place, boxsize=box).query_pairs(REACH, output_type="ndarray")),
            "inner": Contender(lambda force_call=force_call, state=state:
                               force_call.pairs.neighbours.choose_inner(state.position,
                                                                        state.orientation)),
            "call": Contender(force_call),
        }, rounds)
        yield [name, bodies, f"{median_ms(times['outer']):.2f}", f"{median_ms(times['tree']):.1f}",
               f"{ratio(times['tree'], times['outer']):.1f}", f"{median_ms(times['inner']):.2f}",
               f"{median_ms(times['call']):.2f}"]
