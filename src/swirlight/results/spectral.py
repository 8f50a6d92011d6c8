"""What a spectrum is: curves over frequency with errors, units and sentences to read."""

from dataclasses import dataclass, field

import numpy as np

from swirlight.analysis import spectra
from swirlight.errors import InputError


@dataclass(frozen=True)
class Curve:
    """One function of frequency.

    values : (F,) real or complex; errors : (F,) standard errors, of a complex curve those of
    real and imaginary part as one complex number; NaN where there are none.
    """

    values: np.ndarray
    errors: np.ndarray
    unit: str
    meaning: str


@dataclass(frozen=True)
class Spectrum:
    """A spectrum of one kind of a run.

    frequencies : (F,) [THz]; wavenumbers : (F,) [cm^-1]; resolution : full width of a sharp
    line [THz]; window, longest_lag [ps] : what it comes from.
    curves : {name: Curve}, also read as attributes: `s.permittivity` is
        `s.curves["permittivity"].values`; values, errors, unit : of the first.
    figures : {name: (value, error, unit)}. starts : how many. notes : sentences to read.
    lags, response : (K,) [ps] and Curve of the response in time, where there is one.
    """

    of: str
    label: str
    kind: str
    frequencies: np.ndarray
    curves: dict
    starts: int
    window: str
    longest_lag: float
    resolution: float
    figures: dict = field(default_factory=dict)
    notes: tuple = ()
    lags: np.ndarray | None = None
    response: Curve | None = None

    wavenumbers = property(lambda self: self.frequencies * spectra.WAVENUMBER)
    first = property(lambda self: next(iter(self.curves.values())))
    values = property(lambda self: self.first.values)
    errors = property(lambda self: self.first.errors)
    unit = property(lambda self: self.first.unit)

    def __getattr__(self, name):
        if name.startswith("_") or name not in self.curves:
            raise AttributeError(f"this spectrum of {self.of} has no {name!r}; it has"
                                 f" {', '.join(self.curves)}")
        return self.curves[name].values

    def to_xarray(self):
        """An `xarray.Dataset` over frequency, errors as `…_error` (extra `data`)."""
        try:
            import xarray
        except ImportError as error:
            raise InputError("xarray is not installed: pip install 'swirlight[data]'") from error
        found = {}
        for name, curve in self.curves.items():
            about = {"units": curve.unit, "long_name": curve.meaning}
            found[name] = ("frequency", curve.values, about)
            found[f"{name}_error"] = ("frequency", curve.errors, {"units": curve.unit})
        if self.response is not None:
            found["response"] = ("lag", self.response.values, {"units": self.response.unit})
            found["response_error"] = ("lag", self.response.errors, {"units": self.response.unit})
        coordinates = {"frequency": ("frequency", self.frequencies, {"units": "THz"}),
                       "wavenumber": ("frequency", self.wavenumbers, {"units": "cm^-1"})}
        if self.response is not None:
            coordinates["lag"] = ("lag", self.lags, {"units": "ps"})
        return xarray.Dataset(found, coordinates, {
            "of": self.of, "label": self.label, "kind": self.kind, "starts": self.starts,
            "window": self.window, "resolution": f"{self.resolution:.6g} THz",
            "notes": "\n".join(self.notes)})
