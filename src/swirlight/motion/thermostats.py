"""The thermostats a stage can name, and what each of them offers to the step.

A thermostat has
    conserves_momentum : whether the total momentum of the box survives it;
    act(state, system, timestep, work, ledger) : change the momenta for one step, in place,
        between two half drifts; randomness only from `state.random`; the energy and angular
        momentum it brings go to the ledger's bath entries.
A new one is a file beside `langevin.py` and a line in `METHODS`.
"""

from swirlight.errors import InputError
from swirlight.motion.langevin import Langevin


def _langevin(system, friction, time, acts_on):
    if friction is None:
        if time is None:
            raise InputError("thermostat langevin: a friction (say 2 /ps) or a time is needed")
        friction = 1.0 / time
    if friction < 0:
        raise InputError(f"thermostat langevin: friction {friction:g} /ps is negative")
    return Langevin(friction, system.temperature, acts_on)


METHODS = {"none": lambda *_: None, "langevin": _langevin}
PARTS = ("all", "translation", "rotation")


def make_thermostat(system, method, friction=None, time=None, acts_on="all"):
    """The thermostat of a stage, at the temperature of the system; None for "none".

    friction : [1/ps];  time : [ps]; whichever the method takes.
    Raises InputError for an unknown method or part, or when a setting is missing.
    """
    if method not in METHODS:
        raise InputError(f"thermostat method {method!r}: expected one of {', '.join(METHODS)}")
    if acts_on not in PARTS:
        raise InputError(f"thermostat acts_on {acts_on!r}: expected one of {', '.join(PARTS)}")
    return METHODS[method](system, friction, time, acts_on)
