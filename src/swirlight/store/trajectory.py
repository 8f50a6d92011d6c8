"""One trajectory on disk: the final file, or the sealed segments of one under way."""

import pathlib

import h5py
import numpy as np

from swirlight.errors import InputError
from swirlight.rotation import body_axes
from swirlight.store.layout import BODIES, OWN
from swirlight.store.parts import Files, Parts
from swirlight.store.series import Series

AXES = {"axis_x": 0, "axis_y": 1, "axis_z": 2}


class Trajectory:
    """Every recorded quantity by its name: `t.torque`, `t["light/amplitude"]`.

    Also derived: axis_x, axis_y, axis_z (frames, N, 3), the body axes in the laboratory
    frame, from the orientation; position_unwrapped from position and image.
    In attribute access a slash is written as an underscore (`t.light_amplitude`).

    path : of the file or the working folder; complete : whether it is the final file;
    names : what was recorded; box (3,) [nm]; species (N,) index into species_names;
    mass (N,) [g/mol]; config_text; parameters : nested dict of /parameters/swirlight.
    A trajectory under way is seen as it was when it was opened.
    """

    def __init__(self, final, workdir=None):
        """final : path of the final file; workdir : where its segments lie meanwhile.

        Raises InputError when neither is there or the file is not one of ours.
        """
        self.final = pathlib.Path(final)
        self.workdir = None if workdir is None else pathlib.Path(workdir)
        self._files = Files()
        self._paths = self._find()
        try:
            self._elements = self._list_elements()
        except (OSError, KeyError) as error:
            raise InputError(f"{self._paths[0]}: cannot be read as a trajectory: {error}") from None

    def _find(self):
        if self.final.is_file():
            return [self.final]
        segments = sorted((self.workdir / "segments").glob("*.h5")) if self.workdir else []
        if segments:
            return segments
        if self.final.is_file():  # it was finished while we looked
            return [self.final]
        raise InputError(f"{self.final}: not there, and no part of it has been written yet")

    def _list_elements(self):
        file = self._files[self._paths[0]]
        if "h5md" not in file or OWN not in file:
            raise KeyError("it has no /h5md or no /parameters/swirlight")
        found = {}

        def look(name, item):
            if isinstance(item, h5py.Group) and "value" in item:
                found[name] = f"{item.name[1:]}"

        for group in (BODIES, "observables"):
            if group in file:
                file[group].visititems(look)
        return found

    @property
    def path(self):
        """The final file, or the working folder while there is none."""
        return self._paths[0] if self.complete else self.workdir

    @property
    def name(self):
        """E.g. "plus-000"."""
        return self.final.stem

    @property
    def complete(self):
        """Whether this is the final file."""
        return self._paths[0] == self.final

    @property
    def names(self):
        """Names of everything that was recorded."""
        return tuple(self._elements)

    @property
    def readable(self):
        """Names of everything that was recorded or follows from it."""
        derived = [name for name in AXES if {"axes", "orientation"} & set(self._elements)]
        if {"position", "image"} <= set(self._elements):
            derived.append("position_unwrapped")
        return (*self.names, *derived)

    def __contains__(self, name):
        return name in self._elements

    def __getitem__(self, name):
        """A `Series`; raises KeyError listing what there is."""
        if name in self._elements:
            return self._series(name)
        if name in AXES and "axes" in self._elements:
            return _derived(self["axes"], name, _AxisOfAxes(self["axes"], AXES[name]))
        if name in AXES and "orientation" in self._elements:
            return _derived(self["orientation"], name, _Axis(self["orientation"], AXES[name]))
        if name == "position_unwrapped" and {"position", "image"} <= set(self._elements):
            return _derived(self["position"], name, _Unwrapped(self["position"], self["image"],
                                                               self.box))
        raise KeyError(f"{self.name} has no {name!r}; it has {', '.join(self.names)}")

    def __getattr__(self, name):
        if name.startswith("_"):
            raise AttributeError(name)
        for known in self._elements:
            if known.replace("/", "_") == name:
                return self[known]
        try:
            return self[name]
        except KeyError as error:
            raise AttributeError(error.args[0]) from None

    def __dir__(self):
        return [*super().__dir__(), *(n.replace("/", "_") for n in self.readable)]

    def __repr__(self):
        state = "complete" if self.complete else "under way"
        return f"<{self.name}, {state}: {', '.join(self.names)}>"

    def _series(self, name):
        self._settle()
        path = self._elements[name]
        parts = _Following(self, f"{path}/value")
        group = self._files[self._paths[0]][path]
        attributes = {key: _text(value) for key, value in group["value"].attrs.items()}
        dimensions = attributes.pop("dimensions", None)
        dimensions = dimensions.split() if dimensions else \
            ["time", *(f"index{i}" for i in range(len(parts.shape) - 1))]
        step, time = group["step"], group["time"]
        clock = (int(step.attrs.get("offset", 0)), int(step[()]),
                 float(time.attrs.get("offset", 0.0)), float(time[()]))
        return Series(name, parts, dimensions, clock, attributes.pop("unit", None), attributes)

    def _settle(self):
        """Turn to the final file if the segments have gone: their frames are all in it."""
        if not self._paths[0].is_file():
            self._files.close()
            self._paths = self._find()

    def _static(self, path):
        self._settle()
        return self._files[self._paths[0]][path]

    @property
    def box(self):
        """(3,) edges. [nm]"""
        return self._static(f"{BODIES}/box/edges")[()]

    @property
    def species(self):
        """(N,) species of each body, index into `species_names`."""
        return self._static(f"{BODIES}/species")[()]

    @property
    def species_names(self):
        """Names of the species, in the order of their indices."""
        kinds = h5py.check_enum_dtype(self._static(f"{BODIES}/species").dtype)
        return tuple(sorted(kinds, key=kinds.get))

    @property
    def mass(self):
        """(N,) [g/mol]"""
        return self._static(f"{BODIES}/mass")[()]

    @property
    def parameters(self):
        """Everything below /parameters/swirlight, as nested dicts of texts, numbers and arrays."""
        return _tree(self._static(OWN))

    @property
    def config_text(self):
        """The config as resolved when it was written, or "" if there is none."""
        return str(self.parameters.get("config", ""))

    def to_xarray(self):
        """An `xarray.Dataset` of everything, with named axes, times and units (extra `data`).

        Nothing is read before it is used; `.chunk()` makes dask arrays of it.
        """
        from swirlight.store.labelled import trajectory_dataset

        return trajectory_dataset(self)

    def close(self):
        """Close the files; they are opened again when needed."""
        self._files.close()


def _text(value):
    return value.decode() if isinstance(value, bytes) else value


def _tree(group):
    tree = {}
    for name, item in group.items():
        if isinstance(item, h5py.Group):
            tree[name] = _tree(item)
        else:
            value = item[()]
            tree[name] = [v.decode() for v in value] if getattr(value, "dtype", None) is not None \
                and value.dtype.kind == "S" and value.ndim else _text(value)
    return tree


class _Following:
    """Parts of a trajectory, also when it is finished and its segments go while we read."""

    def __init__(self, trajectory, dataset):
        self._trajectory, self._dataset = trajectory, dataset
        self._parts = Parts(trajectory._files, trajectory._paths, dataset)
        self.shape, self.dtype = self._parts.shape, self._parts.dtype

    def read(self, frames, rest=()):
        try:
            return self._parts.read(frames, rest)
        except FileNotFoundError:
            self._trajectory._settle()
            paths = self._trajectory._paths
            self._parts = Parts(self._trajectory._files, paths, self._dataset)
            return self._parts.read(frames, rest)


def _derived(base, name, source):
    dimensions = base.dimensions[:2] + ("component",)
    unit = None if name in AXES else base.unit
    return Series(name, source, dimensions, base._clock, unit, {"frame": "laboratory"})


class _Axis:
    """Row k of the rotation matrix that turns the laboratory into the body: body axis k."""

    def __init__(self, orientation, k):
        self._orientation, self._k = orientation, k
        self.shape, self.dtype = (*orientation.shape[:2], 3), orientation.dtype

    def read(self, frames, rest=()):
        bodies, component = (*rest, slice(None), slice(None))[:2]
        axes = body_axes(self._orientation[frames, bodies])
        return axes[..., self._k, :][..., component].astype(self.dtype, copy=False)


class _AxisOfAxes:
    def __init__(self, axes, k):
        self._axes, self._k = axes, k
        self.shape, self.dtype = (*axes.shape[:2], 3), axes.dtype

    def read(self, frames, rest=()):
        bodies, component = (*rest, slice(None), slice(None))[:2]
        return self._axes[frames, bodies, self._k, component]


class _Unwrapped:
    def __init__(self, position, image, box):
        self._position, self._image, self._box = position, image, box
        self.shape, self.dtype = position.shape, np.dtype(np.float64)

    def read(self, frames, rest=()):
        bodies, component = (*rest, slice(None), slice(None))[:2]
        key = (frames, bodies, component)
        return self._position[key] + self._image[key] * self._box[component]
