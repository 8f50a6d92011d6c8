"""Which light is averaged over its cycle, which resolved, and which pulses beat.

The bodies set the scale: T_rot = 2π √(I_min/kT), I_min the smallest non-zero moment of the
species present, or the period of the fastest libration where that is known and shorter. A
carrier whose period is at most T_rot/20 is averaged; the choice never depends on the timestep.
No numba here.
"""

from math import inf, pi, sqrt

from swirlight.errors import InputError
from swirlight.units import BOLTZMANN

SEPARATION = 20.0  # cycles of the light in one rotation
FEWEST_STEPS, ENOUGH_STEPS = 20, 40  # a cycle: 0.8 % and 0.2 % error of the amplitude


def rotation_rate(system):
    """√(kT/I_min), the angular frequency 2π/T_rot of the fastest thermal rotation. [rad/ps]

    0 when there are only atoms.
    """
    moments = [float(i) for s, n in zip(system.species, system.counts, strict=True) if n
               for i in s.inertia if i > 0.0]
    return sqrt(BOLTZMANN * system.temperature / min(moments)) if moments else 0.0


def choose_coupling(asked, carrier, system, libration=0.0):
    """("averaged" | "resolved", reason in words) for a pulse.

    asked : "auto", "averaged" or "resolved".
    carrier : [rad/ps]
    libration : angular frequency of the fastest libration, from a previous run. [rad/ps]
    Raises InputError for another word.
    """
    if asked in ("averaged", "resolved"):
        return asked, "as asked"
    if asked != "auto":
        raise InputError(f"coupling: {asked!r}; there are auto, averaged, resolved")
    rate = max(rotation_rate(system), libration)
    if rate == 0.0:
        return "averaged", "only atoms, which do not rotate"
    ratio = carrier / rate  # rotations last this many cycles
    what = "libration" if libration > rotation_rate(system) else "thermal rotation"
    said = (f"carrier period {_time(2.0 * pi / carrier)}, fastest {what}"
            f" {_time(2.0 * pi / rate)}: {ratio:.3g} cycles in it,")
    if ratio >= SEPARATION:
        return "averaged", f"{said} at least {SEPARATION:g}"
    return "resolved", f"{said} fewer than {SEPARATION:g}"


def check_steps(pulse, timestep):
    """Refuse a timestep too long for a resolved carrier; return a warning, or None.

    timestep : of the lit stage. [ps]
    Raises InputError below 20 steps a cycle, naming the longest timestep.
    """
    if pulse.coupling != "resolved":
        return None
    cycle = 2.0 * pi / pulse.carrier
    steps = cycle / timestep
    if steps < FEWEST_STEPS * (1.0 - 1e-9):
        raise InputError(
            f"a timestep of {_time(timestep)} gives {steps:.1f} steps in a cycle of the resolved"
            f" carrier; the longest timestep is {_time(cycle / FEWEST_STEPS)}"
            f" ({FEWEST_STEPS} steps), {_time(cycle / ENOUGH_STEPS)} is recommended"
        )
    if steps < ENOUGH_STEPS * (1.0 - 1e-9):
        return (f"{steps:.1f} steps in a cycle of the resolved carrier: its amplitude is wrong by"
                f" up to 0.8 %; {_time(cycle / ENOUGH_STEPS)} would give {ENOUGH_STEPS}")
    return None


def beating_groups(pulses, system):
    """Averaged pulses that add as amplitudes: tuple of tuples of pulses, first come first.

    Two pulses beat when their carriers differ by less than 20 × `rotation_rate`; groups join
    pulses linked by such steps, so that coherency matrices stay positive.
    """
    limit = SEPARATION * rotation_rate(system)
    groups = []
    for pulse in (p for p in pulses if p.coupling == "averaged"):
        near = [g for g in groups if any(
            abs(p.carrier - pulse.carrier) < limit or p.carrier == pulse.carrier for p in g)]
        merged = [p for g in near for p in g] + [pulse]
        groups = [g for g in groups if g not in near] + [merged]
    order = {id(p): n for n, p in enumerate(pulses)}
    groups = [sorted(g, key=lambda p: order[id(p)]) for g in groups]
    return tuple(tuple(g) for g in sorted(groups, key=lambda g: order[id(g[0])]))


def beats(pulses, system):
    """Every pair of averaged pulses: (i, j, beat frequency in rad/ps, whether they beat)."""
    groups = beating_groups(pulses, system)
    averaged = [(n, p) for n, p in enumerate(pulses) if p.coupling == "averaged"]
    return [
        (i, j, abs(a.carrier - b.carrier),
         any(a in g and b in g for g in groups))
        for n, (i, a) in enumerate(averaged) for j, b in averaged[n + 1:]
    ]


def _time(picoseconds):
    if picoseconds == inf:
        return "infinite"
    for unit, size in (("ps", 1.0), ("fs", 1e-3)):
        if picoseconds >= size:
            return f"{picoseconds / size:.4g} {unit}"
    return f"{picoseconds * 1e6:.4g} as"
