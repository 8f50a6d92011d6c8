"""Polarisation: transverse axes, Jones vectors, helicity.

E(t) = Re[𝓔 exp(−iωt)]. Helicity +1 carries +ħ per photon along k̂; its field vector turns
counter-clockwise for someone looking into the beam. The ellipticity angle χ is positive for
positive helicity (some textbooks use the other sign): s3 = sin 2χ, circular at χ = ±45°.
The azimuth ψ counts from e1 = x̂ made perpendicular to k̂ (ŷ if |x̂·k̂| > 0.9) to e2 = k̂×e1.
No numba here.
"""

import numpy as np

from swirlight.errors import InputError

_NAMED = {"x": (1.0, 0.0, 0.0), "y": (0.0, 1.0, 0.0), "z": (0.0, 0.0, 1.0)}


def unit_direction(direction):
    """A direction as a tuple of three, length 1: "x" … "-z", or any vector.

    Raises InputError for another name or a vector without a direction.
    """
    if isinstance(direction, str):
        sign = -1.0 if direction.startswith("-") else 1.0
        name = direction.lstrip("+-")
        if name not in _NAMED:
            raise InputError(f"direction: {direction!r}; x, y, z, -x, -y, -z or three numbers")
        return tuple(sign * x + 0.0 for x in _NAMED[name])  # + 0.0: no minus zero
    vector = np.asarray(direction, float)
    length = np.linalg.norm(vector) if vector.shape == (3,) else np.nan
    if not 0.0 < length < np.inf:
        raise InputError(f"direction: {direction!r}; three numbers, not all zero")
    return tuple((vector / length).tolist())


def transverse_axes(direction):
    """e1, e2 of a unit direction: two (3,) arrays; e1, e2, k̂ is right-handed."""
    k = np.asarray(direction, float)
    start = np.eye(3)[0 if abs(k[0]) <= 0.9 else 1]
    e1 = start - (start @ k) * k
    e1 /= np.linalg.norm(e1)
    return e1, np.cross(k, e1)


def jones(ellipticity, azimuth, e1, e2):
    """𝓔/|𝓔| and its derivative by the azimuth, two complex arrays [..., 3].

    cos χ (cos ψ e1 + sin ψ e2) + i sin χ (−sin ψ e1 + cos ψ e2)

    ellipticity : χ. [rad]
    azimuth : ψ, any shape. [rad]
    """
    c, s = np.cos(azimuth)[..., None], np.sin(azimuth)[..., None]
    along, across = c * e1 + s * e2, c * e2 - s * e1
    major, minor = np.cos(ellipticity), 1j * np.sin(ellipticity)
    return major * along + minor * across, major * across - minor * along


def conjugate_product(amplitude):
    """G = i 𝓔×𝓔* = 2 Re𝓔 × Im𝓔, [..., 3] real, in the amplitude's unit squared."""
    return 2.0 * np.cross(amplitude.real, amplitude.imag)
