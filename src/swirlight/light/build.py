"""From the light section of a config to pulses.

Works on any object with the attributes of interface.md's keys, in internal units (carrier as
angular frequency in rad/ps, peak_intensity in W/cm², fluence in J/cm², angles in rad, times in
ps, `table` the two columns of an envelope table); attributes that a section leaves out may be
absent or None. No numba here.
"""

from math import cos, pi

import numpy as np

from swirlight.errors import InputError
from swirlight.light.envelope import make_envelope
from swirlight.light.polarisation import unit_direction
from swirlight.light.pulse import Bias, Pulse, amplitude_of_intensity, intensity_of_fluence
from swirlight.light.regime import check_steps, choose_coupling


def pulses_from_config(light, system, stage=None, libration=0.0):
    """The pulses of a config's light section, in order: a tuple of Pulse.

    light : list of pulse sections, or None.
    system : System; decides the coupling.
    stage : the lit stage; its `timestep` [ps], when it has one, is held against the carriers.
    libration : angular frequency of the fastest libration known. [rad/ps]
    Raises InputError, naming the pulse as light[n], for parts that do not go together.
    """
    pulses = []
    for n, section in enumerate(light or ()):
        try:
            pulse = _pulse(section, system, libration)
            if getattr(stage, "timestep", None):
                check_steps(pulse, stage.timestep)
        except InputError as error:
            raise InputError(f"light[{n}]: {error}") from error
        pulses.append(pulse)
    return tuple(pulses)


def bias_from_config(section):
    """The Bias of a config's bias_field section, or None."""
    if section is None:
        return None
    begin, end = _get(section, "from", _get(section, "from_")), _get(section, "to")
    return Bias(
        vector=tuple(float(x) for x in section.vector),
        begin=-np.inf if begin is None else float(begin),
        end=np.inf if end is None else float(end),
    )


def _pulse(section, system, libration):
    carrier = float(section.carrier)
    coupling, reason = choose_coupling(_get(section, "coupling", "auto"), carrier, system,
                                       libration)
    local_field = _get(section, "local_field", "none")
    if coupling == "resolved" and local_field != "none":
        raise InputError(f"local_field: {local_field}; only averaged light can have one, in"
                         f" resolved light ({reason}) the fields of the neighbours are explicit")
    index = float(_get(section, "refractive_index", 1.0))
    ellipticity = _ellipticity(section)
    envelope = _envelope(section)
    if coupling == "resolved":
        envelope = envelope.resolved(carrier)
    turning, train = _get(section, "turning"), _get(section, "train")
    centre = _get(section, "centre")
    return Pulse(
        carrier=carrier,
        amplitude=_amplitude(section, envelope, index, ellipticity),
        envelope=envelope,
        centre=envelope.default_centre if centre is None else float(centre),
        ellipticity=ellipticity,
        azimuth=float(_get(section, "azimuth", 0.0)),
        turning=(float(_get(turning, "rate", 0.0)), float(_get(turning, "acceleration", 0.0))),
        phase=float(_get(section, "phase", 0.0)),
        direction=unit_direction(_get(section, "direction", "z")),
        count=int(_get(train, "count", 1)),
        period=float(_get(train, "period", 0.0)),
        coupling=coupling,
        reason=reason,
        refractive_index=index,
        local_field=local_field,
        in_kinds=_get(section, "in_kinds", "exposed"),
    )


def _ellipticity(section):
    """χ: 45° times the helicity, or as given. [rad]"""
    ellipticity = _get(section, "ellipticity")
    if ellipticity is None:
        return 0.25 * pi * int(_get(section, "helicity", 1))
    if abs(ellipticity) > 0.25 * pi * (1.0 + 1e-12):
        raise InputError("ellipticity: it must lie between -45 deg and 45 deg")
    return float(ellipticity)


def _envelope(section):
    return make_envelope(_get(section, "envelope", "gaussian"), _get(section, "duration"),
                         _get(section, "rise"), _get(section, "table"))


def _amplitude(section, envelope, index, ellipticity):
    given = {name: _get(section, name) for name in ("peak_intensity", "peak_field", "fluence")}
    given = {name: value for name, value in given.items() if value is not None}
    if len(given) != 1:
        raise InputError("one of peak_intensity, peak_field, fluence is needed, and only one")
    (name, value), = given.items()
    if name == "peak_field":
        return float(value) / cos(ellipticity)
    intensity = value if name == "peak_intensity" else intensity_of_fluence(value, envelope)
    return amplitude_of_intensity(float(intensity), index)


def _get(section, name, default=None):
    """An attribute that may be absent or None."""
    value = None if section is None else getattr(section, name, None)
    return default if value is None else value
