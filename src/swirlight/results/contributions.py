"""How each kind of light moves each observable at its lowest order: kernels and convolutions.

A contribution has
    sums : {name: function of Bodies}, what it needs of a dark trajectory;
    kernels(sums) -> {name: (T,) of one start};
    predict({name: (..., S)}) -> (..., instants) response of the whole box, internal units.
"""

from dataclasses import dataclass, field
from functools import partial

import numpy as np

from swirlight.analysis import kubo


def total_spin(bodies):
    """(frames, 3) Σ L. [u nm²/ps]"""
    return bodies.momentum.sum(axis=-2)


@dataclass
class AveragedVector:
    """Gyration and absorption acting on a vector: cases (a) and (c), which add.

    read : the collective vector A, function of Bodies. group : index of the colour.
    spin : whether A is Σ L, whose kernel with J begins at N kT times `mean_absorption`.
    """

    subject: object
    read: object
    group: int
    spin: bool
    sums: dict = field(init=False)

    def __post_init__(self):
        subject, name = self.subject, f"{self.group}"
        self.optics = subject.optics(subject.groups[self.group])
        self.drive = kubo.gyration_drive(subject.coherency("odd")[:, self.group], subject.k)
        self.sums = {"vector": self.read}
        turns = any(o.gyration.any() for o in self.optics)
        if turns and not (self.spin and not subject.gyration_may_spin(self.optics)):
            self.sums[f"gyration {name}"] = self._turning
        if any(o.absorptive.any() for o in self.optics):
            self.sums[f"absorption {name}"] = self._absorbing
        self.fluxes = [n for n in self.sums if n != "vector"]

    def _turning(self, bodies):
        return kubo.vector_rate(bodies.turn, bodies.spin, self.optics[bodies.kind].gyration)

    def _absorbing(self, bodies):
        return kubo.absorption_flux(bodies.turn, bodies.spin, self.optics[bodies.kind].absorptive)

    def kernels(self, sums):
        """One for each flux."""
        return {name: kubo.vector_kernel(sums["vector"], sums[name]) for name in self.fluxes}

    def predict(self, kernels):
        """(..., instants) Δ⟨A·k⟩."""
        subject, total = self.subject, 0.0
        for name in self.fluxes:
            kernel, strength = kernels[name], 1.0
            if name.startswith("absorption"):
                strength = 4.0  # its drive is G, not G/4
                if self.spin:
                    exact = subject.kt * subject.per_species(mean_absorptions(subject, self.optics))
                    kernel = kernel * (exact / kernel[..., :1])
            total = total + strength * subject.convolve(kernel, self.drive)
        return total / subject.kt


@dataclass
class AveragedTensor:
    """Polarizability acting on a symmetric traceless tensor: case (b)."""

    subject: object
    read: object
    group: int
    sums: dict = field(init=False)

    def __post_init__(self):
        subject = self.subject
        self.optics = subject.optics(subject.groups[self.group])
        self.drive = kubo.alignment_drive(subject.coherency("even")[:, self.group], subject.k)
        self.name = f"polarizability {self.group}"
        self.sums = {"tensor": self.read, self.name: self._turning}

    def _turning(self, bodies):
        return kubo.tensor_rate(bodies.turn, bodies.spin, self.optics[bodies.kind].polarizability)

    def kernels(self, sums):
        """The one."""
        return {self.name: kubo.tensor_kernel(sums["tensor"], sums[self.name])}

    def predict(self, kernels):
        """(..., instants) Δ⟨A_kk⟩."""
        subject = self.subject
        return subject.convolve(kernels[self.name], self.drive) / subject.kt


@dataclass
class MeanTorque:
    """What averaged light delivers at first order: ∫Σ (Tr αD/6) G dt, without any kernel."""

    subject: object
    group: int
    sums = {}

    def kernels(self, sums):
        """None."""
        return {}

    def predict(self, kernels):
        """(instants,) impulse along k."""
        subject = self.subject
        optics = subject.optics(subject.groups[self.group])
        strength = subject.per_species(mean_absorptions(subject, optics))
        drive = 4.0 * kubo.gyration_drive(subject.coherency("odd")[:, self.group], subject.k)
        return strength * subject.integral(drive)


@dataclass
class Delivered:
    """What resolved light delivers: case (d), exact at second order in E.

    of : "impulse", "work", or "spin", the last of which is an estimate.
    """

    subject: object
    of: str
    sums: dict = field(init=False)

    def __post_init__(self):
        dipoles = [s.dipole for s in self.subject.system.species]
        self.sums = {"dipole": partial(_vector, dipoles), "current": partial(_rate, dipoles)}
        if self.of == "spin":
            self.sums["spin"] = total_spin
        self.part = "even" if self.of == "work" else "odd"
        self.fields = self.subject.carriers(self.part)

    def kernels(self, sums):
        """χ(s), and for the estimate C_L(s)."""
        found = {"susceptibility": kubo.vector_kernel(sums["dipole"], sums["current"])
                 / self.subject.kt}
        if self.of == "spin":
            found["spin"] = kubo.vector_kernel(sums["spin"], sums["spin"])
        return found

    def predict(self, kernels):
        """(..., instants) impulse along k, work, or spin along k."""
        subject, total = self.subject, 0.0
        step = subject.interval / subject.finer
        susceptibility = kubo.refined(kernels["susceptibility"], subject.finer)
        for weight, wave, rate, quadratures in self.fields:
            dipole = kubo.polarise(susceptibility, wave, step)
            if self.of == "work":
                total = total + weight * kubo.delivered_work(dipole, wave, rate, step)
            else:
                torque = kubo.delivered_torque(dipole, wave, subject.k)
                total = total + weight * (torque + self._absorbed(wave, quadratures))
        if self.of == "impulse":
            return subject.integral(total)
        if self.of == "spin":
            correlation = kubo.refined(kernels["spin"], subject.finer)
            total = np.broadcast_to(total, (*correlation.shape[:-1], total.shape[-1]))
            return kubo.spin_estimate(correlation, total, step)
        return total

    def _absorbed(self, wave, quadratures):
        """(instants,) torque of the dipoles −αD Ė/ω, averaged over orientations."""
        subject, total = self.subject, 0.0
        for colour, quadrature in quadratures:
            strength = subject.per_species(mean_absorptions(subject, subject.optics(colour)))
            total = total - 2.0 * strength * np.cross(quadrature, wave) @ subject.k
        return total


def mean_absorptions(subject, optics):
    """`kubo.mean_absorption` of every species."""
    return [kubo.mean_absorption(o.absorptive, free)
            for o, free in zip(optics, subject.free, strict=True)]


def _vector(vectors, bodies):
    return kubo.vector_sum(bodies.turn, vectors[bodies.kind])


def _rate(vectors, bodies):
    return kubo.vector_rate(bodies.turn, bodies.spin, vectors[bodies.kind])
