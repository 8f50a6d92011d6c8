"""Series as xarray arrays; the only module that needs the extra `data`."""

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
