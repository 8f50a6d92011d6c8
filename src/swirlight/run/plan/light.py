"""Parts of `check` about the light: each pulse, what it is to each body, heating, the bias."""

import numpy as np

from swirlight.light.describe import ELECTRON_VOLT, describe, describe_beats
from swirlight.light.exposure import exposed
from swirlight.light.limits import VISIBLE, sample_statements, strength_for
from swirlight.light.regime import ENOUGH_STEPS, check_steps
from swirlight.light.response import choose_response
from swirlight.run.plan.figures import absorbed_spin, photon_over_kt
from swirlight.run.plan.page import Notice, Row, Section, quantity
from swirlight.run.plan.sample import heat_capacity
from swirlight.units import HBAR

LINEAR_RESPONSE = 0.3  # wells in kT and impulses in √(IkT): departures are expected above
IONISATION = 1e12, 1e13  # W/cm², fs to ps pulses in molecular liquids (common practice, no source)
HEATING = 0.02  # of the temperature, warned of above
PULSE_STEPS = 20  # timesteps in the FWHM of the intensity


def pulses(subject):
    """Each pulse as it acts: strengths, decision on coupling, achieved values, what it wants."""
    temperature = subject.system.temperature
    for n, pulse in enumerate(subject.pulses):
        key, said = f"light[{n}]", describe(pulse, length=subject.lit_length)
        rows = [Row("coupling", pulse.coupling, "", pulse.reason)]
        rows += [Row(name, float(value), unit) for name, (value, unit) in said.figures.items()]
        rows += [
            Row("ħω/kT", float(photon_over_kt(pulse.carrier, temperature))),
            Row("s3", float(pulse.s3), "", "sin 2χ, 1 for positive helicity"),
            Row("in kinds", pulse.in_kinds),
            Row("steps per duration", pulse.envelope.duration / subject.lit.timestep),
        ]
        if pulse.coupling == "resolved":
            steps = 2.0 * np.pi / (pulse.carrier * subject.lit.timestep)
            rows.append(Row("steps per cycle", steps, "", f"{ENOUGH_STEPS} are enough"))
        yield Section(key, tuple(rows))
        warnings = list(said.warnings)
        if pulse.coupling == "resolved" and said.figures["cycles per duration"][0] < 1.0:
            yield Notice("subcycle-pulse", f"{key}.duration: {warnings.pop(0)}")
        for text in warnings:
            yield Notice("pulse-cut", f"{key}.centre: {text}")
        yield from _validity(key, pulse, subject)
    if len(subject.pulses) > 1:
        lines = describe_beats(subject.pulses, subject.system)
        if lines:
            yield Section("beats", tuple(Row(f"beat {n}", line) for n, line in enumerate(lines)))


def _validity(key, pulse, subject):
    """Warnings on one pulse whatever the bodies."""
    if pulse.refractive_index == 1.0:
        yield Notice("refractive-index", f"{key}.refractive_index: 1, that of vacuum: intensities"
                     " are those inside the sample, and with n = 1 |𝓔|² is overestimated by the"
                     " liquid's own index")
        if pulse.local_field != "none":
            yield Notice("local-field-without-index", f"{key}.local_field: {pulse.local_field}"
                         " with a refractive_index of 1 changes nothing")
    if pulse.intensity >= IONISATION[0]:
        how = "beyond" if pulse.intensity >= IONISATION[1] else "within"
        yield Notice("ionisation", f"{key}: {pulse.intensity:.2g} W/cm^2 is {how} the order of"
                     " 1e12 to 1e13 W/cm^2 at which fs to ps pulses ionise and break down"
                     " molecular liquids (common practice, no source)")
    if pulse.coupling == "resolved":
        quantum = photon_over_kt(pulse.carrier, subject.system.temperature)
        if quantum > 1.0:
            yield Notice("quantum-carrier", f"{key}.carrier: ħω is {quantum:.2g} kT: classical"
                         " torques of a resolved carrier are qualitative there")
    yield from _steps(key, pulse, subject.lit.timestep)


def _steps(key, pulse, timestep):
    """Whether the timestep follows carrier, envelope and turning azimuth."""
    warning = check_steps(pulse, timestep)
    if warning is not None:
        yield Notice("steps-per-cycle", f"{key}: {warning}")
    duration = pulse.envelope.duration
    if duration < PULSE_STEPS * timestep * (1.0 - 1e-9):
        yield Notice("steps-per-pulse", f"{key}.duration: {duration / timestep:.3g} timesteps in"
                     f" the pulse; with {duration / PULSE_STEPS:.3g} ps there are {PULSE_STEPS}")
    speed = fastest_turning(pulse)
    if speed * timestep * PULSE_STEPS > np.pi:  # an azimuth repeats after half a turn
        yield Notice("steps-per-turn", f"{key}.turning: the azimuth turns at up to {speed:.3g}"
                     f" rad/ps, fewer than {PULSE_STEPS} timesteps in half a turn; the longest"
                     f" timestep is {np.pi / speed / PULSE_STEPS:.3g} ps")


def fastest_turning(pulse):
    """Largest |ν + βt| while the pulse is above 1e-4 of its peak. [rad/ps]"""
    rate, acceleration = pulse.turning
    before, after = pulse.envelope.reach(1e-4)
    return max(abs(rate - acceleration * before), abs(rate + acceleration * after))


def strengths(subject):
    """Wells, impulses and absorption of every pulse for every species that is there."""
    for n, pulse in enumerate(subject.pulses):
        for species, count in subject.counted_species:
            if count:
                yield from _strength(f"light[{n}]", pulse, species, subject)
    for text in sample_statements(subject.pulses, subject.system):
        code = next(code for code, words in _STATEMENTS.items() if words in text)
        yield Notice(code, text)


_STATEMENTS = {
    "one-signed-gyration": "one sign of gyration",
    "rectification-without-absorption": "rectification without absorption",
    "dipole-in-averaged-light": "permanent dipole",
}


def _strength(key, pulse, species, subject):
    where = f"{key} on {species.name}"
    figures, _ = strength_for(pulse, species, subject.system.temperature)
    response, warning = choose_response(species, pulse.carrier, pulse.coupling == "resolved")
    photons = figures["photons absorbed"][0]
    rows = [Row(name, float(value), unit, _MEANING.get(name, ""))
            for name, (value, unit) in figures.items()]
    if np.any(response.absorptive):
        spin = absorbed_spin(response.absorptive, species.freedom, pulse.s3, dose(pulse))
        rows += [
            quantity("energy absorbed", photons * HBAR * pulse.carrier, "energy",
                     "mean per body and pulse, by the electrons"),
            quantity("spin from absorption", spin, "angular momentum",
                     "mean light impulse along the beam per body and pulse, random orientations"),
        ]
    if pulse.coupling == "resolved" and np.any(species.dipole):
        rows.append(Row("dipolar absorption", "unknown before the run", "",
                        "the run's own temperature and work tell it"))
    yield Section(where, tuple(rows))
    if warning is not None:
        yield Notice("response-wavelength", warning)
    if not species.responses and pulse.coupling == "averaged":
        yield Notice("no-light-response", f"{where}: no light_response, so averaged light does"
                     " nothing to it")
    yield from _beyond_linear(where, pulse, figures, subject)
    if HBAR * pulse.carrier / ELECTRON_VOLT >= VISIBLE and photons > 0.0:
        yield from _photons(where, photons)


def _photons(where, photons):
    if photons > 0.1:
        yield Notice("photons-absorbed", f"{where}: {photons:.2g} photons absorbed per body and"
                     " pulse: above 0.1 a rigid ground-state model no longer holds")
    else:
        yield Notice("few-excited", f"{where}: {photons:.2g} photons absorbed per body and pulse:"
                     " in reality a few excited molecules with ħ each; means hold,"
                     " distributions do not")


_MEANING = {
    "alignment well": "energy of the polarizability from best to worst orientation",
    "gyration well": "|g||G|/4kT",
    "alignment impulse": "over √(IkT); linear response wants it ≪ 1",
    "gyration impulse": "over √(IkT); linear response wants it ≪ 1",
    "absorption impulse": "over √(IkT); linear response wants it ≪ 1",
    "dipole energy": "largest μE",
    "dipole impulse": "μE0/(ω√(IkT)), the swing of half a cycle; linear response wants it ≪ 1",
    "quiver of the dipole": "its effective polarizability −μ²/(Iω²), left out by averaged light",
}


def deciding(pulse, figures, rotation_period):
    """The name and value of the figure that decides whether the response is linear.

    For a pulse shorter than the rotation the impulses, else the wells, and absorption either
    way; for a resolved dipole the smaller of well and swing, as a fast carrier leaves no time
    for a deep well and a slow one makes a long swing of a shallow one.
    """
    kind = "impulse" if pulse.envelope.duration < rotation_period else "well"
    names = [f"alignment {kind}", f"gyration {kind}", "absorption impulse"]
    if pulse.coupling == "resolved":
        names.append(min(("dipole energy", "dipole impulse"), key=lambda name: figures[name][0]))
    name = max(names, key=lambda name: figures[name][0])
    return name, figures[name][0]


def _beyond_linear(where, pulse, figures, subject):
    name, value = deciding(pulse, figures, subject.rotation_period)
    if value > LINEAR_RESPONSE:
        unit = " thermal angular momenta √(IkT)" if name.endswith("impulse") else " kT"
        yield Notice("beyond-linear-response", f"{where}: {name} is {value:.3g}{unit}: above"
                     f" {LINEAR_RESPONSE} the response is no longer proportional to the intensity")


def dose(pulse):
    """∫|𝓔|² dt of one copy at a body, local field included. [(u nm/ps²/e)² ps]"""
    square = (pulse.amplitude * pulse.local_factor) ** 2
    return square * pulse.envelope.fluence_factor * pulse.envelope.duration


def heating(subject):
    """Energy absorbed by all pulses and the temperature rise it stands for."""
    if not subject.pulses:
        return
    absorbed, capacity, temperature = 0.0, 0.0, subject.system.temperature
    for species, count in subject.counted_species:
        per_body = sum(p.count * _absorbed_energy(p, species, temperature) for p in subject.pulses)
        absorbed += count * per_body / subject.system.bodies
        capacity += count * heat_capacity(species)[0] / subject.system.bodies
    bounds = [s.name for s, n in subject.counted_species if n and s.heat_capacity is None]
    note = f"; an upper bound: C_V of {', '.join(bounds)} is not known" if bounds else ""
    rise = absorbed / capacity
    rows = [
        quantity("energy absorbed", absorbed, "energy", "by all pulses, mean per body"),
        quantity("heating", rise, "temperature", f"E_abs/C_V{note}"),
    ]
    if any(p.coupling == "resolved" for p in subject.pulses) and _has_dipole(subject):
        rows.append(Row("dipolar heating", "unknown before the run"))
    yield Section("heating", tuple(rows))
    if rise > HEATING * temperature:
        yield Notice("heating", f"light: absorption heats the sample by {rise:.3g} K, which the"
                     " bodies do not feel in this model")


def _absorbed_energy(pulse, species, temperature):
    """E_abs of one copy per body. [u nm²/ps²]"""
    figures, _ = strength_for(pulse, species, temperature)
    return figures["photons absorbed"][0] * HBAR * pulse.carrier


def _has_dipole(subject):
    return any(n and np.any(s.dipole) for s, n in subject.counted_species)


def bias(subject):
    """The static field against kT."""
    if subject.bias is None:
        return
    strength = float(np.linalg.norm(subject.bias.vector))
    rows = [quantity("largest field", strength, "field")]
    for species, count in subject.counted_species:
        if count:
            energy = float(np.linalg.norm(species.dipole)) * strength / subject.energy
            rows.append(Row(f"largest μF on {species.name}", energy, "kT"))
    if not subject.bias.always:
        rows += [quantity("on from", subject.bias.begin, "time"),
                 quantity("on until", subject.bias.end, "time")]
    yield Section("bias field", tuple(rows))


def odd_part(subject):
    """Whether plus and minus can differ at all."""
    kinds = {e.kind for e in subject.exposures}
    lit = exposed(subject.pulses)
    if not {"plus", "minus"} <= kinds or not lit or _has_odd_part(lit, subject):
        return
    if any(p.ellipticity for p in lit):
        why = ("averaged light of one azimuth has an odd part only through absorptive"
               " polarizability, gyration, or rectification with a bias field, and no species has"
               " them")
    else:
        why = "linear light of one azimuth is its own mirror image"
    yield Notice("no-odd-part", f"exposures.kinds: plus and minus come out the same: {why}")


def _has_odd_part(lit, subject):
    first = lit[0]
    if any(p.coupling == "resolved" and p.ellipticity for p in lit):
        return True
    if any(p.turning != (0.0, 0.0) or p.direction != first.direction or p.azimuth != first.azimuth
           for p in lit):
        return True
    if not any(p.ellipticity for p in lit):
        return False
    responses = [choose_response(s, p.carrier)[0] for s, n in subject.counted_species if n
                 for p in lit if p.coupling == "averaged"]
    return any(np.any(r.absorptive) or np.any(r.gyration)
               or (np.any(r.rectification) and subject.bias is not None) for r in responses)
