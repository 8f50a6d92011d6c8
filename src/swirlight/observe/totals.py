"""Totals of the whole box that are recorded: name, shape, unit in the file, and how to read.

Each reads a Mover and its state at a step whose energies were asked for; values leave in the
unit of the file. Sums over bodies carry `per: box`. One entry here makes a new total.
"""

from collections.abc import Callable
from dataclasses import dataclass, field

import numpy as np

from swirlight import units
from swirlight.motion.energy import kinetic_energies, kinetic_temperature
from swirlight.observe.sums import orientation_sums

KJ = 1.0 / units.KJ_PER_MOL
VOLTS = 1.0 / units.VOLT_PER_METRE
CHARGE_LENGTH = 1.0 / units.COULOMB_METRE
SPIN = "g mol-1 nm+2 ps-1"
BOX = {"per": "box"}


@dataclass(frozen=True)
class Instant:
    """One step as the totals see it; what several of them need is worked out once."""

    mover: object
    state: object
    kinetic: tuple[float, float]  # translation, rotation [u nm²/ps²]
    light: object  # LightEnergies, or None without light
    dipole: np.ndarray  # (3,) Σ of the permanent ones [e nm]
    cosine: tuple[float, float]  # ⟨cos θ⟩, ⟨cos² θ⟩ of body z with the beam; NaN for atoms only

    @classmethod
    def of(cls, mover, state, beam=(0.0, 0.0, 1.0)):
        """The present step of a mover. beam : (3,) the axis of projections."""
        system = mover.system
        *dipole, first, second, count = orientation_sums(
            state.orientation, system.freedom, system.dipole, np.asarray(beam, float))
        cosine = (first / count, second / count) if count else (np.nan, np.nan)
        return cls(mover, state, kinetic_energies(system, state), mover.load.light_sums,
                   np.array(dipole), cosine)

    @property
    def system(self):
        """The System that moves."""
        return self.mover.system

    @property
    def ledger(self):
        """The mover's Ledger."""
        return self.mover.ledger


@dataclass(frozen=True)
class Total:
    """One recordable total.

    name : also of the element in the file.
    read : (Instant) -> number or array of `shape`, internal units.
    unit, factor, attributes : as of a Vector.
    lit : whether it says something only where light or a bias field acts; 0 without.
    """

    name: str
    read: Callable
    unit: str | None
    factor: float = 1.0
    shape: tuple[int, ...] = ()
    attributes: dict = field(default_factory=dict)
    lit: bool = False


def pressure(now):
    """p = N k T/V + W/3V with T of the translation and W the molecular virial. [u/nm/ps²]"""
    freedom = now.mover.freedom.translation
    temperature = kinetic_temperature(now.kinetic[0], freedom)
    ideal = now.system.bodies * units.BOLTZMANN * temperature
    return (ideal + now.mover.load.virial / 3.0) / np.prod(now.state.box)


def total_dipole(now):
    """Σ μ + Σ q X of net charges at unwrapped centres, and rectified dipoles. (3,) [e nm]"""
    dipole = now.dipole + now.system.charge @ now.state.position
    return dipole if now.light is None else dipole + now.light.rectified_dipole


def alignment(now):
    """⟨P2(cos θ)⟩ of body z with the beam; NaN for atoms only. [1]"""
    return 1.5 * now.cosine[1] - 0.5


def orientation_along_beam(now):
    """⟨cos θ⟩ of body z with the beam; NaN for atoms only. [1]"""
    return now.cosine[0]


def amplitude(now):
    """(3, 2) real and imaginary parts of 𝓔. [u nm/ps²/e]"""
    value = now.mover.field_at_present("amplitude")
    return np.stack([value.real, value.imag], axis=-1)


def _temperature(part):
    def read(now):
        energy, freedom = {
            "translation": (now.kinetic[0], now.mover.freedom.translation),
            "rotation": (now.kinetic[1], now.mover.freedom.rotation),
            "total": (sum(now.kinetic), now.mover.freedom.total),
        }[part]
        return kinetic_temperature(energy, freedom)

    return read


def _ledger(name):
    return lambda now: getattr(now.ledger, name)


def _work(name, source):
    return Total(name, _ledger(name), "kJ mol-1", KJ, (), {**BOX, "since": "the stage began",
                                                          "source": source})


def _impulse(name, source):
    return Total(name, _ledger(name), SPIN, 1.0, (3,), {**BOX, "since": "the stage began",
                                                       "source": source})


_ALL = (
    Total("potential_energy", lambda n: n.mover.load.energy, "kJ mol-1", KJ, (), BOX),
    Total("kinetic_energy_translation", lambda n: n.kinetic[0], "kJ mol-1", KJ, (), BOX),
    Total("kinetic_energy_rotation", lambda n: n.kinetic[1], "kJ mol-1", KJ, (), BOX),
    Total("total_energy", lambda n: sum(n.kinetic) + n.mover.load.energy, "kJ mol-1", KJ, (),
          {**BOX, "parts": "kinetic and potential, no field energy"}),
    Total("temperature", _temperature("total"), "K"),
    Total("temperature_translation", _temperature("translation"), "K"),
    Total("temperature_rotation", _temperature("rotation"), "K"),
    Total("pressure", pressure, "bar", 1.0 / units.BAR),
    Total("total_dipole", total_dipole, "C m", CHARGE_LENGTH, (3,), BOX),
    Total("total_angular_momentum", lambda n: n.state.angular_momentum.sum(axis=0), SPIN, 1.0,
          (3,), {**BOX, "parts": "sum of the bodies' own, about their centres of mass"}),
    _work("light_work", "light, mechanical"),
    _work("bias_work", "static bias field"),
    _work("bath_work", "thermostat"),
    _impulse("light_impulse", "light"),
    _impulse("pair_impulse", "interactions"),
    _impulse("bias_impulse", "static bias field"),
    _impulse("bath_impulse", "thermostat"),
    Total("absorbed_energy", _ledger("absorbed_energy"), "kJ mol-1", KJ, (),
          {**BOX, "since": "the stage began", "goes": "to electrons, not put into the bodies"}),
    Total("energy_residual", lambda n: n.mover.energy_residual(n.state), "kJ mol-1", KJ, (), BOX),
    Total("alignment", alignment, None, 1.0, (), {"of": "P2 of body z along the beam",
                                                 "per": "body"}),
    Total("orientation_along_beam", orientation_along_beam, None, 1.0, (),
          {"of": "cosine of body z with the beam", "per": "body"}),
    Total("light_energy", lambda n: n.mover.load.light_energy, "kJ mol-1", KJ, (), BOX, lit=True),
    Total("bias_energy", lambda n: n.mover.load.bias_energy, "kJ mol-1", KJ, (), BOX, lit=True),
    Total("light/amplitude", amplitude, "V m-1", VOLTS, (3, 2),
          {"of": "real and imaginary part; the first group of averaged pulses that beat, or, when"
                 " all are resolved, the first carrier"}, lit=True),
    Total("light/conjugate_product", lambda n: n.mover.field_at_present("conjugate_product"),
          "V+2 m-2", VOLTS**2, (3,),
          {"of": "sum over pulses that do not beat"}, lit=True),
    Total("light/field", lambda n: n.mover.field_at_present("field"), "V m-1", VOLTS, (3,),
          {"of": "carrier-resolved light"}, lit=True),
)
TOTALS = {total.name: total for total in _ALL}


def present(mover):
    """The Totals that this mover can fill, in order."""
    return tuple(t for t in _ALL if mover.light is not None or not t.lit)


def sample(mover, state, totals=None, beam=(0.0, 0.0, 1.0)):
    """{name: value in the unit of the file} of the present step.

    totals : those to read; None: all that the mover can fill. The energies of the step must
    have been asked for. beam : (3,) axis that projections refer to, the same in every kind.
    """
    now = Instant.of(mover, state, beam)
    return {t.name: np.asarray(t.read(now) * t.factor) for t in totals or present(mover)}
