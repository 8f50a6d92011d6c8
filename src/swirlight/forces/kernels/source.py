"""The text of a pair kernel: all site pairs of two kinds of bodies written out.

A kernel runs over the neighbours of one body at a time, and everything inside that loop is
plain arithmetic on scalars, so that the compiler can take 8 or 16 neighbours at once. To
get there the loop over site pairs must be written out, for each pattern of sites. Nothing
but the pattern enters the text: charges, σ, ε, cutoff and coefficients are arguments.

Records  one row of words per body (`records.py`): three words for the centre, then x, y, z
         of the lever arm of every interacting site.
Images   the centre's words are fractions of the box edge, whose wrapped difference belongs
         to the nearest image; the box is repeated first where that would not do.
"""

from dataclasses import dataclass

LANES = {"float32": 16, "float64": 8}


@dataclass(frozen=True)
class Pattern:
    """What the text depends on.

    own, other : numbers of sites of the body and of its neighbours, of one kernel call.
    own_words : length of the body's record.
    central : whether the neighbour's only site is its centre, as an atom's.
    lennard_jones, coulomb : the (a, b) site pairs that have each.
    form : cut-off form of the Lennard-Jones part.
    degree : of the polynomials that stand for the smooth part of the Coulomb law.
    shifted : whether the Coulomb law has its force shifted by a constant.
    energies : also energies and virial.
    real : "float32" or "float64", of the arithmetic inside the loop.
    """

    own: int
    other: int
    own_words: int
    central: bool
    lennard_jones: tuple[tuple[int, int], ...]
    coulomb: tuple[tuple[int, int], ...]
    form: str
    degree: int
    shifted: bool
    energies: bool
    real: str

    @property
    def pairs(self):
        """The (a, b) site pairs that act on each other at all, neighbour's site by site."""
        acting = {*self.lennard_jones, *self.coulomb}
        return sorted(acting, key=lambda pair: pair[::-1])


HEADER = '''\
"""Pair forces, written by swirlight.forces.kernels.source for
{pattern}.
"""

import math

import numba
import numpy as np

from swirlight.compiled import CHUNKS, INNER, kernel
from swirlight.forces.kernels.lowlevel import at, fused, streamlined{lanes} as streamlined

real = np.{real}
zero, half, one = real(0.0), real(0.5), real(1.0)
'''

# One site pair: its force over the distance, outward, and its energies.
PAIR = '''

@kernel(fast=True, forceinline=True, **INNER)
def {name}(r2, pair, p, g, limits):
    cutoff2, scale, start, steep, far, pull = limits
{body}
'''

ROWS = '''

@kernel(fast=True, **INNER)
def some_rows(begin, end, own, own_centre, other, other_centre, my_sites, its_sites, entries,
              counts, edge, pairs, screening, limits, body, anew, force, torque, sums):
    streamlined()
{before}
    for i in range(begin, end):
        mine, count = i * {words}, counts[i]
{start}
        for k in range(((count + {fill}) >> {shift}) << {shift}):
            j = entries[i, k]
{loop}
{after}


@kernel(parallel=True)
def rows(own, own_centre, other, other_centre, my_sites, its_sites, entries, counts, edge, pairs,
         screening, limits, body, anew, force, torque, sums):
    n = counts.shape[0]
    for chunk in numba.prange(CHUNKS):
        some_rows(chunk * n // CHUNKS, (chunk + 1) * n // CHUNKS, own, own_centre, other,
                  other_centre, my_sites, its_sites, entries, counts, edge, pairs, screening,
                  limits, body, anew, force, torque, sums)
'''

# The square root's reciprocal: the compiler makes the processor's estimate and a Newton step
# of the first; the second starts there and takes a third-order step.
RECIPROCAL_ROOT = {
    "float32": ["w = one / math.sqrt(r2)"],
    "float64": [
        "w = np.float64(np.float32(1.0) / math.sqrt(np.float32(r2)))",
        "h = one - r2 * w * w",
        "w = w + w * h * (half + real(0.375) * h)",
    ],
}


def _polynomial(name, degree):
    """Horner's scheme for name[0] + name[1] t + …"""
    text = f"{name}[{degree}]"
    for k in range(degree - 1, -1, -1):
        text = f"({text}) * t + {name}[{k}]" if k < degree - 1 else f"{text} * t + {name}[{k}]"
    return text


def _coulomb(pattern):
    """Lines that set f and coulomb; the charges are the pair's first number."""
    root, tilt = ("(w2 - pull)", " + pull * r2 * w") if pattern.shifted else ("w2", "")
    lines = ["t = r2 * scale - one",
             f"f = pair[0] * (w * {root} - ({_polynomial('p', pattern.degree)}))"]
    if pattern.energies:
        lines.append(f"coulomb = pair[0] * (w - ({_polynomial('g', pattern.degree)}){tilt})")
    return lines


def _lennard_jones(pattern, first):
    """Lines that set v and u, from the pair's numbers from `first` on."""
    lines = ["w2 = w2 + w2 * (one - r2 * w2)",
             "s = w2 * w2 * w2",
             f"a, b = pair[{first}] * s, pair[{first + 1}]",
             "u = s * (a - b)",
             "v = real(6.0) * s * w2 * (a + a - b)"]
    if pattern.form == "switched":
        lines += ["x = (r2 * w - start) * steep",
                  "x = x if x > zero else zero",
                  "h = x * (one - x)",
                  "s = one + x * x * x * (x * (real(15.0) - real(6.0) * x) - real(10.0))",
                  "v = v * s + real(30.0) * steep * u * w * h * h",
                  "u = u * s"]
    if pattern.form == "force-shifted":
        lines += [f"v -= pair[{first + 2}] * w",
                  f"u += pair[{first + 2}] * (r2 * w) + pair[{first + 3}]"]
    return lines


def _pair_function(pattern, touching, charged):
    """The text of the function for site pairs with Lennard-Jones, charges, or both."""
    lines = [*RECIPROCAL_ROOT[pattern.real], "w2 = w * w"]
    if charged:
        lines += _coulomb(pattern)
    if touching:
        lines += _lennard_jones(pattern, first=int(charged))
        lines.append("f += v" if charged else "f = v")
    lines += ["inside = r2 < cutoff2", "f = f if inside else zero"]
    if pattern.energies:
        lines.append("u = u if inside else zero" if touching else "u = zero")
        lines.append("q = coulomb if inside else zero" if charged else "q = zero")
    lines.append("return f, u, q" if pattern.energies else "return f")
    return PAIR.format(name=_pair_name(touching, charged), body=_block(lines, 4))


def _pair_name(touching, charged):
    return "_and_".join(["lennard_jones"] * touching + ["coulomb"] * charged)


def _block(lines, indent):
    return "\n".join(" " * indent + line for line in lines)


def _before(pattern):
    """Lines ahead of all loops: what does not change from body to body."""
    rows = (0, 1) if pattern.energies else (0, 0)
    lines = [f"{name} = ({''.join(f'screening[{row}, {k}], ' for k in range(pattern.degree + 1))})"
             for name, row in zip("pg", rows, strict=True)]
    lines.append(f"reach = ({', '.join(f'limits[{k}]' for k in range(6))})")
    lines.append("far = limits[4]")
    lines += [f"edge{k} = edge[0, {k}]" for k in range(3)]
    if pattern.real == "float32":
        lines += [f"rest{k} = edge[1, {k}]" for k in range(3)]
    for n, (a, b) in enumerate(pattern.pairs):
        numbers = "".join(f"pairs[{n}, {k}], " for k in range(5))
        lines.append(f"pair{a}_{b} = ({numbers})")
    return lines


def _start(pattern):
    """Lines ahead of the loop over the neighbours of one body."""
    centre = "own_centre" if pattern.real == "float32" else "own"
    lines = [f"centre{k} = {centre}[mine + {k}]" for k in range(3)]
    for a in range(pattern.own):
        lines += [f"{x}{a} = own[mine + my_sites + {3 * a + k}]" for k, x in enumerate("xyz")]
        lines.append(" = ".join(f"f{x}{a}" for x in "xyz") + " = zero")
    if pattern.energies:
        lines.append("sum_u = sum_q = virialx = virialy = virialz = zero")
    return lines


def _centres(pattern):
    """Lines that set X, Y, Z, from this body's centre to its neighbour's nearest image."""
    lines = []
    for k, x in enumerate("XYZ"):
        if pattern.real == "float32":
            whole = f"np.int32(at(other_centre, {k}, j) - centre{k})"
            lines += [f"s = real({whole})", f"{x} = fused(s, edge{k}, s * rest{k})"]
        else:
            lines += [f"s = at(other, {k}, j) - centre{k}",
                      f"{x} = (s - np.floor(s + half)) * edge{k}"]
    # A row is filled up to a whole number of lanes; what fills it is moved out of reach.
    return [*lines, "X = X if k < count else far"]


def _site_pair(pattern, a, b):
    name = _pair_name((a, b) in pattern.lennard_jones, (a, b) in pattern.coulomb)
    lines = [f"dx, dy, dz = {', '.join(f'{x}b - {x}{a}' for x in 'xyz')}",
             "r2 = dx * dx + dy * dy + dz * dz"]
    call = f"{name}(r2, pair{a}_{b}, p, g, reach)"
    if not pattern.energies:
        return [*lines, f"f = {call}", *(f"f{x}{a} -= f * d{x}" for x in "xyz")]
    lines += [f"f, u, q = {call}", "pair_u += u", "pair_q += q"]
    for x in "xyz":
        lines += [f"d{x} *= f", f"f{x}{a} -= d{x}", f"pair{x} += d{x}"]
    return lines


def _loop(pattern):
    """Lines of the loop over neighbours."""
    lines = _centres(pattern)
    if pattern.energies:
        lines.append("pair_u = pair_q = pairx = pairy = pairz = zero")
    site = None
    for a, b in pattern.pairs:
        if b != site:
            site = b
            lines += [f"{x}b = {x.upper()}" if pattern.central
                      else f"{x}b = {x.upper()} + at(other, its_sites + {3 * b + k}, j)"
                      for k, x in enumerate("xyz")]
        lines += _site_pair(pattern, a, b)
    if pattern.energies:
        # Neutral bodies: the sum over one neighbour is small, which keeps the total's digits.
        lines += ["sum_u += pair_u", "sum_q += pair_q"]
        lines += [f"virial{x} += pair{x} * {x.upper()}" for x in "xyz"]
    return lines


def _after(pattern):
    """Lines that add the sums of one body, in double precision from here on."""
    lines = ["b = body[i]", "if anew:",
             "    force[b, 0] = force[b, 1] = force[b, 2] = 0.0",
             "    torque[b, 0] = torque[b, 1] = torque[b, 2] = 0.0"]
    if pattern.energies:
        lines.append("    sums[b, 0] = sums[b, 1] = sums[b, 2] = sums[b, 3] = sums[b, 4] = 0.0")
    for a in range(pattern.own):
        for k, x in enumerate("xyz"):
            lines += [f"{x}, f{x} = np.float64({x}{a}), np.float64(f{x}{a})",
                      f"force[b, {k}] += f{x}"]
        lines += ["torque[b, 0] += y * fz - z * fy", "torque[b, 1] += z * fx - x * fz",
                  "torque[b, 2] += x * fy - y * fx"]
    if pattern.energies:
        lines += [f"sums[b, {k}] += {name}" for k, name in
                  enumerate(("sum_u", "sum_q", "virialx", "virialy", "virialz"))]
    return lines


def pair_source(pattern):
    """The text of a module whose `rows` adds the pair forces of one pattern to all bodies.

    rows(own, own_centre, other, other_centre, my_sites, its_sites, entries, counts, edge,
         pairs, screening, limits, body, anew, force, torque, sums)

    own, other : flat records; own_centre, other_centre : the same memory as int32.
    my_sites, its_sites : word of a record with which the sites of this call begin.
    entries, counts : (n, capacity) int32 record starts of the neighbours of each body, (n,).
    edge : (2, 3) nm per unit of the centre's words, and what its rounding left.
    pairs : (acting pairs, 5), in the order of `Pattern.pairs`: k q q' where there are charges,
        then `laws.lennard_jones_terms` where there is Lennard-Jones; the rest is not read.
    screening : (2, degree + 1) of `laws.CoulombLaw.polynomials`.
    limits : rc², 2/rc², start of the switch, 1 / its width, a place out of reach, force shift.
    body : (n,) where force and torque (N, 3) and, with energies, sums (N, 5) are
        added to: Lennard-Jones, Coulomb, virial x, y, z; anew : whether those begin at nought.
    """
    lanes = LANES[pattern.real]
    text = HEADER.format(pattern=pattern, lanes=lanes, real=pattern.real)
    kinds = {(pair in pattern.lennard_jones, pair in pattern.coulomb) for pair in pattern.pairs}
    text += "".join(_pair_function(pattern, *kind) for kind in sorted(kinds))
    return text + ROWS.format(
        words=pattern.own_words, fill=lanes - 1, shift=lanes.bit_length() - 1,
        before=_block(_before(pattern), 4), start=_block(_start(pattern), 8),
        loop=_block(_loop(pattern), 12), after=_block(_after(pattern), 8))
