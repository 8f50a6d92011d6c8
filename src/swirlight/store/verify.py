"""Holding our files against the rules of their format: H5MD 1.1 and what we add to it.

`verify` looks at a trajectory, a start file or a whole run folder and returns what is
wrong, one text per finding, each naming the file, the place in it and the rule.
Every chunk is read, so that HDF5 compares its checksum.
"""

import pathlib

import h5py
import numpy as np

from swirlight.errors import InputError
from swirlight.store.checkpoint import digest_is_right
from swirlight.store.layout import BODIES, H5MD_VERSION, OWN, UNITS_VERSION, is_unit
from swirlight.store.run import WORK, read_json
from swirlight.store.start import state_problems

UNIT_LENGTH = 1e-5  # single-precision quaternions are off by about 1e-7


def verify(path):
    """What is wrong with a file or a run folder: list of texts, empty if nothing is.

    Raises InputError when there is nothing to look at.
    """
    path = pathlib.Path(path)
    if path.is_dir():
        return _verify_folder(path)
    if not path.is_file():
        raise InputError(f"{path}: no such file or folder")
    return _verify_file(path)


def _verify_folder(folder):
    files = sorted([*folder.glob("*.h5"), *folder.glob("starts/*.h5")])
    work = folder / WORK
    segments = sorted(work.glob("*/segments/*.h5"))
    checkpoints = sorted(work.glob("*/checkpoints/*.h5"))
    if not files + segments + checkpoints:
        raise InputError(f"{folder}: no trajectory, start file or segment in it")
    problems = [text for file in files for text in _verify_file(file)]
    # A run under way replaces its checkpoints and clears its segments while we look.
    problems += [text for file in segments for text in _verify_file(file) if file.exists()]
    problems += [f"{path}: damaged: its checksum does not fit its content"
                 for path in checkpoints if not _is_whole(path)]
    if not (folder / "config.yaml").is_file():
        problems.append(f"{folder}: has no config.yaml")
    try:
        read_json(folder / "summary.json")
    except InputError as error:
        problems.append(str(error))
    for segment in sorted({path.parent for path in segments}):
        numbers = [int(p.stem) for p in sorted(segment.glob("*.h5"))]
        complete = (folder / f"{segment.parent.name}.h5").exists()
        if numbers != list(range(len(numbers))) and not complete:
            problems.append(f"{segment}: segments are missing; there are {numbers}")
    return problems


def _is_whole(checkpoint):
    try:
        return digest_is_right(checkpoint)
    except FileNotFoundError:  # a newer one has taken its place
        return True


def _verify_file(path):
    try:
        with h5py.File(path, "r", locking=False) as file:
            checker = Checker(file)
            if "state" in file and "h5md" not in file:
                checker.readable("state")
                checker.found += state_problems(file["state"]) if not checker.found else []
            else:
                checker.trajectory()
            return [f"{path}:{text}" for text in checker.found]
    except (OSError, RuntimeError) as error:
        return [f"{path}: cannot be read as HDF5: {error}"]


class Checker:
    """The rules, one method for each part of the file; `found` collects what breaks them."""

    def __init__(self, file):
        self.file, self.found = file, []

    def rule(self, holds, place, text):
        """Note `text` against `place` unless the rule holds; return whether it does."""
        if not holds:
            self.found.append(f"/{place.strip('/')}: {text}")
        return bool(holds)

    def trajectory(self):
        """A trajectory file or segment."""
        self.module()
        if self.rule("particles" in self.file, "particles", "is missing"):
            for name in self.file["particles"]:
                self.particles(f"particles/{name}")
        elements = self.elements()
        for place in elements:
            self.element(place)
        self.spans(elements)
        self.parameters()
        self.readable("/")
        if not self.found:
            self.meaning()

    def module(self):
        """/h5md: versions, author, creator, units."""
        if not self.rule("h5md" in self.file, "h5md", "is missing: not an H5MD file"):
            return
        self.version("h5md", H5MD_VERSION)
        self.fixed_text("h5md/author", "name")
        self.fixed_text("h5md/creator", "name")
        self.fixed_text("h5md/creator", "version")
        self.version("h5md/modules/units", UNITS_VERSION)
        self.fixed_text("h5md/modules/units", "system")

    def version(self, place, expected):
        if self.rule(place in self.file, place, "is missing"):
            value = np.asarray(self.file[place].attrs.get("version", ()))
            fits = value.dtype.kind in "iu" and tuple(value) == expected
            self.rule(fits, place, f"attribute version must be the integers {expected}")

    def fixed_text(self, place, name):
        if not self.rule(place in self.file, place, "is missing"):
            return None
        return self.text_attribute(self.file[place], name)

    def text_attribute(self, item, name):
        """The text of a fixed-length string attribute; None (and noted) if it is not one."""
        place = f"{item.name} attribute {name}"
        if not self.rule(name in item.attrs, place, "is missing"):
            return None
        kind = h5py.check_string_dtype(item.attrs.get_id(name).dtype)
        if not self.rule(kind and kind.length, place, "must be a fixed-length string"):
            return None
        return item.attrs[name].decode(errors="replace")

    def particles(self, place):
        """A particles group and its box."""
        group = self.file[place]
        if self.rule("box" in group, place, "has no box, which H5MD requires"):
            self.box(group["box"])
        counts = {item.shape[0] for name in ("species", "mass")
                  if (item := group.get(name)) is not None and item.ndim}
        for name, item in group.items():
            if name != "box" and "value" in getattr(item, "keys", tuple)():
                counts.add(item["value"].shape[1] if item["value"].ndim > 1 else 0)
        self.rule(len(counts) <= 1, place, f"its members disagree about the bodies: {counts}")
        for name in ("species", "mass"):
            self.rule(name in group, place, f"has no {name}")

    def box(self, box):
        dimension = box.attrs.get("dimension")
        if not self.rule(dimension is not None and np.ndim(dimension) == 0
                         and np.asarray(dimension).dtype.kind in "iu",
                         box.name, "attribute dimension must be an integer"):
            return
        boundary = box.attrs.get("boundary")
        known = boundary is not None and np.asarray(boundary).dtype.kind == "S" \
            and np.shape(boundary) == (dimension,) \
            and set(np.asarray(boundary)) <= {b"periodic", b"none"}
        self.rule(known, box.name, f"attribute boundary must be {dimension} fixed-length strings,"
                                   " each periodic or none")
        if self.rule("edges" in box, box.name, "has no edges") \
                and isinstance(box["edges"], h5py.Dataset):
            edges = box["edges"]
            self.rule(edges.shape in ((dimension,), (dimension, dimension)), edges.name,
                      f"shape {edges.shape} does not fit the dimension {dimension}")
            self.unit(edges)

    def elements(self):
        """Paths of all time-dependent elements."""
        found = []

        def look(name, item):
            if isinstance(item, h5py.Group) and {"value", "step", "time"} & set(item):
                found.append(name)

        for root in ("particles", "observables"):
            if root in self.file:
                self.file[root].visititems(lambda n, i, root=root: look(f"{root}/{n}", i))
        return found

    def element(self, place):
        """A time-dependent element: value, and step and time in their fixed form."""
        group = self.file[place]
        for name in ("value", "step", "time"):
            there = name in group and isinstance(group[name], h5py.Dataset)
            if not self.rule(there, place, f"has no dataset {name}"):
                return
        step, time, value = group["step"], group["time"], group["value"]
        self.rule(step.shape == () and step.dtype.kind in "iu" and step[()] > 0, step.name,
                  "must be a positive integer scalar, the increment (fixed form)")
        self.rule(time.shape == () and time.dtype.kind == "f" and time[()] > 0, time.name,
                  "must be a positive float scalar, the increment (fixed form)")
        self.rule(np.asarray(step.attrs.get("offset", 0)).dtype.kind in "iu", step.name,
                  "attribute offset must be an integer")
        self.rule("unit" in time.attrs, time.name, "has no attribute unit")
        self.rule(value.ndim >= 1 and value.maxshape[0] is None, value.name,
                  "its first axis must be extendible (time)")
        self.rule(value.chunks is not None and value.fletcher32, value.name,
                  "must be chunked and have Fletcher-32 checksums")
        self.unit(time)
        self.unit(value)
        if place.split("/")[0] == "particles" and place.endswith(("/image", "/box/edges")):
            self.linked(place)

    def linked(self, place):
        """Steps and times of image and of a box that changes are those of position."""
        base = "/".join(place.split("/")[:2]) + "/position"
        if self.rule(base in self.file, place, "recorded without position"):
            for name in ("step", "time"):
                same = self.file[place][name] == self.file[base].get(name)
                self.rule(same, f"{place}/{name}", f"must be a hard link to /{base}/{name}")

    def unit(self, item):
        if "unit" in item.attrs:
            text = self.text_attribute(item, "unit")
            self.rule(text is None or is_unit(text), item.name, f"{text!r} is no H5MD unit string")

    def spans(self, places):
        """All elements begin at one step and go on to the same end, as far as strides allow."""
        begins, ends = {}, {}
        for place in places:
            group = self.file[place]
            if {"value", "step"} <= set(group) and group["step"].shape == ():
                increment, frames = int(group["step"][()]), group["value"].shape[0]
                offset = int(group["step"].attrs.get("offset", 0))
                begins[place] = (offset - increment, offset)
                ends[place] = (offset + (frames - 1) * increment, offset + frames * increment)
        if not ends:
            return
        first = min(begin for _, begin in begins.values())
        for place, (before, begin) in begins.items():
            self.rule(before < first, f"{place}/value",
                      f"begins at step {begin}; others at step {first}")
        last = max(end for end, _ in ends.values())
        for place, (end, following) in ends.items():
            self.rule(following > last, f"{place}/value",
                      f"ends at step {end}; others go on to step {last}")

    def parameters(self):
        """/parameters/swirlight: the config, and each species with its sites."""
        if not self.rule(OWN in self.file, OWN, "is missing"):
            return
        own = self.file[OWN]
        self.rule("config" in own, f"{OWN}/config", "is missing")
        for name, group in (own["species"].items() if "species" in own else ()):
            sites = group.get("sites")
            if self.rule(sites is not None and sites.ndim == 2 and sites.shape[1] == 3,
                         f"{OWN}/species/{name}/sites", "must be positions (sites, 3)"):
                for part in ("mass", "charge", "sigma", "epsilon"):
                    self.rule(part in group and group[part].shape == sites.shape[:1],
                              f"{OWN}/species/{name}/{part}", "must have one number per site")

    def readable(self, place):
        """Every chunk can be read, its checksum fits, and its numbers are finite."""

        def read(_, item):
            if not isinstance(item, h5py.Dataset):
                return
            blocks = item.iter_chunks() if item.chunks and item.size else [()]
            for block in blocks:
                where = f"{item.name}" + (f" frames {block[0].start} to {block[0].stop - 1}"
                                          if block else "")
                try:
                    data = item[block]
                except (OSError, RuntimeError) as error:
                    self.rule(False, where, f"damaged: cannot be read ({error})")
                    continue
                if item.dtype.kind == "f" and not item.name.startswith(f"/{OWN}"):
                    # a total that this sample does not have is NaN throughout
                    absent = item.name.startswith("/observables") and np.isnan(data).all()
                    self.rule(absent or np.isfinite(data).all(), where,
                              "values that are not finite")

        self.file[place].visititems(read)

    def meaning(self):
        """What the numbers must fulfil: unit quaternions, positions inside the box."""
        bodies = self.file.get(BODIES, {})
        if "orientation" in bodies:
            value = bodies["orientation/value"]
            worst = max((_off_unit(value[block]) for block in _frames(value)), default=0.0)
            self.rule(worst < UNIT_LENGTH, value.name, f"not unit quaternions: off by {worst:.1e}")
        if "position" in bodies and "image" in bodies \
                and isinstance(bodies["box/edges"], h5py.Dataset):
            value, box = bodies["position/value"], bodies["box/edges"][()]
            inside = all(((x := value[block]) >= 0).all() and (x <= box * (1 + 1e-6)).all()
                         for block in _frames(value))
            self.rule(inside, value.name, "positions outside of the box, though image is recorded")


def _frames(dataset):
    return [slice(a, a + dataset.chunks[0]) for a in range(0, dataset.shape[0], dataset.chunks[0])]


def _off_unit(quaternions):
    norms = np.linalg.norm(quaternions.astype(float), axis=-1)
    return float(np.abs(norms - 1.0).max(initial=0.0))
