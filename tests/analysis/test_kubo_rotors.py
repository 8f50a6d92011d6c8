"""Linear response of independent rotors: twins in weak light against their own dark runs.

No outside source: the driven side is the engine, the other side formulas that were derived
without it. Agreement within 4 combined standard errors at every time looked at; frames 0.08
apart make an error of 0.08²/12, 5e-4 of the response, which is below all errors.
"""

import functools

import numpy as np
import pytest

from swirlight.analysis import kubo
from swirlight.light.exposure import mirrored

from . import rotors
from .rotors import ALPHA_D, ALPHA_S, GYRATION, INTERVAL, Z

LENGTH = 6.56
DARK = 12.0
COUNTS = [pytest.param(3000, id="few"), pytest.param(40_000, id="many", marks=pytest.mark.slow)]
BATCH = 5000  # bodies held at once
G_Z, A_ZZ = rotors.along(False, GYRATION), rotors.along(True, ALPHA_S)


def batches(count):
    """Bodies and seed of each batch."""
    sizes = [BATCH] * (count // BATCH) + [count % BATCH] * (count % BATCH > 0)
    return [(size, 100 + n) for n, size in enumerate(sizes)]


def twins(count, pulse, read, even=False, **tensors):
    """Mean and error over bodies of the odd or even part of each of read(R, L)."""
    found = []
    for size, seed in batches(count):
        bodies = rotors.rotors(size, **tensors)
        lights = [(pulse,), mirrored((pulse,))] + ([()] if even else [])
        seen = []
        for light in lights:
            orientation, momentum = rotors.travel(bodies, light, LENGTH, seed)
            turn, _ = rotors.body_by_body(orientation, momentum)
            seen.append(np.array([each(turn, momentum) for each in read]))
        found.append(0.5 * (seen[0] + seen[1]) - seen[2] if even else 0.5 * (seen[0] - seen[1]))
    return [rotors.mean_and_error(x) for x in np.concatenate(found, axis=1)]


@functools.lru_cache(maxsize=1)
def in_the_dark(size, seed):
    """R, ω and L of one batch."""
    orientation, momentum = rotors.travel(rotors.rotors(size), (), DARK, 50_000 + seed)
    return *rotors.body_by_body(orientation, momentum), momentum


def from_the_dark(count, kernels, drives):
    """Mean and error over bodies of the convolved kernels(R, ω, L), (N, T) each."""
    return rotors.mean_and_error(np.concatenate([
        sum(kubo.convolve(kernel, drive, INTERVAL)
            for kernel, drive in zip(kernels(*in_the_dark(*batch)), drives, strict=True))
        for batch in batches(count)
    ]))


def compare(table, what, driven, predicted, times, least):
    """Within 4 combined errors; and told from nothing by `least` of them at the second time."""
    for n, t in enumerate(times):
        row = round(t / INTERVAL)
        (a, ea), (b, eb) = ((x[row], e[row]) for x, e in (driven, predicted))
        table(f"{what}, t = {t}", f"{a:.6f} ± {ea:.6f} / {b:.6f} ± {eb:.6f}", "4 errors")
        assert abs(a - b) < 4 * np.hypot(ea, eb)
        if n == 1:
            assert abs(b) > least * np.hypot(ea, eb)


def drive_of(pulse):
    return kubo.gyration_drive(rotors.fields((pulse,), LENGTH).coherency[:, 0], Z)


def gyration_kernel(of):
    """Kernel of a vector of the bodies with the power that gyration takes."""
    return lambda turn, w, spin: kubo.vector_kernel(
        of(turn, spin), kubo.vector_rate(turn, w, GYRATION))


def absorption_kernel(of):
    """Likewise with the power that absorption takes."""
    return lambda turn, w, spin: kubo.vector_kernel(
        of(turn, spin), kubo.absorption_flux(turn, w, ALPHA_D))


def g_of(turn, spin):
    return kubo.vector_sum(turn, GYRATION)


def l_of(turn, spin):
    return spin


def exact_start(kernel):
    """The same kernel with its value at lag 0 fixed by equipartition (kT = 1)."""
    def fixed(*motion):
        found = kernel(*motion)
        return found * kubo.mean_absorption(ALPHA_D, np.ones(3)) / found[:, :1].mean()
    return fixed


def g_z(turn, spin):
    return G_Z(turn)


def l_z(turn, spin):
    return spin[..., 2]


@pytest.mark.parametrize("count", COUNTS)
def test_gyration_orients_and_does_not_spin(count, table):
    """(a)"""
    pulse = rotors.optical(1.0)
    oriented, spun = twins(count, pulse, (g_z, l_z), gyration=GYRATION)
    drive = drive_of(pulse)
    predicted = from_the_dark(count, lambda *m: [gyration_kernel(g_of)(*m)], [drive])
    compare(table, "gyration ⟨g_z⟩", oriented, predicted, (2.0, 3.2, 4.8), 20)
    nothing = from_the_dark(count, lambda *m: [gyration_kernel(l_of)(*m)], [drive])
    compare(table, "gyration ⟨L_z⟩", spun, nothing, (3.2,), 0)
    for value, error in (spun, nothing):
        row = round(3.2 / INTERVAL)
        assert abs(value[row]) < 4 * error[row]


@pytest.mark.parametrize("count", COUNTS)
@pytest.mark.parametrize("ellipticity", [np.pi / 4, 0.0], ids=["circular", "linear"])
def test_polarizability_aligns(count, ellipticity, table):
    """(b) ⟨α_zz⟩ across the field, −(1/12kT)∫K|𝓔|² for both polarisations."""
    pulse = rotors.optical(0.4, ellipticity)
    drive = kubo.alignment_drive(rotors.fields((pulse,), LENGTH).coherency[:, 0], Z)
    driven, = twins(count, pulse, (lambda turn, spin: A_ZZ(turn),), True, alpha=ALPHA_S)
    predicted = from_the_dark(count, lambda turn, w, spin: [kubo.tensor_kernel(
        kubo.tensor_sum(turn, ALPHA_S), kubo.tensor_rate(turn, w, ALPHA_S))], [drive])
    compare(table, f"Kerr ⟨α_zz⟩, χ = {ellipticity:.2f}", driven, predicted, (2.0, 3.2), 10)


@pytest.mark.parametrize("count", COUNTS)
def test_absorption_spins(count, table):
    """(c) ⟨L_z⟩ by anisotropic absorption."""
    pulse = rotors.optical(0.25)
    driven, = twins(count, pulse, (l_z,), absorptive=ALPHA_D)
    kernel = exact_start(absorption_kernel(l_of))
    predicted = from_the_dark(count, lambda *m: [kernel(*m)], [4 * drive_of(pulse)])
    compare(table, "absorption ⟨L_z⟩", driven, predicted, (2.0, 3.2, 4.8, 6.4), 30)


@pytest.mark.parametrize("count", COUNTS)
def test_gyration_and_absorption_add(count, table):
    """(a) and (c) together, in ⟨L_z⟩ and in ⟨g_z⟩."""
    pulse = rotors.optical(0.25)
    drive = drive_of(pulse)
    oriented, spun = twins(count, pulse, (g_z, l_z), absorptive=ALPHA_D, gyration=GYRATION)
    for of, what, driven, fixed in ((g_of, "⟨g_z⟩", oriented, lambda kernel: kernel),
                                    (l_of, "⟨L_z⟩", spun, exact_start)):
        kernels = fixed(absorption_kernel(of)), gyration_kernel(of)
        predicted = from_the_dark(
            count, lambda *m, both=kernels: [k(*m) for k in both], [4 * drive, drive])
        compare(table, f"both {what}", driven, predicted, (2.0, 3.2), 10)


def test_the_light_torque_at_the_peak(table):
    """(c): averaged over orientations it is (Tr αD/6) G, which weak light hardly changes."""
    pulse = rotors.optical(0.25)
    bodies = rotors.rotors(10_000, absorptive=ALPHA_D)
    torque = rotors.travel(bodies, (pulse,), 2.48, 9,
                           watch=lambda mover, state: mover.load.light_torque[:, 2])[-1]
    field = rotors.fields((pulse,), 2.48).coherency[-1, 0, 8]
    mean, error = rotors.mean_and_error(torque)
    exact = kubo.mean_absorption(ALPHA_D, np.ones(3)) * field
    table("mean light torque over (Tr αD/6) G", f"{mean / exact:.4f} ± {error / exact:.4f}", "1")
    assert abs(mean - exact) < 4 * error
