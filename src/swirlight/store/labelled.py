"""Series and results as xarray arrays; the only module that needs the extra `data`."""

import numpy as np

from swirlight.errors import InputError
from swirlight.store.layout import LABELS

try:
    import xarray
    from xarray.backends import BackendArray
    from xarray.core import indexing
except ImportError as error:  # said when somebody asks for one
    raise InputError("xarray is not installed: pip install 'swirlight[data]'") from error


class _OnDisk(BackendArray):
    """What xarray wants to know of an array it reads piece by piece."""

    def __init__(self, series):
        self.series, self.shape, self.dtype = series, series.shape, series.dtype

    def __getitem__(self, key):
        return indexing.explicit_indexing_adapter(
            key, self.shape, indexing.IndexingSupport.BASIC, self.series.__getitem__
        )


def data_array(series):
    """An `xarray.DataArray` of a `Series`, not read yet."""
    data = indexing.LazilyIndexedArray(_OnDisk(series))
    units = {} if series.unit is None else {"units": series.unit}
    coordinates = {"time": ("time", series.times, {"units": "ps"}), "step": ("time", series.steps)}
    for name, length in zip(series.dimensions, series.shape, strict=True):
        if name in LABELS:
            coordinates[name] = LABELS[name]
        elif name == "body":
            coordinates[name] = np.arange(length)
    variable = xarray.Variable(series.dimensions, data, {**units, **series.attributes})
    return xarray.DataArray(variable, coords=coordinates, name=series.name)


def trajectory_dataset(trajectory):
    """An `xarray.Dataset` of all that a `Trajectory` holds or that follows from it, not read yet.

    What is recorded as often as the first vector lies along `time`; what has another clock along
    `time_2`, `time_3` … with its own steps.
    """
    clocks, found = {}, {}
    for name in trajectory.readable:
        array = data_array(trajectory[name])
        number = clocks.setdefault(array.step.values.tobytes(), len(clocks) + 1)
        if number > 1:
            array = array.rename(time=f"time_{number}", step=f"step_{number}")
        found[name.replace("/", "_")] = array
    species = np.array(trajectory.species_names)[trajectory.species]
    return xarray.Dataset(found, {"species": ("body", species)},
                          {"name": trajectory.name, "box": trajectory.box, "box_units": "nm",
                           "complete": str(trajectory.complete).lower()})


def dataset(arrays, axes, unit, attributes):
    """An `xarray.Dataset` of result arrays that share their axes.

    arrays : {name: array}; axes : {name: (places along it, their unit or None)}, in order;
    unit : of the arrays, None without.
    """
    units = {} if unit is None else {"units": unit}
    coordinates = {name: (name, places, {} if of is None else {"units": of})
                   for name, (places, of) in axes.items()}
    return xarray.Dataset({name: (tuple(axes), array, units) for name, array in arrays.items()},
                          coordinates, attributes)
