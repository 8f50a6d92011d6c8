"""Reading one dataset whose frames lie in one file or in several, one after another."""

import threading
from collections import OrderedDict

import h5py
import numpy as np

from swirlight.errors import RunError

MOST_OPEN = 16


class Files:
    """HDF5 files open for reading, the least recently used closed when there are many.

    Files of a run never change once they bear their name, so no lock is taken.
    """

    def __init__(self):
        self._open = OrderedDict()
        self._guard = threading.RLock()

    def __getitem__(self, path):
        with self._guard:
            file = self._open.pop(path, None)
            if file is None:
                file = h5py.File(path, "r", locking=False)
                if len(self._open) >= MOST_OPEN:
                    self._open.popitem(last=False)[1].close()
            self._open[path] = file
            return file

    def close(self):
        """Close them all; they are opened again when needed."""
        with self._guard:
            while self._open:
                self._open.popitem()[1].close()

    def __reduce__(self):
        return Files, ()  # workers get paths, never handles


class Parts:
    """The frames of one dataset over files.

    files : `Files`; paths : where, in order; dataset : its path in each of them.
    """

    def __init__(self, files, paths, dataset):
        self.files, self.paths, self.dataset = files, tuple(paths), dataset
        shapes = [files[path][dataset].shape for path in self.paths]
        self.starts = np.concatenate([[0], np.cumsum([s[0] for s in shapes])])
        self.shape = (int(self.starts[-1]), *shapes[0][1:])
        self.dtype = files[self.paths[0]][dataset].dtype

    def read(self, frames, rest=()):
        """Read frames (a slice with start, stop and positive step) and slices of other axes.

        Raises RunError naming the file and the frames when the data are damaged.
        """
        rest = tuple(rest) + tuple(slice(0, n, 1) for n in self.shape[1 + len(rest) :])
        wanted = range(frames.start, frames.stop, frames.step)
        lengths = [len(range(s.start, s.stop, s.step)) for s in rest]
        out = np.empty((len(wanted), *lengths), self.dtype)
        if out.size == 0:
            return out
        done = 0
        for path, start, stop in zip(self.paths, self.starts, self.starts[1:], strict=False):
            # how many of the frames still wanted lie before this file's end
            count = max(0, -(-(min(stop, frames.stop) - wanted[0]) // frames.step)) - done
            if count <= 0:
                continue
            first = wanted[done] - int(start)
            source = slice(first, first + (count - 1) * frames.step + 1, frames.step)
            dataset = self.files[path][self.dataset]
            try:
                dataset.read_direct(out, (source, *rest), np.s_[done : done + count])
            except OSError as error:
                raise RunError(
                    f"{path}:/{self.dataset}: damaged: frames {source.start} to {source.stop - 1}"
                    f" cannot be read ({error})"
                ) from None
            done += count
        return out
