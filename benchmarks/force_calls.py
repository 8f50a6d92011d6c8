"""The engine's pair forces: one call, held against the plain twin and the script, and timed."""

import numpy as np
from script import Script
from starts import liquid
from systems import CUTOFF, SPLITTING, SYSTEMS, useful_pairs, with_plain_cutoff
from textbook import Textbook
from timing import Contender, in_turns, median_ms, ratio

from swirlight.forces.field import coulomb_law
from swirlight.forces.pairs import PairForces

AGREE = {"double": 1e-10, "mixed": 2e-5}  # largest error of a component over the rms of all
TABLE = tuple((name, bodies) for name, largest in
              (("water", 108000), ("atoms", 108000), ("five", 32000))
              for bodies in (500, 4000, 32000, 108000) if bodies <= largest)
COMPARED = (500, 4000)  # sizes at which the twin and the script run too


class ForceCall:
    """Pair forces of a state, without energies; the list is made by the first call."""

    def __init__(self, system, state):
        self.state = state
        self.pairs = PairForces(system, coulomb_law(system, state.box), state.box)
        self.force, self.torque = np.empty((2, system.bodies, 3))

    def __call__(self):
        state = self.state
        self.pairs.evaluate(state.position, state.orientation, state.box, self.force, self.torque)
        return self.force, self.torque


def check_agreement(found, expected, precision):
    """Raise AssertionError when forces or torques (pairs of arrays) differ beyond rounding."""
    for what, one, other in zip(("force", "torque"), found, expected, strict=True):
        error = np.abs(one - other).max()
        scale = np.sqrt((other**2).mean())
        if not error <= AGREE[precision] * scale:
            raise AssertionError(f"{what}s differ by {error:.1e}, their rms is {scale:.1e}")


def rivals(system, state, skin):
    """The twin, its list as far as the engine's, and the script."""
    return Textbook(system, state, SPLITTING, skin), Script(system, state, SPLITTING)


def rows(name, bodies, thread_counts, rounds):
    """Rows of the table of force calls: one for each precision."""
    state, compared = liquid(name, bodies, CUTOFF), bodies in COMPARED
    precisions = ("mixed", "double") if bodies == 4000 else ("mixed",)
    contenders, calls = {}, {}
    for precision in precisions:
        system = with_plain_cutoff(name, bodies, precision)
        calls[precision] = ForceCall(system, state)
        for threads in thread_counts:
            contenders[precision, threads] = Contender(calls[precision], threads)
    if compared:
        exact = ForceCall(with_plain_cutoff(name, bodies, "double"), state)()
        calls["mixed"]()
        twin, script = rivals(system, state, calls["mixed"].pairs.neighbours.skin)
        pairs = script.near(script.places()[1])
        check_agreement(twin(), exact, "double")
        check_agreement(script(), exact, "double")
        check_agreement(calls["mixed"](), exact, "mixed")
        contenders |= {"twin": Contender(twin), "script": Contender(script),
                       "without tree": Contender(lambda: script(pairs))}
    times = in_turns(contenders, rounds)
    skin, useful = calls["mixed"].pairs.neighbours.skin, useful_pairs(system, state)
    for precision in precisions:
        alone = times[precision, 1]
        yield [name, bodies, precision, f"{skin:.2f}", f"{median_ms(alone):.3f}", useful,
               f"{1e6 * median_ms(alone) / useful:.2f}",
               *(f"{ratio(times[other], alone):.1f}" if compared else "-"
                 for other in ("twin", "script", "without tree")),
               f"{ratio(alone, times[precision, 2]):.2f}" if 2 in thread_counts else "-"]


HEAD = ("system", "bodies", "precision", "skin nm", "ms/call", "useful pairs", "ns/pair", "twin/it",
        "script/it", "same, no tree", "2 threads")
NOTE = f"""\
One call of the pair forces, from positions and orientations to forces and torques, no energies,
the list still good. Lennard-Jones cut plainly and real-space Ewald of {SPLITTING} /nm, both at
{CUTOFF} nm between sites. A useful pair: two sites of two bodies within the cutoff, counted once.
"five" (charge and Lennard-Jones on all five sites) is invented for timing; the atom has argon's
parameters. twin: plain textbook loop, double, half list with the same skin, one thread
(textbook.py). script: numpy and scipy, its k-d tree asked for the pairs in every call, as such a
script does (script.py), and with the pairs given ("same, no tree"). 2 threads: time on one thread
over time on two. All others: one thread."""


def table(quick, thread_counts, rounds):
    for name, bodies in TABLE:
        if not quick or bodies == 4000:
            yield from rows(name, bodies, thread_counts, rounds)


def smallest_box():
    """Edges of the boxes of 500 bodies, in words."""
    edges = ", ".join(f"{name} {(500 / SYSTEMS[name][1]) ** (1 / 3):.2f} nm"
                      for name in ("water", "atoms", "five"))
    return f"Boxes of 500 bodies ({edges}) all hold twice the cutoff."
