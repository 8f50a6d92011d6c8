"""What the light delivered: impulse per photon and per fluence, work, heat; and the control.

Photon fluence F = Σ over exposed pulses and copies of (∫I dt)/ħω, inside the sample. Absorbed
photons are absorbed_energy/ħω of averaged light; of resolved light, which moves the bodies
themselves, the quanta are its mechanical work over ħω. An isotropic absorber takes s3·ħ of angular
momentum with each photon (Beth, Phys. Rev. 50, 115 (1936)).
"""

from dataclasses import dataclass

import numpy as np

from swirlight import units
from swirlight.analysis.statistics import (
    LEAST_STARTS,
    function_of_means,
    half_width,
    mean_and_error,
    studentised_interval,
)
from swirlight.analysis.twins import even_odd
from swirlight.results.response import CLEAR, respond

JOULE_PER_CM2 = units.JOULE * 1e-14  # u/ps² in 1 J/cm²


@dataclass(frozen=True)
class Figure:
    """One number over starts: value, standard error, 95 % interval (Student's t of means, the
    bootstrap of ratios; NaN where there can be none), unit, and what it is of."""

    value: float
    error: float
    interval: tuple
    unit: str
    of: str


def photon_fluence(pulses):
    """Photons through 1 nm² from all exposed pulses and their copies. [1/nm²]"""
    return sum(p.count * p.fluence * JOULE_PER_CM2 / (units.HBAR * p.carrier) for p in pulses)


def delivered(experiment):
    """{name: Figure} of a run with both lit kinds; cumulative totals at the last frame.

    impulse : odd part along the beam [ħ per body]; impulse_per_fluence [ħ nm²];
    impulse_per_photon [ħ], left out where nothing was absorbed; mechanical_work,
    absorbed_energy [kJ/mol per body], means of plus and minus.
    """
    bodies, k = experiment.system.bodies, experiment.beam
    lit = ("plus", "minus")

    def last(name):
        return experiment.collect(lambda t: np.asarray(t[name][-1], float) / bodies, lit)

    impulse = {kind: v @ k / units.HBAR for kind, v in last("light_impulse").items()}
    odd = even_odd(impulse["plus"], impulse["minus"])[1]
    work, absorbed = (0.5 * sum(last(n).values()) for n in ("light_work", "absorbed_energy"))
    found = {"impulse": _mean(odd, "hbar", "odd along the beam, per body")}
    fluence = photon_fluence(experiment.seen)
    if fluence > 0:
        found["impulse_per_fluence"] = _mean(
            odd / fluence, "hbar nm2", f"per body; {fluence:.4g} photons per nm²")
    carriers = {p.carrier for p in experiment.seen}
    if len(carriers) == 1:
        energy, what = (work, "quantum ħω of mechanical work") if experiment.resolved else \
            (absorbed, "absorbed photon")
        photons = energy * units.KJ_PER_MOL / (units.HBAR * carriers.pop())
        # a ratio to something not told from zero says nothing
        if mean_and_error(photons)[2] < CLEAR or (len(photons) == 1 and photons[0] > 0):
            found["impulse_per_photon"] = _ratio(odd, photons, "hbar", f"per {what}")
    found["mechanical_work"] = _mean(work, "kJ mol-1", "per body, mean of plus and minus")
    found["absorbed_energy"] = _mean(absorbed, "kJ mol-1",
                                     "per body, goes to electrons; mean of plus and minus")
    return found


def _mean(values, unit, of):
    mean, error, _ = mean_and_error(values)
    half = half_width(error, len(values))
    return Figure(float(mean), float(error), (float(mean - half), float(mean + half)), unit, of)


def _ratio(numerator, denominator, unit, of):
    values = np.stack([numerator, denominator], axis=1)
    ratio = lambda m: m[..., 0] / m[..., 1]  # noqa: E731
    if len(values) < 2:
        nothing = float("nan")
        return Figure(float(ratio(values[0])), nothing, (nothing, nothing), unit, of)
    value, error = function_of_means(values, ratio)
    low, high = studentised_interval(values, ratio, np.random.default_rng(21))
    few = "" if len(values) >= LEAST_STARTS else f"; no interval below {LEAST_STARTS} starts"
    return Figure(float(value), float(error), (float(low), float(high)), unit, of + few)


def heating(experiment):
    """How warm it gets, both ways: {name: {value, unit, ...}} as in summary.json.

    own_temperature : the run's thermometer, lit less dark, mean from the end of the light on;
    work_over_heat_capacity, absorbed_over_heat_capacity : what the light gave over C_V.
    """
    lit = [kind for kind in ("plus", "minus") if kind in experiment.kinds]
    if not lit or not len(experiment):
        return {}

    def after_light(trajectory):
        kelvin = trajectory["temperature"]
        first = int(np.searchsorted(kelvin.times, experiment.span[1]))
        return float(np.mean(kelvin[min(first, len(kelvin) - 1):]))

    capacity, known = heat_capacity(experiment.system)

    def warmed(name):
        energy = experiment.collect(lambda t: float(t[name][-1]), lit)
        return float(np.mean(list(energy.values())) * units.KJ_PER_MOL / capacity)

    found = {
        "work_over_heat_capacity": {"value": warmed("light_work"), "unit": "K"},
        "absorbed_over_heat_capacity": {
            "value": warmed("absorbed_energy"), "unit": "K",
            "heat_capacity": "of the species' files" if known else
            "kinetic part alone where no heat capacity is given: an upper bound",
        },
    }
    if "dark" in experiment.kinds:  # without the dark twin there is nothing to take it from
        rows = experiment.collect(after_light)
        value, error, _ = mean_and_error(np.mean([rows[k] for k in lit], axis=0) - rows["dark"])
        found["own_temperature"] = {"value": float(value), "error": float(error), "unit": "K",
                                    "of": "lit less dark, mean from the end of the light on"}
    return found


def heat_capacity(system):
    """(C_V of the box, whether every species gives its own). [u nm²/ps²/K]"""
    total, known = 0.0, True
    for species, count in zip(system.species, system.counts, strict=True):
        own = species.heat_capacity
        known = known and own is not None
        kinetic = 0.5 * units.BOLTZMANN * (3 + species.freedom)
        total += count * (kinetic if own is None else own)
    return total, known


def control(experiment):
    """{name: figures} of the odd parts of temperature and light work, which have zero mean in an
    isotropic liquid: a helicity flip is a rotation of the light by half a turn about its azimuth
    axis. Empty where a bias field or a pulse with `in_kinds: same` breaks that."""
    config = experiment.config
    if config.bias_field is not None or any(p.in_kinds == "same" for p in experiment.pulses):
        return {}
    return {name: respond(experiment, name).figures() for name in ("temperature", "light_work")}
