"""The light at many times at once: all that the kernels need, and what observers report.

Averaged light enters through coherency matrices 𝓔𝓔†, one per group of pulses that beat:
S = Re 𝓔𝓔† and G = i 𝓔×𝓔*, at the bodies, that is with the local field.
Carrier-resolved light is E = −dA/dt with A = Re[𝓔 e^{−iωt}/(iω)], so ∫E dt = 0:

    E = Re[(𝓔 + i𝓔̇/ω) e^{−iωt}],      Ė = Re[(2𝓔̇ + i𝓔̈/ω − iω𝓔) e^{−iωt}]

Here t counts from the pulse's own centre, and 𝓔 carries exp(−iφ).
No numba here.
"""

from dataclasses import dataclass

import numpy as np

from swirlight.light.envelope import FAINT
from swirlight.light.polarisation import conjugate_product


@dataclass(frozen=True)
class FieldBlock:
    """The fields at T times. [u nm/ps²/e, and its square]

    times : (T,) from the start of the lit stage. [ps]
    coherency : (T, groups, 9) S as xx yy zz xy xz yz, then G; with local field.
    wave : (T, colours, 6) E, and Ė/ω, of each colour of resolved light.
    averaged_on, resolved_on : (T,) bool, whether there is any such light.
    bias : (T, 3) static field.
    amplitude : (T, 3) complex 𝓔 in the sample: the averaged light of the first group, or, when
        all light is resolved, that of the first colour.
    conjugate_product : (T, 3) Σ G in the sample over groups and colours.
    field : (T, 3) E of the resolved light.
    """

    times: np.ndarray
    coherency: np.ndarray
    wave: np.ndarray
    averaged_on: np.ndarray
    resolved_on: np.ndarray
    bias: np.ndarray
    amplitude: np.ndarray
    conjugate_product: np.ndarray
    field: np.ndarray


def group_amplitude(pulses, times, local=False, lone_phase=True):
    """Σ 𝓔_j exp(−iω_j(t − t_j) − iφ_j) over pulses and copies, complex (T, 3).

    The fast phase of the first pulse's first copy is divided out, so that one pulse alone
    gives exactly its own 𝓔 exp(iφ).
    local : at the bodies, with the local field.
    lone_phase : False: a copy that shines alone is left without its phase. S and G do not see
        it, and so mirrored light keeps S to the last bit in every copy of a train.
    """
    times = np.asarray(times, float)
    total, bare = np.zeros((2, *times.shape, 3), complex)
    shining = np.zeros(times.shape, int)
    first = pulses[0]
    for pulse, centre in _copies(pulses, times):
        phase = (
            (pulse.carrier - first.carrier) * times
            - pulse.carrier * centre + first.carrier * first.centre
            + (pulse.phase - first.phase)
        )
        own = (pulse.local_factor if local else 1.0) * pulse.amplitude_at(times - centre)
        total += own * np.exp(-1j * phase)[..., None]
        bare += own
        shining += own.any(axis=-1)
    return total if lone_phase else np.where((shining < 2)[..., None], bare, total)


def resolved_field(pulses, times):
    """E and Ė/ω of resolved pulses, two (T, 3) arrays. [u nm/ps²/e]"""
    times = np.asarray(times, float)
    field, quadrature = np.zeros((2, *times.shape, 3))
    for pulse, centre in _copies(pulses, times):
        t, omega = times - centre, pulse.carrier
        slow, slow1, slow2 = pulse.derivatives_at(t)
        turning = np.exp(-1j * (omega * t + pulse.phase))[..., None]
        field += ((slow + 1j * slow1 / omega) * turning).real
        rate = (2.0 * slow1 + 1j * slow2 / omega - 1j * omega * slow) * turning
        quadrature += rate.real / omega
    return field, quadrature


def _copies(pulses, times):
    """(pulse, centre) of every copy that shines at any of the times."""
    low, high = times.min(initial=np.inf), times.max(initial=-np.inf)
    for pulse in pulses:
        before, after = pulse.envelope.reach(FAINT)
        first, last = 0, pulse.count - 1
        if last > 0:  # of a long train only the copies near the times are visited
            first = max(first, int(np.ceil((low - after - pulse.centre) / pulse.period - 1e-9)))
            last = min(last, int(np.floor((high + before - pulse.centre) / pulse.period + 1e-9)))
        for n in range(first, last + 1):
            yield pulse, pulse.centre + pulse.period * n


def coherency_rows(amplitude):
    """S as xx yy zz xy xz yz, then G, (T, 9), of complex amplitudes (T, 3)."""
    u, v = amplitude.real, amplitude.imag
    x, y, z = 0, 1, 2
    pairs = ((x, x), (y, y), (z, z), (x, y), (x, z), (y, z))
    columns = [u[:, a] * u[:, b] + v[:, a] * v[:, b] for a, b in pairs]
    return np.concatenate([np.stack(columns, axis=1), conjugate_product(amplitude)], axis=1)


def make_block(times, groups, colours, bias):
    """The FieldBlock of averaged `groups`, resolved `colours` (tuples of pulses) and a Bias."""
    times = np.asarray(times, float)
    count = len(times)
    coherency, wave = np.zeros((count, len(groups), 9)), np.zeros((count, len(colours), 6))
    amplitudes = [group_amplitude(g, times, lone_phase=False) for g in (*groups, *colours)]
    for n, group in enumerate(groups):
        dressed = any(p.local_factor != 1.0 for p in group)
        at_bodies = amplitudes[n]
        if dressed:
            at_bodies = group_amplitude(group, times, local=True, lone_phase=False)
        coherency[:, n] = coherency_rows(at_bodies)
    for n, colour in enumerate(colours):
        wave[:, n, :3], wave[:, n, 3:] = resolved_field(colour, times)
    reported = np.zeros((count, 3), complex)
    if amplitudes:
        first = (*groups, *colours)[0]
        reported = group_amplitude(first, times) * np.exp(-1j * first[0].phase)
    return FieldBlock(
        times=times,
        coherency=coherency,
        wave=wave,
        averaged_on=coherency.any(axis=(1, 2)),
        resolved_on=wave.any(axis=(1, 2)),
        bias=np.zeros((count, 3)) if bias is None else bias.field(times),
        amplitude=reported,
        conjugate_product=sum((conjugate_product(a) for a in amplitudes), np.zeros((count, 3))),
        field=wave[:, :, :3].sum(axis=1),
    )
