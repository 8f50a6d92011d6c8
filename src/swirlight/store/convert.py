"""Leaving for other tools: text and NumPy files from trajectories.

    xyz  one file per trajectory with every frame: number of sites, a comment, then a line
         "label x y z" per site [Å]; bodies are whole, their centres inside the box
    csv  one file per trajectory with the totals, one per vector with a row per frame and body
    npz  one file per trajectory with every array, its times, and all units as JSON text

Works block by block, so that a trajectory may be larger than memory.
"""

import io
import json
import math
import os
import pathlib
import zipfile

import numpy as np

from swirlight.errors import InputError
from swirlight.rotation import body_axes
from swirlight.store.durable import make_folder, replacing
from swirlight.store.layout import LABELS
from swirlight.store.run import Run, open_run
from swirlight.store.trajectory import Trajectory

BLOCK_BYTES = 16e6
ANGSTROM = 10.0  # in 1 nm
SHORT = {"real": "re", "imaginary": "im"}


def convert(run, to, into=None, only=()):
    """Write a run (or one trajectory) in another format; return the paths of the files written.

    run : `Run`, `Trajectory`, or the path of a run folder or a trajectory file.
    to : "xyz", "csv" or "npz".
    into : folder; left out: one named after the format, in the run folder or beside the file.
    only : names of the quantities wanted (csv, npz); left out: all that were recorded.
    Raises InputError when a file is already there or something needed was not recorded.
    """
    if to not in WRITERS:
        raise InputError(f"cannot convert to {to!r}; known are {', '.join(WRITERS)}")
    trajectories, folder = _open(run)
    into = pathlib.Path(into) if into is not None else folder / to
    plans = [plan for t in trajectories for plan in WRITERS[to](t, tuple(only))]
    paths = [into / name for name, _ in plans]
    for path in paths:
        if path.exists():
            raise InputError(f"{path}: exists already; remove it, or name another folder")
    make_folder(into)
    for path, (_, write) in zip(paths, plans, strict=True):
        with replacing(path) as target, io.BufferedWriter(_Keeping(target)) as buffered:
            write(buffered)
    return paths


class _Keeping(io.RawIOBase):
    """A file that stays open when the buffer over it is closed."""

    def __init__(self, target):
        self._target = target

    def writable(self):
        return True

    def seekable(self):
        return True

    def write(self, data):
        count = self._target.write(data)
        self._target.check()
        return count

    def seek(self, offset, whence=os.SEEK_SET):
        return self._target.seek(offset, whence)

    def tell(self):
        return self._target.tell()


def _open(run):
    if isinstance(run, Trajectory):
        return [run], run.final.parent
    if not isinstance(run, Run):
        path = pathlib.Path(run)
        if path.is_file():
            return [Trajectory(path)], path.parent
        run = open_run(path)
    trajectories = list(run)
    if not trajectories:
        raise InputError(f"{run.path}: no trajectory has been written yet")
    return trajectories, run.path


def _blocks(series):
    """Slices of frames that fit the memory allowed."""
    size = max(1, int(BLOCK_BYTES // max(1, series.nbytes // max(len(series), 1))))
    return [slice(a, min(a + size, len(series))) for a in range(0, len(series), size)]


def _wanted(trajectory, only):
    unknown = [name for name in only if name not in trajectory.readable]
    if unknown:
        raise InputError(f"{trajectory.path}: {', '.join(unknown)} not recorded;"
                         f" there are {', '.join(trajectory.readable)}")
    return [trajectory[name] for name in only or trajectory.names]


# xyz


def _plan_xyz(trajectory, only):
    if only:
        raise InputError("xyz holds positions of sites; it takes no other quantity")
    if "position" not in trajectory:
        raise InputError(f"{trajectory.path}: xyz needs the vector position, which is not recorded")
    sites = _Sites(trajectory)
    return [(f"{trajectory.name}.xyz", lambda file: _write_xyz(file, trajectory, sites))]


class _Sites:
    """Sites of all bodies, listed body by body: which body, where in its frame, and the label."""

    def __init__(self, trajectory):
        try:
            described = trajectory.parameters["species"]
            kinds = [described[name.replace("/", "-")] for name in trajectory.species_names]
        except KeyError as error:
            raise InputError(f"{trajectory.path}: does not describe species {error}") from None
        of_body = [kinds[k] for k in trajectory.species]
        self.body = np.repeat(np.arange(len(of_body)), [len(k["sites"]) for k in of_body])
        self.local = np.concatenate([k["sites"] for k in of_body])
        self.label = [label for k in of_body for label in k["labels"]]
        self.turned = bool(np.abs(self.local).max() > 0)
        if self.turned and "orientation" not in trajectory:
            raise InputError(f"{trajectory.path}: xyz needs the vector orientation,"
                             " which is not recorded")

    def place(self, position, orientation):
        """(frames, sites, 3) positions of the sites. [nm]"""
        centres = position[:, self.body].astype(float)
        if not self.turned:
            return centres
        axes = body_axes(orientation.astype(float))[:, self.body]  # row k: body axis k
        return centres + np.einsum("sk,fskj->fsj", self.local, axes)


def _write_xyz(file, trajectory, sites):
    position = trajectory["position"]
    orientation = trajectory["orientation"] if sites.turned else None
    if orientation is not None and orientation.interval != position.interval:
        raise InputError(f"{trajectory.path}: position and orientation have different strides")
    box = " ".join(f"{edge * ANGSTROM:.6f}" for edge in trajectory.box)
    times = position.times
    for block in _blocks(position):
        turned = None if orientation is None else orientation[block]
        placed = ANGSTROM * sites.place(position[block], turned)
        for time, frame in zip(times[block], placed, strict=True):
            lines = [str(len(sites.label)), f"{trajectory.name} time {time:.6f} ps box {box} A"]
            lines += [f"{label} {x:.5f} {y:.5f} {z:.5f}"
                      for label, (x, y, z) in zip(sites.label, frame.tolist(), strict=True)]
            file.write(("\n".join(lines) + "\n").encode())


# csv


def _plan_csv(trajectory, only):
    plans, totals = [], {}
    for series in _wanted(trajectory, only):
        if "body" in series.dimensions:
            name = f"{trajectory.name}-{_file_name(series.name)}.csv"
            plans.append((name, lambda file, s=series: _write_vector(file, s)))
        else:
            totals.setdefault((series.interval, len(series)), []).append(series)
    for number, same_times in enumerate(totals.values()):
        name = f"{trajectory.name}-totals{number + 1 if len(totals) > 1 else ''}.csv"
        plans.append((name, lambda file, s=same_times: _write_totals(file, s)))
    return plans


def _file_name(name):
    return name.replace("/", "-")


def _columns(series, axes):
    """One heading per number: "total_dipole_x [C m]"."""
    labels = [LABELS.get(name) or [str(i) for i in range(length)] for name, length in axes]
    names = [series.name]
    for choices in labels:
        names = [f"{name}_{SHORT.get(c, c)}" for name in names for c in choices]
    unit = f" [{series.unit}]" if series.unit else ""
    return [f"{name}{unit}" for name in names]


def _write_table(file, formats, *columns):
    """Rows of numbers; columns of shape (rows,) or (rows, width)."""
    wide = [c.reshape(len(c), -1).tolist() for c in columns]
    text = "".join(
        ",".join(f.format(v) for f, part in zip(formats, parts, strict=True) for v in part) + "\n"
        for parts in zip(*wide, strict=True)
    )
    file.write(text.encode())


def _exact(dtype):
    return "{}" if dtype.kind in "iu" else "{:.9g}" if dtype.itemsize <= 4 else "{:.17g}"


def _write_totals(file, several):
    axes = [list(zip(s.dimensions, s.shape, strict=True))[1:] for s in several]
    heads = [head for s, a in zip(several, axes, strict=True) for head in _columns(s, a)]
    file.write((",".join(["time [ps]", *heads]) + "\n").encode())
    times = several[0].times
    formats = ["{:.12g}", *(_exact(s.dtype) for s in several)]
    for block in _blocks(max(several, key=lambda s: s.nbytes)):
        _write_table(file, formats, times[block], *(s[block] for s in several))


def _write_vector(file, series):
    axes = list(zip(series.dimensions, series.shape, strict=True))[2:]
    file.write((",".join(["time [ps]", "body", *_columns(series, axes)]) + "\n").encode())
    times, bodies = series.times, np.arange(series.shape[1])
    formats = ["{:.12g}", "{}", _exact(series.dtype)]
    for block in _blocks(series):
        data = series[block]
        time = np.repeat(times[block], len(bodies))
        body = np.tile(bodies, len(data))
        _write_table(file, formats, time, body, data.reshape(len(time), math.prod(data.shape[2:])))


# npz


def _plan_npz(trajectory, only):
    wanted = _wanted(trajectory, only)
    return [(f"{trajectory.name}.npz", lambda file: _write_npz(file, trajectory, wanted))]


def _write_npz(file, trajectory, wanted):
    small = {
        "box": trajectory.box,
        "species": np.array(trajectory.species_names)[trajectory.species],
        "mass": trajectory.mass,
        "units": np.array(json.dumps({s.name.replace("/", "_"): s.unit for s in wanted}
                                     | {"box": "nm", "mass": "g mol-1", "time": "ps"})),
        **{f"{s.name.replace('/', '_')}_time": s.times for s in wanted},
    }
    with zipfile.ZipFile(file, "w", zipfile.ZIP_STORED, allowZip64=True) as archive:
        for name, array in small.items():
            with _member(archive, name) as member:
                np.lib.format.write_array(member, np.asarray(array), allow_pickle=False)
        for series in wanted:
            head = {"descr": np.lib.format.dtype_to_descr(series.dtype),
                    "fortran_order": False, "shape": series.shape}
            with _member(archive, series.name.replace("/", "_")) as member:
                np.lib.format.write_array_header_2_0(member, head)
                for block in _blocks(series):
                    member.write(np.ascontiguousarray(series[block]).tobytes())


def _member(archive, name):
    # A fixed date: the same trajectory gives the same bytes.
    return archive.open(zipfile.ZipInfo(f"{name}.npy"), "w", force_zip64=True)


WRITERS = {"xyz": _plan_xyz, "csv": _plan_csv, "npz": _plan_npz}
