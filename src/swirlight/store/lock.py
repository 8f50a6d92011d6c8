"""One writer per folder."""

import fcntl
import os
import pathlib
import socket
import time

from swirlight.errors import InputError
from swirlight.store.durable import make_folder

# `locked` holds the lock for an instant to find out: a writer asks more than once.
ATTEMPTS, PAUSE = 10, 0.02  # s


class FolderLock:
    """Holds a folder against a second writer from `acquire` to `release`, or to the process's end.

    The lock is the kernel's (flock on the file ``.lock``), so that it goes with a killed
    process and nothing stale is left; what the file says is for the message only.
    Usable as a context.
    """

    NAME = ".lock"

    def __init__(self, folder):
        self.folder = pathlib.Path(folder)
        self._descriptor = None

    def acquire(self):
        """Take the lock.

        Raises InputError, saying who holds it, when another writer does; OSError where the
        folder cannot be made or locked.
        """
        make_folder(self.folder)
        path, holder = self.folder / self.NAME, ""
        for _ in range(ATTEMPTS):
            descriptor = os.open(path, os.O_RDWR | os.O_CREAT, 0o666)
            try:
                fcntl.flock(descriptor, fcntl.LOCK_EX | fcntl.LOCK_NB)
                # The folder may have been removed in between: then the name is not this file's.
                if _same_file(descriptor, path):
                    break
            except BlockingIOError:
                holder = os.pread(descriptor, 200, 0).decode(errors="replace").strip()
            except OSError as error:
                os.close(descriptor)
                raise OSError(error.errno, f"{error.strerror} (some network file systems cannot"
                              " lock; use a folder on another one)", str(path)) from None
            os.close(descriptor)
            time.sleep(PAUSE)
        else:
            raise InputError(
                f"{self.folder}: another process is writing here"
                f" ({holder or 'it did not say which'}); wait for it, or end it first"
            )
        os.ftruncate(descriptor, 0)
        os.pwrite(descriptor, f"process {os.getpid()} on {socket.gethostname()}".encode(), 0)
        self._descriptor = descriptor
        return self

    def release(self):
        """Let go; harmless when not held."""
        if self._descriptor is not None:
            os.close(self._descriptor)
            self._descriptor = None

    def __enter__(self):
        return self.acquire()

    def __exit__(self, *_):
        self.release()


def _same_file(descriptor, path):
    try:
        return os.path.samestat(os.fstat(descriptor), os.stat(path))
    except FileNotFoundError:
        return False


def locked(folder):
    """Whether another process, or another lock of this one, is writing to `folder` now."""
    try:
        descriptor = os.open(pathlib.Path(folder) / FolderLock.NAME, os.O_RDONLY)
    except FileNotFoundError:
        return False
    try:
        fcntl.flock(descriptor, fcntl.LOCK_SH | fcntl.LOCK_NB)
    except BlockingIOError:
        return True
    finally:
        os.close(descriptor)
    return False
