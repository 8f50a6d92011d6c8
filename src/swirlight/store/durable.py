"""Writing so that a file is either whole or not there, whatever happens in between.

Everything the package leaves on disk goes through here. A file is written beside its
place under a name that ends in ``.tmp``, forced to the disk, renamed, and the folder is
forced to the disk too; only then does it count. HDF5 itself never writes to the disk
(a disk that runs full under HDF5 ends in a crash at exit): small files are built in
memory, large ones pass through `DiskFile`, which reports a full disk as a plain OSError.
"""

import contextlib
import io
import json
import math
import os
import shutil

import numpy as np

PARTIAL = ".tmp"
_WRITE = os.O_RDWR | os.O_CREAT | os.O_TRUNC


class DiskFile(io.RawIOBase):
    """A file on disk for HDF5 to write to, whose failures HDF5 never sees.

    The first OSError is kept in `failure` and everything after it is dropped, so that
    HDF5 can be closed in good order; the caller looks at `failure` (or calls `check`).
    """

    def __init__(self, path):
        super().__init__()
        self._descriptor = os.open(path, _WRITE, 0o666)
        self._at = 0
        self.failure = None

    def _attempt(self, action, otherwise):
        if self.failure is None:
            try:
                return action()
            except OSError as error:
                self.failure = error
        return otherwise

    def check(self):
        """Raise the first failure, if there was one."""
        if self.failure is not None:
            raise self.failure

    def seekable(self):
        return True

    def readable(self):
        return True

    def writable(self):
        return True

    def tell(self):
        return self._at

    def seek(self, offset, whence=os.SEEK_SET):
        base = {os.SEEK_SET: 0, os.SEEK_CUR: self._at}.get(whence)
        if base is None:
            base = os.fstat(self._descriptor).st_size
        self._at = base + offset
        return self._at

    def readinto(self, buffer):
        data = self._attempt(lambda: os.pread(self._descriptor, len(buffer), self._at), b"")
        buffer[: len(data)] = data
        self._at += len(data)
        return len(data)

    def write(self, data):
        data = memoryview(data).cast("B")
        self._attempt(lambda: _write_all(self._descriptor, data, self._at), None)
        self._at += len(data)
        return len(data)

    def truncate(self, size=None):
        size = self._at if size is None else size
        self._attempt(lambda: os.truncate(self._descriptor, size), None)
        return size

    def sync(self):
        """Force everything to the disk; raises OSError, also that of an earlier write."""
        self.check()
        os.fsync(self._descriptor)

    def close(self):
        if not self.closed:
            os.close(self._descriptor)
        super().close()


def _write_all(descriptor, data, offset):
    while data:
        count = os.pwrite(descriptor, data, offset)
        data, offset = data[count:], offset + count


def make_folder(path):
    """Create a folder (its parents too), durably; an existing one is fine."""
    if not os.path.isdir(path):
        parent = os.path.dirname(os.path.abspath(path))
        make_folder(parent)
        with contextlib.suppress(FileExistsError):
            os.mkdir(path)
        sync_folder(parent)


def sync_folder(path):
    """Force the names in a folder to the disk."""
    descriptor = os.open(path, os.O_RDONLY)
    try:
        os.fsync(descriptor)
    finally:
        os.close(descriptor)


@contextlib.contextmanager
def replacing(path, partial=None):
    """A context that yields a `DiskFile` and puts it in place of `path` when it ends well.

    partial : where to write meanwhile, on the same file system; `path` + ".tmp" if not given.
    When the block fails the partial file is removed and `path` is as it was.
    """
    partial = f"{path}{PARTIAL}" if partial is None else partial
    target = DiskFile(partial)
    try:
        with target:
            yield target
            target.sync()
        os.replace(partial, path)
        sync_folder(os.path.dirname(os.path.abspath(path)))
    except Exception as error:
        with contextlib.suppress(OSError):
            os.unlink(partial)
        if target.failure is not None and target.failure is not error:
            raise target.failure from error  # what HDF5 complained about followed from it
        raise


def write_bytes(path, *parts):
    """Write a file atomically and durably; raises OSError with nothing changed."""
    with replacing(path) as target:
        for part in parts:
            target.write(part)


def remove(path):
    """Remove a file; one that is not there is fine."""
    with contextlib.suppress(FileNotFoundError):
        os.unlink(path)


def remove_folder(path):
    """Remove a folder and all it holds; one that is not there is fine."""
    with contextlib.suppress(FileNotFoundError):
        shutil.rmtree(path)


def write_json(path, content, sync=True):
    """Write JSON atomically: a reader sees the old text or the new one.

    NumPy scalars and arrays become numbers and lists; NaN and infinity, which JSON
    does not have, become null.
    sync : force it to the disk as well; needless for what is rewritten every second.
    """
    text = json.dumps(plain(content), indent=2, ensure_ascii=False, allow_nan=False) + "\n"
    if sync:
        write_bytes(path, text.encode())
        return
    partial = f"{path}{PARTIAL}"
    with open(partial, "w", encoding="utf-8") as file:
        file.write(text)
    os.replace(partial, path)


def plain(content):
    """The same for JSON: numbers and lists of NumPy's, null for NaN and infinity."""
    if isinstance(content, dict):
        return {str(key): plain(value) for key, value in content.items()}
    if isinstance(content, np.ndarray | np.generic):
        content = content.tolist()
    if isinstance(content, list | tuple):
        return [plain(value) for value in content]
    if isinstance(content, float) and not math.isfinite(content):
        return None
    return content
