"""How a trajectory is laid out in HDF5: version 1.1 of the open H5MD specification.

P. de Buyl, P. H. Colberg and F. Höfling, Comput. Phys. Commun. 185, 1546 (2014), with the
"units" module, and steps and times in their fixed form: a scalar increment with an offset.
docs/file-format.md lists every dataset. A segment of a run under way and the final file
have the same layout; only the number of rows, their offset and the chunks differ.
"""

import re
from dataclasses import dataclass, field

import h5py
import numpy as np

from swirlight import __version__

FORMAT = {"libver": ("v108", "v110")}  # superblock 2: read by HDF5 1.8 and everything since
H5MD_VERSION = (1, 1)
UNITS_VERSION = (1, 0)
BODIES = "particles/bodies"
OWN = "parameters/swirlight"
# These share the steps and times of `position`, as the specification asks (by hard links).
WITH_POSITION = ("image", "box/edges")
SEGMENT_CHUNK = (256, 64)  # frames, bodies: fits the writing
FINAL_CHUNK = (1024, 16)  # a few bodies along all of time in few chunks
TOTALS_CHUNK = 4096  # frames
_USUAL_AXES = {
    (3,): ("component",),
    (4,): ("quaternion",),
    (3, 3): ("axis", "component"),
    (3, 2): ("component", "part"),
}
# What the places along an axis of that name are called.
LABELS = {
    "component": ["x", "y", "z"],
    "quaternion": ["w", "x", "y", "z"],
    "axis": ["x", "y", "z"],
    "part": ["real", "imaginary"],
}
_FACTOR = re.compile(r"[A-Za-z%]+([+-][0-9]+)?")
_NUMBER = re.compile(r"[0-9]+(\.[0-9]+)?(e[+-]?[0-9]+)?")


@dataclass(frozen=True)
class Element:
    """One recorded quantity.

    name : below its group; a slash makes a group of its own ("light/amplitude").
    group : "particles" or "observables".
    shape : of one frame, e.g. (N, 3); () for a number.
    dtype : as stored.
    unit : H5MD unit string ("nm ps-1"), None if it has none.
    every : steps between frames; the first frame is at the first step.
    attributes : numbers and texts stored beside `unit` (`per`, `frame`, `note`).
    dimensions : names of the axes of a frame; left out: from the group and the shape.
    """

    name: str
    group: str
    shape: tuple
    dtype: object
    unit: str | None
    every: int
    attributes: dict = field(default_factory=dict)
    dimensions: tuple = ()

    def __post_init__(self):
        if self.group not in ("particles", "observables"):
            raise ValueError(f"{self.name}: no group {self.group!r}")
        if self.unit is not None and not is_unit(self.unit):
            raise ValueError(f"{self.name}: {self.unit!r} is not an H5MD unit string")
        if self.every < 1:
            raise ValueError(f"{self.name}: frames every {self.every} steps")
        if self.dimensions and len(self.dimensions) != len(self.shape):
            raise ValueError(f"{self.name}: {self.dimensions} cannot name the axes {self.shape}")

    @property
    def path(self):
        """Where it lies in the file."""
        return f"{BODIES if self.group == 'particles' else 'observables'}/{self.name}"

    @property
    def axes(self):
        """Names of all axes, frames first."""
        return ("time", *(self.dimensions or self._usual_axes()))

    def _usual_axes(self):
        per_body = self.group == "particles" and not self.name.startswith("box/")
        lead = ("body",) if per_body else ()
        tail = self.shape[len(lead) :]
        unnamed = tuple(f"index{i}" for i in range(len(tail)))
        return lead + _USUAL_AXES.get(tuple(tail), unnamed)


@dataclass(frozen=True)
class Labelled:
    """A parameter with its unit and other attributes."""

    value: object
    unit: str | None = None
    attributes: dict = field(default_factory=dict)


@dataclass(frozen=True)
class Header:
    """What a trajectory file says besides its frames.

    timestep : [ps]; first_time : of `first_step`, from the start of the stage. [ps]
    box : (3,) edges [nm]; species : (N,) index into species_names; mass : (N,) [g/mol].
    parameters : nested dict of texts, numbers, arrays and `Labelled`, below
        /parameters/swirlight.
    """

    author: str
    timestep: float
    first_step: int
    box: np.ndarray
    species: np.ndarray
    species_names: tuple
    mass: np.ndarray
    elements: tuple
    parameters: dict = field(default_factory=dict)
    first_time: float = 0.0
    version: str = __version__

    def __post_init__(self):
        if len({e.name for e in self.elements}) != len(self.elements):
            raise ValueError("two elements have the same name")
        strides = {e.name: e.every for e in self.elements if e.group == "particles"}
        for name in WITH_POSITION:
            if name in strides and strides[name] != strides.get("position"):
                raise ValueError(f"{name} must be recorded with position, at the same steps")


def is_unit(text):
    """Whether `text` follows H5MD's grammar: one number at most, first; then powers of symbols."""
    factors = text.split(" ")
    if _NUMBER.fullmatch(factors[0]):
        factors = factors[1:]
    return text.isascii() and all(_FACTOR.fullmatch(factor) for factor in factors)


def text_value(text):
    """Text as a fixed-length string scalar: ASCII where it is, else UTF-8."""
    data = text.encode()
    kind = "ascii" if data.isascii() else "utf-8"
    return np.array(data, dtype=h5py.string_dtype(kind, max(len(data), 1)))


def write_text_attribute(item, name, text):
    """A fixed-length string attribute."""
    value = text_value(text)
    item.attrs.create(name, value, dtype=value.dtype)


def chunk_shape(element, rows, final):
    """Chunks of near equal size, none larger than the format's, for `rows` frames."""
    if element.group == "observables" or not element.shape:
        return (_even(rows, TOTALS_CHUNK), *(max(length, 1) for length in element.shape))
    frames, bodies = FINAL_CHUNK if final else SEGMENT_CHUNK
    return (_even(rows, frames), _even(element.shape[0], bodies), *element.shape[1:])


def _even(length, largest):
    length = max(length, 1)
    return -(-length // -(-length // largest))


def lay_out(file, header, first_rows, rows, final):
    """Write everything but the frames; return {element name: dataset to fill}.

    first_rows : {name: index in the whole trajectory of this file's first frame}
    rows : {name: number of frames in this file}
    """
    _write_module(file, header)
    _write_tree(file.create_group(OWN), header.parameters)
    _write_bodies(file, header)
    values = {}
    # position first: others link to its steps and times
    for element in sorted(header.elements, key=lambda e: e.name != "position"):
        values[element.name] = _write_element(
            file, header, element, first_rows[element.name], rows[element.name], final
        )
    return values


def _write_module(file, header):
    root = file.create_group("h5md")
    root.attrs["version"] = np.array(H5MD_VERSION, dtype=np.int32)
    write_text_attribute(root.create_group("author"), "name", header.author)
    creator = root.create_group("creator")
    write_text_attribute(creator, "name", "swirlight")
    write_text_attribute(creator, "version", header.version)
    units = root.create_group("modules/units")
    units.attrs["version"] = np.array(UNITS_VERSION, dtype=np.int32)
    write_text_attribute(units, "system", "SI")


def _write_bodies(file, header):
    bodies = file.create_group(BODIES)
    box = bodies.create_group("box")
    box.attrs["dimension"] = np.int32(3)
    box.attrs.create("boundary", np.array([b"periodic"] * 3))
    if not any(e.name == "box/edges" for e in header.elements):
        write_dataset(box, "edges", Labelled(np.asarray(header.box, float), "nm"))
    species = np.asarray(header.species, dtype=np.int32)
    kinds = h5py.enum_dtype({n: k for k, n in enumerate(header.species_names)}, basetype="i4")
    bodies.create_dataset("species", data=species, dtype=kinds)
    write_dataset(bodies, "mass", Labelled(np.asarray(header.mass, float), "g mol-1"))


def write_dataset(group, name, value):
    """Write a text, number, array or `Labelled` as a dataset."""
    labelled = value if isinstance(value, Labelled) else Labelled(value)
    data = labelled.value
    if isinstance(data, str):
        data = text_value(data)
    elif isinstance(data, list | tuple) and data and all(isinstance(d, str) for d in data):
        encoded = [d.encode() for d in data]
        longest = max(1, max(map(len, encoded)))
        data = np.array(encoded, dtype=h5py.string_dtype("utf-8", longest))
    dataset = group.create_dataset(name, data=data)
    if labelled.unit is not None:
        write_text_attribute(dataset, "unit", labelled.unit)
    for key, attribute in labelled.attributes.items():
        write_attribute(dataset, key, attribute)


def write_attribute(item, name, value):
    """Write a number, an array or a text as an attribute."""
    if isinstance(value, str):
        write_text_attribute(item, name, value)
    else:
        item.attrs[name] = value


def _write_tree(group, tree):
    for name, value in tree.items():
        if isinstance(value, dict):
            _write_tree(group.create_group(name.replace("/", "-")), value)
        else:
            write_dataset(group, name, value)


def _write_element(file, header, element, first_row, rows, final):
    group = file.create_group(element.path)
    value = group.create_dataset(
        "value",
        shape=(rows, *element.shape),
        maxshape=(None, *(length or None for length in element.shape)),
        chunks=chunk_shape(element, rows, final),
        dtype=element.dtype,
        fletcher32=True,
    )
    if element.unit is not None:
        write_text_attribute(value, "unit", element.unit)
    write_text_attribute(value, "dimensions", " ".join(element.axes))
    for name, attribute in element.attributes.items():
        write_attribute(value, name, attribute)
    if element.group == "particles" and element.name in WITH_POSITION:
        position = file[f"{BODIES}/position"]
        group["step"], group["time"] = position["step"], position["time"]
        return value
    before = first_row * element.every  # steps
    step = group.create_dataset("step", data=np.int64(element.every))
    step.attrs["offset"] = np.int64(header.first_step + before)
    time = group.create_dataset("time", data=element.every * header.timestep)
    time.attrs["offset"] = header.first_time + before * header.timestep
    write_text_attribute(time, "unit", "ps")
    return value


def build_image(header, first_rows, rows, frames):
    """A whole file as bytes, built in memory; it holds no times: same content, same bytes.

    frames : {name: array of the first `rows` frames}
    """
    with h5py.File("image", "w", driver="core", backing_store=False, **FORMAT) as file:
        values = lay_out(file, header, first_rows, rows, final=False)
        for name, dataset in values.items():
            if rows[name]:
                dataset[...] = frames[name]
        file.flush()
        return file.id.get_file_image()
