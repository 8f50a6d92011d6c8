"""Spectra of a run: permittivity, optical-Kerr response, librations, what a weak probe meets.

    s = spectrum(run, "dipole")
    s.frequencies, s.permittivity, s.curves["permittivity"].errors, s.figures, s.notes

One independent start is one sample: values are those of the mean over starts (carrier phases
first), errors the jackknife over starts. With one start its record is cut into pieces for the
errors, and a note says so.
"""

import math

import numpy as np
from scipy import constants

from swirlight import units
from swirlight.analysis import spectra
from swirlight.analysis.kubo import tensor_sum
from swirlight.errors import InputError
from swirlight.light.response import choose_response
from swirlight.results.source import Source, quantity
from swirlight.results.spectral import Spectrum
from swirlight.results.starts import complete_starts
from swirlight.results.transient import transient
from swirlight.rotation import rotation_matrix, to_body
from swirlight.sample import build_system
from swirlight.species.body import ATOM, LINEAR

__all__ = ["OF", "Spectrum", "spectrum"]

BLOCK = 2_000_000  # orientations or vectors held at once
LOUD = 0.02  # of the largest value: above it at the end of the band something was cut off
DEBYE = 1e-21 / constants.c * units.COULOMB_METRE  # e nm
CUBIC_METRE = 1e30 * units.CUBIC_ANGSTROM


def spectrum(run, of="dipole", kind=None, window="hann", longest_lag=None, **more):
    """The `Spectrum` of a Run (`open_run`).

    of : "dipole" (permittivity, absorption, refractive index), "kerr" (optical-Kerr
        response), "libration" (density of states of angular velocities), "transient" (the
        permittivity that a weak probe pulse meets).
    kind : "dark", "plus" or "minus"; left out: dark, or the first there is.
    window : "hann", "gaussian", "triangle" or "none", of the correlation function.
    longest_lag : of the correlation function, "10 ps"; left out: an eighth of the record.
    high_frequency : of dipole and transient: ε∞; left out: 1, as the bodies do not polarise.
    wavelength : of kerr: "800 nm", where the polarizability is given at several.
    species : of libration: its name, where several could be meant.
    Raises InputError for what cannot be had from this run.
    """
    if of not in OF:
        raise InputError(f"no spectrum of {of!r}; there are {', '.join(OF)}")
    make, options = OF[of]
    for name in more:
        if name not in options:
            raise InputError(f"{name} says nothing about a spectrum of {of}"
                             + (f"; {', '.join(options)} would" if options else ""))
    if kind is None:
        kinds = complete_starts(run).phases
        kind = "dark" if "dark" in kinds else next(iter(kinds))
    lag = None if longest_lag is None else units.parse_quantity(longest_lag, "time")
    return make(run, kind, window, lag, **{k: v for k, v in more.items() if v is not None})


def _dipole(run, kind, window, lag, high_frequency=None):
    source = Source(run, kind, "total_dipole", window, lag)
    if source.driven:
        return _power(source, "dipole", "permittivity", _moments, DEBYE**2, "D^2 ps",
                      "of the collective dipole")
    top = spectra.checked_high_frequency(high_frequency)
    ions = _ions(source.first)
    mean, parts = source.correlations(_currents if ions else _moments)
    setting = (source.interval, source.size, source.volume, source.temperature)
    notes = [*source.notes(mean), *_boundary(run.config.forces), _said(high_frequency),
             f"kT at the mean temperature of these trajectories, {source.temperature:.2f} K"]

    def sigma(c):
        return spectra.conductivity(c, *setting)

    def epsilon(c):
        if ions:
            return spectra.permittivity_of_conductor(sigma(c), source.frequencies, top)
        return spectra.permittivity(c, *setting, top)

    def alpha(c):
        per_nm = spectra.absorption(source.frequencies, epsilon(c).T).T
        return per_nm / spectra.PER_CENTIMETRE

    figures = {"static permittivity": (lambda c: epsilon(c)[:1].real, "")}
    if ions:
        notes.append("ions: from the collective current, the static conductivity split off")
        figures["static conductivity"] = (
            lambda c: sigma(c)[:1].real / spectra.SIEMENS_PER_METRE, "S/m")
    else:
        figures["from fluctuations"] = (
            lambda c: top + c[:1] * spectra.dipole_strength(source.volume, source.temperature), "")
    curves = {
        "permittivity": source.curve(mean, parts, epsilon, "", "complex permittivity"),
        "absorption": source.curve(mean, parts, alpha, "cm^-1",
                                   "absorption coefficient of the intensity"),
        "refractive_index": source.curve(mean, parts, lambda c: spectra.refraction(epsilon(c)),
                                         "", "refractive index"),
    }
    return source.result("dipole", "complex permittivity", curves, notes,
                         source.figures(mean, parts, figures))


def _said(high_frequency):
    return "high-frequency permittivity 1: the bodies of this model do not polarise" \
        if high_frequency is None else f"high-frequency permittivity {high_frequency:g}, as given"


def _boundary(forces):
    """What the electrostatics do to the fluctuation formula."""
    if forces.electrostatics in ("mesh-ewald", "direct-ewald"):
        return []
    if forces.electrostatics == "reaction-field" and math.isinf(forces.reaction_permittivity):
        return []
    return [f"electrostatics {forces.electrostatics}: the formula is that of a conducting"
            " boundary; do not trust it here without a comparison with an Ewald sum"]


def _ions(trajectory):
    """Whether a species carries a net charge."""
    charges = [np.asarray(s["charge"]) for s in trajectory.parameters["species"].values()]
    return any(abs(q.sum()) > 1e-6 * max(np.abs(q).max(), 1e-30) for q in charges)


def _moments(trajectory):
    yield _total(trajectory)[:, None]


def _currents(trajectory):
    yield np.diff(_total(trajectory), axis=0)[:, None] / trajectory["total_dipole"].interval


def _total(trajectory):
    """(frames, 3) collective dipole. [e nm]"""
    return np.asarray(quantity(trajectory, "total_dipole")) * units.COULOMB_METRE


def _kerr(run, kind, window, lag, wavelength=None):
    source = Source(run, kind, "orientation", window, lag)
    tensors, colour = _polarizabilities(run, wavelength)
    source.note(colour)

    def read(trajectory):
        yield _collective(trajectory, tensors).reshape(-1, 1, 9)

    if source.driven:
        return _power(source, "kerr", "optical-Kerr response", read, CUBIC_METRE**2,
                      "m^6 ps", "of the collective polarizability volume, traceless part")
    mean, parts = source.correlations(read)
    setting = (source.temperature, source.bodies)

    def chi(c):
        return spectra.kerr_susceptibility(c, source.interval, source.size, *setting) \
            / spectra.HYPERPOLARIZABILITY

    def in_time(c):
        return spectra.kerr_response(c, source.interval, *setting) / spectra.HYPERPOLARIZABILITY

    meaning = "alignment of the polarizability per body and squared amplitude"
    curves = {"susceptibility": source.curve(mean, parts, chi, "C m^4/V^3", meaning)}
    response = source.curve(mean, parts, in_time, "C m^4/V^3/ps", meaning, smooth=False)
    return source.result(
        "kerr", "optical-Kerr susceptibility", curves, source.notes(mean),
        source.figures(mean, parts, {"static susceptibility": (lambda c: chi(c)[:1].real,
                                                               "C m^4/V^3")}),
        lags=source.interval * np.arange(source.lags), response=response)


def _polarizabilities(run, wavelength):
    """({species index: (3, 3) αS [e² ps²/u]}, a note)."""
    config, sample = run.config, build_system(run.config).species
    given = {r.at for s in sample for r in s.responses}
    carriers = given if len(given) == 1 else {p.carrier for p in config.light}
    if wavelength is not None:
        carriers = {units.parse_quantity(wavelength, "carrier")}
    elif given and len(carriers) != 1:
        raise InputError("the polarizability is given at several wavelengths: name one")
    carrier = next(iter(carriers), None) or 2 * np.pi * units.LIGHT_SPEED / 800.0
    said = f"at {2 * np.pi * units.LIGHT_SPEED / carrier:.4g} nm" if carriers - {None} else \
        "given without a wavelength"
    found = {}
    for index, species in enumerate(sample):
        alpha = choose_response(species, carrier, resolved=True)[0].polarizability
        if np.ptp(np.linalg.eigvalsh(alpha)) > 1e-9 * np.abs(alpha).max():
            found[index] = alpha
    if not found:
        raise InputError(f"{run.path}: no species has an anisotropic polarizability")
    return found, f"polarizability {said}"


def _collective(trajectory, tensors):
    """(frames, 3, 3) traceless Π = Σ R αS Rᵀ of the species in `tensors`, frames in blocks."""
    series, kinds = trajectory["orientation"], trajectory.species
    total = np.zeros((len(series), 3, 3))
    step = max(1, BLOCK // max(1, series.shape[1] * 9))
    for first in range(0, len(series), step):
        block = series[first:first + step]
        for index, alpha in tensors.items():
            total[first:first + step] += tensor_sum(
                rotation_matrix(block[:, kinds == index]), alpha)
    return total


def _libration(run, kind, window, lag, species=None):
    index, chosen = _rotating(run, species)
    source = Source(run, kind, "orientation", window, lag)
    names = ("across the axis",) if chosen.freedom == LINEAR else ("x", "y", "z")

    def read(trajectory):
        return _angular_velocities(trajectory, index, chosen)

    mean, parts = source.correlations(read, summed=False)
    if chosen.freedom == LINEAR:
        mean, parts = mean.mean(axis=-1, keepdims=True), parts.mean(axis=-1, keepdims=True)
    curves = {}
    for axis, name in enumerate(names):
        first = mean[0, axis]  # kept fixed, so that errors are those of a linear function

        def density(c, first=first):
            return 2 * spectra.spectral_density(c, source.interval, source.size) / first

        curves[name.split()[0]] = source.curve(
            mean[..., axis], parts[..., axis], density, "ps",
            f"density of states of the angular velocity, {name}")
    source.note(f"species {chosen.name}; each curve has the integral 1 over THz; "
                + ("laboratory frame" if chosen.freedom == LINEAR else "body frame"))
    if any(c.values[-1] > LOUD * c.values.max() for c in curves.values()):
        source.note(f"motion goes on at {source.frequencies[-1]:.4g} THz, the fastest that this"
                    " record shows, and what is faster is folded back: record more often")
    label = "power spectrum, not an equilibrium density of states" if source.driven else \
        "librational density of states"
    return source.result("libration", label, curves, source.notes(mean[:, 0]))


def _rotating(run, name):
    """(index, Species) of the one that librates. Raises InputError where that is not clear."""
    rotating = {s.name: (i, s) for i, s in enumerate(build_system(run.config).species)
                if s.freedom != ATOM}
    if name is None and len(rotating) == 1:
        return next(iter(rotating.values()))
    if name not in rotating:
        raise InputError(f"species: {name or 'which'}? {', '.join(rotating) or 'none'} can rotate")
    return rotating[name]


def _angular_velocities(trajectory, index, species):
    """Blocks (frames, n, 3) of bodies; body frame, laboratory frame for linear ones. [rad/ps]"""
    rows = np.flatnonzero(trajectory.species == index)
    frames = len(trajectory["orientation"])
    step = max(1, BLOCK // frames)
    direct = "angular_velocity" in trajectory
    series = quantity(trajectory, "angular_velocity" if direct else "angular_momentum")
    for first in range(rows[0], rows[-1] + 1, step):  # bodies of a species lie together
        bodies = slice(first, min(first + step, rows[-1] + 1))
        value = np.asarray(series[:, bodies], float)
        if species.freedom == LINEAR:
            yield value if direct else value / species.inertia[0]
        else:
            value = to_body(trajectory["orientation"][:, bodies], value)
            yield value if direct else value / species.inertia


def _power(source, of, no, read, unit, text, meaning):
    """The power spectrum of a run that is not in equilibrium."""
    mean, parts = source.correlations(read)
    source.note(f"{source.driven} in {source.kind}: what follows the light is in it as well, and"
                " no fluctuation formula holds")
    curve = source.curve(
        mean, parts, lambda c: spectra.spectral_density(c, source.interval, source.size) / unit,
        text, f"two-sided power spectrum {meaning}")
    return source.result(of, f"power spectrum, not {no}", {"power": curve}, source.notes(mean))


# What a spectrum may be of: how it is made, and what else it takes.
OF = {
    "dipole": (_dipole, ("high_frequency",)),
    "kerr": (_kerr, ("wavelength",)),
    "libration": (_libration, ("species",)),
    "transient": (transient, ("high_frequency",)),
}
