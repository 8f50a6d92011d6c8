"""How strong the light is for one kind of body: the limits that `check` computes and states.

Wells in units of kT and impulses in units of the thermal angular momentum √(I kT), I the
smallest non-zero moment. Linear response wants both ≪ 1; for pulses shorter than the rotation
the impulses decide. No numba here.
"""

from math import sqrt

import numpy as np

from swirlight.light.describe import ELECTRON_VOLT
from swirlight.light.response import choose_response
from swirlight.units import BOLTZMANN, HBAR

VISIBLE, TOO_MANY = 0.5, 0.1  # eV a photon, photons a body and pulse: physics.md §10


def strength_for(pulse, species, temperature):
    """Figures by name as (value, unit), and warnings, for one pulse and one species.

    The wells Δα|𝓔|²cos²χ/4kT (linear: Δα|𝓔|²/4kT, circular: /8kT) and |g||G|/4kT, the impulses of
    the Kerr, gyration and absorptive torques over the pulse, photons absorbed per body and pulse
    (local field included). Averaged: also the quiver polarizability μ²/(Iω²) that averaging
    leaves out, against the mean of α_S. Resolved: also μE/kT and the impulse μE/(ω√(I kT)).

    temperature : [K]
    Raises InputError as `choose_response` does.
    """
    resolved = pulse.coupling == "resolved"
    response, warning = choose_response(species, pulse.carrier, resolved)
    warnings = [] if warning is None else [warning]
    kt = BOLTZMANN * temperature
    moments = species.inertia[species.inertia > 0.0]
    thermal = sqrt(moments.min() * kt) if moments.size else np.inf
    dipole = float(np.linalg.norm(species.dipole))
    figures = _averaged(pulse, response, kt, thermal)
    if resolved:
        figures |= {
            "dipole energy": (dipole * pulse.peak_field / kt, "kT"),
            "dipole impulse": (dipole * pulse.peak_field / (pulse.carrier * thermal), ""),
        }
    elif dipole > 0.0 and moments.size:
        mean = np.trace(response.polarizability) / 3.0
        quiver = dipole**2 / (moments.min() * pulse.carrier**2)
        figures["quiver of the dipole"] = (quiver / mean if mean > 0.0 else np.inf,
                                           "of the mean polarizability")
    figures.update(_absorbed(pulse, response))
    photons = figures["photons absorbed"][0]
    if photons > TOO_MANY and HBAR * pulse.carrier / ELECTRON_VOLT >= VISIBLE:
        warnings.append(f"{species.name}: {photons:.2g} photons absorbed per body and pulse: a"
                        " rigid ground-state model no longer holds above 0.1")
    return figures, warnings


def _averaged(pulse, response, kt, thermal):
    square = (pulse.amplitude * pulse.local_factor) ** 2
    major = np.cos(pulse.ellipticity) ** 2
    principal = np.linalg.eigvalsh(response.polarizability)
    anisotropy = principal[-1] - principal[0]
    length = pulse.envelope.fluence_factor * pulse.envelope.duration  # ∫f dt
    g, helical = float(np.linalg.norm(response.gyration)), abs(pulse.s3) * square
    mean = np.trace(response.absorptive) / 3.0
    return {
        "alignment well": (0.25 * anisotropy * square * major / kt, "kT"),
        "gyration well": (0.25 * g * helical / kt, "kT"),
        "alignment impulse": (0.25 * anisotropy * square * major * length / thermal, ""),
        "gyration impulse": (0.25 * g * helical * length / thermal, ""),
        "absorption impulse": (0.5 * mean * helical * length / thermal, ""),
    }


def _absorbed(pulse, response):
    square = (pulse.amplitude * pulse.local_factor) ** 2
    length = pulse.envelope.fluence_factor * pulse.envelope.duration
    energy = 0.5 * pulse.carrier * np.trace(response.absorptive) / 3.0 * square * length
    return {"photons absorbed": (energy / (HBAR * pulse.carrier), "per body and pulse")}


def sample_statements(pulses, system):
    """What a sample should be told of its response to averaged light: a list of sentences."""
    said = []
    for pulse in (p for p in pulses if p.coupling == "averaged"):
        blocks = [choose_response(s, pulse.carrier)[0] for s in system.species]
        for n, (species, block) in enumerate(zip(system.species, blocks, strict=True)):
            if np.any(block.gyration) and not _balanced(n, blocks, system.counts):
                said.append(f"{species.name}: one sign of gyration describes a sample polarised"
                            " beforehand; an unpolarised one has a second species with the"
                            " opposite sign in equal number")
            if np.any(block.rectification) and not np.any(block.absorptive):
                said.append(f"{species.name}: rectification without absorption: κ is odd under"
                            " time reversal against G, so it exists only where light is absorbed")
            if np.any(species.dipole):
                said.append(f"{species.name}: its permanent dipole does nothing in averaged light")
    return list(dict.fromkeys(said))


def which_field(electrostatics):
    """What a resolved or static field is inside the sample, in words; None where it is simple.

    electrostatics : as in Interactions. With Ewald sums (conducting boundary) the applied field
    is the Maxwell field in the sample.
    """
    return {
        "reaction-field": "with a reaction field the Maxwell field in the sample is the applied"
                          " one times (2 ε_RF + 1)/(2 ε_RF + ε(ω))",
        "damped-shifted": "with the damped shifted force no boundary is defined: which field the"
                          " sample sees is known only by comparison with an Ewald sum",
    }.get(electrostatics)


def _balanced(n, blocks, counts):
    """Whether as many bodies carry −g as carry the g of species n."""
    g = blocks[n].gyration
    signed = [sum(count for block, count in zip(blocks, counts, strict=True)
                  if np.allclose(block.gyration, sign * g, rtol=1e-9)) for sign in (1.0, -1.0)]
    return signed[0] == signed[1]
