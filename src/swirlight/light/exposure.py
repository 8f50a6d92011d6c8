"""What an exposure does to the light: mirrored, dark, carrier shifted.

`minus` mirrors every exposed pulse in one plane, that of k̂ and the azimuth axis of the first
exposed pulse. For pulses along that k̂ this is a change of parameters (χ, ν, β change sign, ψ0
goes to 2ψ_first − ψ0), which for one pulse leaves Re 𝓔𝓔† bit by bit as it was and turns G
into −G exactly; pulses along other directions get the reflected amplitude. Carrier phases,
the bias field and pulses with `in_kinds: same` stay.
"""

from dataclasses import replace
from math import cos, pi, sin

from swirlight.light.polarisation import transverse_axes


def exposed(pulses):
    """Those pulses that exposures act on."""
    return tuple(p for p in pulses if p.in_kinds == "exposed")


def mirrored(pulses):
    """The pulses of `minus`, in the same order."""
    first = next(iter(exposed(pulses)), None)
    if first is None:
        return tuple(pulses)
    return tuple(_mirror(p, first) if p.in_kinds == "exposed" else p for p in pulses)


def _mirror(pulse, first):
    if pulse.direction == first.direction:
        rate, acceleration = pulse.turning
        return replace(
            pulse,
            ellipticity=-pulse.ellipticity,
            azimuth=first.azimuth + (first.azimuth - pulse.azimuth),
            turning=(-rate, -acceleration),
        )
    if pulse.mirror is not None:  # a second reflection in the same plane undoes the first
        return replace(pulse, mirror=None)
    e1, e2 = transverse_axes(first.direction)
    normal = cos(first.azimuth) * e2 - sin(first.azimuth) * e1
    return replace(pulse, mirror=tuple(normal.tolist()))


def dark(pulses):
    """The pulses of `dark`: probes only."""
    return tuple(p for p in pulses if p.in_kinds == "same")


def with_phase(pulses, shift):
    """Every resolved carrier shifted by `shift` [rad]; averaged light has no phase to shift."""
    return tuple(
        replace(p, phase=(p.phase + shift) % (2.0 * pi)) if p.coupling == "resolved" else p
        for p in pulses
    )
