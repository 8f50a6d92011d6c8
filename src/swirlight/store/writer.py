"""Writing a trajectory so that nothing recorded is lost and no interruption leaves a trace.

In the working folder of one trajectory:

    segments/000017.h5          frames of a fixed number of steps, whole, never changed
    checkpoints/000000012000.h5 the newest two; they hold the frames of the unfinished segment
    final.tmp                   the final file while it is being put together

Commit rule  a segment counts when a checkpoint counts it; everything else is what an
    interruption left over, and is removed. The final file is complete or not there.
    Segments end at fixed steps, never by the clock, and files hold no times: however
    often a run is stopped and resumed, it leaves the same bytes.
"""

import contextlib
import functools
import hashlib
import math
import os
import pathlib
from dataclasses import replace

import h5py
import numpy as np

from swirlight.errors import RunError
from swirlight.store.checkpoint import Checkpoint, read_newest, write_checkpoint
from swirlight.store.durable import (
    PARTIAL,
    make_folder,
    remove,
    remove_folder,
    replacing,
    sync_folder,
    write_bytes,
)
from swirlight.store.layout import FORMAT, build_image, lay_out
from swirlight.store.lock import FolderLock
from swirlight.store.parts import Files, Parts

SEGMENT_BYTES = 32e6  # a segment is held in memory, twice while it is sealed
SEGMENT_FRAMES = 4096
CONSOLIDATION_BYTES = 32e6


def segment_steps(elements, steps):
    """How many steps a segment should cover: a multiple of every stride, at most 32 MB of frames.

    steps : of the whole trajectory; it is cut into eight segments at least (where the
        strides allow), so that a run under way can be looked at.
    """
    stride = math.lcm(*(e.every for e in elements))
    size = sum(
        stride // e.every * math.prod(e.shape) * np.dtype(e.dtype).itemsize for e in elements
    )
    most = min(SEGMENT_BYTES // max(size, 1), SEGMENT_FRAMES, -(-steps // (8 * stride)))
    return stride * max(1, int(most))


def load_checkpoint(workdir):
    """The newest undamaged `Checkpoint` of a trajectory under way, or None if there is none."""
    return read_newest(pathlib.Path(workdir) / "checkpoints")


class TrajectoryWriter:
    """Takes frames step by step and leaves one file. Use `create` or `reopen`.

    Each step: `append` what is due, all of it; then, when `seal_due` or a signal or a clock
    asks for it, `checkpoint`; in the end `finish`.
    """

    def __init__(self, workdir, header, segment_steps):
        for element in header.elements:
            if segment_steps % element.every:
                raise ValueError(f"segments of {segment_steps} steps, {element.name} every"
                                 f" {element.every}")
        self.workdir = pathlib.Path(workdir)
        self.header = header
        self.segment_steps = segment_steps
        self._lock = FolderLock(workdir)
        self._elements = {e.name: e for e in header.elements}
        self._segments = 0
        self._rows = dict.fromkeys(self._elements, 0)  # in the whole trajectory
        self._pending = dict.fromkeys(self._elements, 0)  # of them not yet in a segment
        self._buffers = {
            name: np.empty((segment_steps // e.every + 1, *e.shape), e.dtype)
            for name, e in self._elements.items()
        }
        self._kept_step = None

    @classmethod
    def create(cls, workdir, header, segment_steps):
        """Begin a trajectory; what an attempt without a checkpoint left here is removed.

        segment_steps : a multiple of every element's stride.
        Raises InputError if another process writes here.
        """
        writer = cls(workdir, header, segment_steps)
        with writer._reporting():
            writer._lock.acquire()
            for name in ("segments", "checkpoints"):
                remove_folder(writer.workdir / name)
                make_folder(writer.workdir / name)
        return writer

    @classmethod
    def reopen(cls, workdir, header, segment_steps, checkpoint):
        """Go on from a checkpoint: whatever was written after it is removed.

        Raises RunError if the checkpoint was made with another header, InputError if
        another process writes here.
        """
        writer = cls(workdir, header, segment_steps)
        if checkpoint.layout != writer._fingerprint:
            raise RunError(f"{workdir}: this was begun with other bodies, elements or strides")
        with writer._reporting():
            writer._lock.acquire()
            writer._truncate(checkpoint)
        writer._segments = checkpoint.segments
        writer._rows = dict(checkpoint.rows)
        writer._kept_step = checkpoint.step
        for name, frames in checkpoint.pending.items():
            writer._pending[name] = len(frames)
            writer._buffers[name][: len(frames)] = frames
        return writer

    @property
    def rows(self):
        """{element: frames so far}."""
        return dict(self._rows)

    def append(self, step, values):
        """Record what is due at `step`: {element name: array of the element's shape}; it is copied.

        Raises ValueError for an unknown name, a wrong shape, a step out of turn; RunError
        when a segment cannot be written.
        """
        if step <= self._end_of_segment(self._segments - 1) and self._segments:
            raise ValueError(f"step {step} belongs to a segment that is sealed")
        while step > self._end_of_segment(self._segments):
            self._seal()
        for name, value in values.items():
            element, row = self._elements[name], self._rows[name]
            due = self.header.first_step + row * element.every
            if step != due:
                raise ValueError(f"{name} is due at step {due}, not at {step}")
            if np.shape(value) != element.shape:
                raise ValueError(f"{name}: shape {np.shape(value)}, expected {element.shape}")
            self._buffers[name][self._pending[name]] = value
            self._pending[name] += 1
            self._rows[name] += 1

    def seal_due(self, step):
        """Whether a segment is complete at `step`: the time for a checkpoint."""
        return step >= self._end_of_segment(self._segments)

    def checkpoint(self, step, payload):
        """Keep everything up to and with `step`, durably.

        payload : nested dict of arrays, numbers, texts, `State`; comes back bit for bit.
        Raises RunError when the disk is full, saying what is kept.
        """
        with self._reporting():
            while self.seal_due(step):
                self._seal()
            pending = {name: self._frames(name) for name in self._elements}
            write_checkpoint(
                self.workdir / "checkpoints",
                Checkpoint(step, payload, self._segments, self._rows, pending, self._fingerprint),
            )
        self._kept_step = step

    def finish(self, path):
        """Put the final file together, then remove the working folder.

        Raises RunError when the disk is full; the segments and checkpoints are then still there.
        """
        with self._reporting():
            if any(self._pending.values()) or not self._segments:
                self._seal()
            consolidate(
                [self._segment(k) for k in range(self._segments)],
                self.header,
                self._rows,
                path,
                self.workdir / f"final{PARTIAL}",
            )
        remove_folder(self.workdir)
        self._lock.release()

    def close(self):
        """Let go of the folder without writing anything."""
        self._lock.release()

    def _segment(self, number):
        return self.workdir / "segments" / f"{number:06d}.h5"

    def _end_of_segment(self, number):
        return self.header.first_step + (number + 1) * self.segment_steps

    def _frames(self, name):
        return self._buffers[name][: self._pending[name]]

    def _seal(self):
        first = {name: self._rows[name] - self._pending[name] for name in self._elements}
        frames = {name: self._frames(name) for name in self._elements}
        with self._reporting():
            image = build_image(self.header, first, self._pending, frames)
            write_bytes(self._segment(self._segments), image)
        self._segments += 1
        self._pending = dict.fromkeys(self._elements, 0)

    @functools.cached_property
    def _fingerprint(self):
        """What must not change between the parts of one trajectory."""
        nothing = dict.fromkeys(self._elements, 0)
        anonymous = replace(self.header, author="", version="", parameters={})
        frames = dict.fromkeys(self._elements)
        digest = hashlib.sha256(build_image(anonymous, nothing, nothing, frames))
        digest.update(str(self.segment_steps).encode())
        return digest.hexdigest()

    def _truncate(self, checkpoint):
        segments, checkpoints = self.workdir / "segments", self.workdir / "checkpoints"
        for path in [*self.workdir.rglob(f"*{PARTIAL}"), *checkpoints.glob("*.h5")]:
            if path.suffix == PARTIAL or int(path.stem) > checkpoint.step:
                remove(path)
        sealed = {int(path.stem): path for path in segments.glob("*.h5")}
        for number, path in sealed.items():
            if number >= checkpoint.segments:
                remove(path)
        sync_folder(segments)
        sync_folder(checkpoints)
        missing = [k for k in range(checkpoint.segments) if k not in sealed]
        if missing:
            raise RunError(f"{self._segment(missing[0])}: this segment is missing, though the"
                           f" checkpoint at step {checkpoint.step} counts on it")

    @contextlib.contextmanager
    def _reporting(self):
        try:
            yield
        except OSError as error:
            place = error.filename or self.workdir
            kept = ("nothing is kept yet" if self._kept_step is None else
                    f"everything up to step {self._kept_step} is kept")
            raise RunError(f"{place}: cannot be written: {error.strerror or error}; {kept}."
                           " Make room, then resume.") from error


def consolidate(segments, header, rows, path, partial):
    """Copy the segments' frames into one file, chunked for reading bodies along time.

    Works in memory of some 32 MB whatever the length. The same segments give the same bytes.
    partial : where to write meanwhile, on the same file system.
    Raises OSError when the disk is full, RunError for a damaged segment.
    """
    files = Files()
    nowhere = dict.fromkeys(rows, 0)
    with contextlib.closing(files), replacing(path, partial) as target:
        with h5py.File(target, "w", **FORMAT) as file:
            values = lay_out(file, header, nowhere, rows, final=True)
            for value in values.values():
                source = Parts(files, segments, value.name[1:])
                for block in _blocks(value):
                    value[block] = source.read(block[0], block[1:])
                    target.check()
        _read_back(os.fspath(partial))


def _blocks(dataset):
    """Slices that cover a dataset in whole chunks, each within the memory allowed."""
    frames = dataset.chunks[0]
    row = frames * math.prod(dataset.shape[1:]) * dataset.dtype.itemsize
    if dataset.ndim == 1 or row <= CONSOLIDATION_BYTES:
        across = [slice(0, dataset.shape[1], 1)] if dataset.ndim > 1 else [None]
    else:
        pieces = math.ceil(row / CONSOLIDATION_BYTES)
        width = dataset.chunks[1]
        width *= max(1, dataset.shape[1] // (pieces * width))
        across = _slices(dataset.shape[1], width)
    for time in _slices(dataset.shape[0], frames):
        for bodies in across:
            yield (time,) if bodies is None else (time, bodies)


def _slices(length, width):
    return [slice(a, min(a + width, length), 1) for a in range(0, length, width)]


def _read_back(path):
    """Read every chunk once more: HDF5 compares the checksums."""
    with h5py.File(path, "r", locking=False) as file:

        def read(_, item):
            if isinstance(item, h5py.Dataset) and item.chunks and item.size:
                for chunk in item.iter_chunks():
                    item[chunk]

        file.visititems(read)
