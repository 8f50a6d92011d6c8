"""A recorded quantity as something that behaves like an array and is read when it is used."""

import numpy as np
from numpy.lib.mixins import NDArrayOperatorsMixin


class Series(NDArrayOperatorsMixin):
    """Frames of one quantity, (frames, ...); indexing reads from the disk what it needs.

    name, unit (None if it has none), attributes (dict), dimensions (name of each axis),
    steps (frames,) int64, times (frames,) float64 [ps]; shape, dtype, ndim, size, nbytes as
    of an array. Indices may be numbers, slices, arrays of numbers or of booleans, "...".
    Arithmetic and NumPy functions read the whole and return arrays.
    Reading raises RunError where the file is damaged.
    """

    def __init__(self, name, source, dimensions, clock, unit=None, attributes=None):
        """source : has shape, dtype and read(slice, slices); clock : see `clock_of`."""
        self.name, self.unit, self.attributes = name, unit, attributes or {}
        self.dimensions = tuple(dimensions)
        self._source, self._clock = source, clock

    shape = property(lambda self: self._source.shape)
    dtype = property(lambda self: self._source.dtype)
    ndim = property(lambda self: len(self.shape))
    size = property(lambda self: int(np.prod(self.shape)))
    nbytes = property(lambda self: self.size * self.dtype.itemsize)

    @property
    def steps(self):
        """(frames,) integration step of each frame."""
        first, increment, _, _ = self._clock
        return first + increment * np.arange(len(self), dtype=np.int64)

    @property
    def times(self):
        """(frames,) time of each frame, from the start of its stage. [ps]"""
        _, _, first, increment = self._clock
        return first + increment * np.arange(len(self), dtype=np.float64)

    @property
    def interval(self):
        """Time between frames. [ps]"""
        return self._clock[3]

    def __len__(self):
        return self.shape[0]

    def __getitem__(self, key):
        keys = key if isinstance(key, tuple) else (key,)
        keys = [k if _plain(k) else np.asarray(k) for k in keys]
        if any(k is None or getattr(k, "ndim", 1) > 1 for k in keys):
            return np.asarray(self)[key]
        keys = _expand(keys, self.ndim)
        covers = [_cover(k, n, axis) for axis, (k, n) in enumerate(zip(keys, self.shape,
                                                                         strict=True))]
        block = self._source.read(covers[0][0], tuple(c[0] for c in covers[1:]))
        return block[tuple(c[1] for c in covers)]

    def __array__(self, dtype=None, copy=None):
        if copy is False:
            raise ValueError("a series lies on the disk: an array of it is a copy")
        data = self[...]
        return data if dtype is None else data.astype(dtype, copy=False)

    def __array_ufunc__(self, ufunc, method, *inputs, **options):
        arrays = [np.asarray(i) if isinstance(i, Series) else i for i in inputs]
        return getattr(ufunc, method)(*arrays, **options)

    def __repr__(self):
        unit = f" [{self.unit}]" if self.unit else ""
        return f"<{self.name}{unit} {self.shape} {self.dtype}, every {self.interval:g} ps>"

    def to_xarray(self):
        """An `xarray.DataArray` with named axes, times and units, read when used (extra `data`)."""
        from swirlight.store.labelled import data_array

        return data_array(self)


def _plain(key):
    return key is None or key is Ellipsis or isinstance(key, slice | int | np.integer)


def _expand(keys, ndim):
    """One key per axis."""
    dots = [i for i, k in enumerate(keys) if k is Ellipsis]
    if len(dots) > 1 or len(keys) - len(dots) > ndim:
        raise IndexError(f"too many indices for {ndim} axes")
    at = dots[0] if dots else len(keys)
    missing = ndim - (len(keys) - len(dots))
    return keys[:at] + [slice(None)] * missing + keys[at + len(dots) :]


def _cover(key, length, axis):
    """(slice to read, key into what was read): forwards, contiguous enough, nothing missed."""
    if isinstance(key, slice):
        taken = range(*key.indices(length))
        if taken.step > 0:
            return slice(taken.start, max(taken.stop, taken.start), taken.step), slice(None)
        return slice(taken[-1], taken[0] + 1, -taken.step) if taken else slice(0, 0, 1), \
            slice(None, None, -1)
    if isinstance(key, np.ndarray) and key.dtype == bool:
        if key.shape != (length,):
            raise IndexError(f"a mask of {key.shape} for axis {axis} of length {length}")
        key = np.flatnonzero(key)
    if isinstance(key, np.ndarray) and key.size == 0:
        return slice(0, 0, 1), key.astype(int)
    index = np.asarray(key)
    if not np.issubdtype(index.dtype, np.integer):
        raise IndexError(f"axis {axis}: {key!r} cannot be an index")
    index = np.where(index < 0, index + length, index)
    if index.min() < 0 or index.max() >= length:
        raise IndexError(f"axis {axis}: index {key} is outside of {length}")
    first = int(index.min())
    within = index - first if index.ndim else 0
    return slice(first, int(index.max()) + 1, 1), within
