"""Results as xarray datasets; needs the extra `data`."""

import numpy as np

from swirlight.errors import InputError
from swirlight.store.layout import LABELS

try:
    import xarray
except ImportError as error:  # said when somebody asks for one
    raise InputError("xarray is not installed: pip install 'swirlight[data]'") from error


def response_dataset(response):
    """An `xarray.Dataset` of a Response: means and standard errors over starts, over time (and
    component), and the gain of pairing along the beam."""
    vector = response.plus.ndim == 3
    dimensions = ("time", "component") if vector else ("time",)
    units = {"units": response.unit} if response.unit else {}
    parts = {"odd": response.odd, "odd_error": response.odd_error, "even": response.even,
             "even_error": response.even_error,
             "dark": None if response.dark is None else response.dark.mean(axis=0)}
    variables = {name: (dimensions, values, units) for name, values in parts.items()
                 if values is not None}
    variables["gain"] = ("time", response.gain)
    if vector:
        along = response.along
        variables["odd_along"] = ("time", along.odd, units)
        variables["odd_along_error"] = ("time", along.odd_error, units)
    coordinates = {"time": ("time", response.times, {"units": "ps"})}
    if vector:
        coordinates["component"] = LABELS["component"]
    return xarray.Dataset(variables, coordinates, {
        "observable": response.observable.name, "starts": response.starts,
        "beam": np.asarray(response.beam), "notes": list(response.notes)})
