"""However often and wherever a writer is killed, the bytes it leaves in the end are the same."""

import os
import pathlib
import random
import shutil
import signal
import subprocess
import sys
import time

import pytest

from swirlight.store import durable
from swirlight.store.lock import FolderLock
from swirlight.store.verify import verify
from tests.store import engine

KILLED = 77
COUNTED = ("pwrite", "fsync", "replace", "unlink", "mkdir", "truncate", "rmdir")


class Deadly:
    """Stands in for `os` where files are written; the process dies before the n-th call.

    A deadly pwrite still writes the first half of its data: a torn write.
    """

    def __init__(self, deadly):
        self.calls, self.deadly = [], deadly

    def __getattr__(self, name):
        function = getattr(os, name)
        if name not in COUNTED:
            return function

        def counted(*arguments):
            self.calls.append(name)
            if len(self.calls) == self.deadly:
                if name == "pwrite":
                    descriptor, data, offset = arguments
                    function(descriptor, data[: len(data) // 2], offset)
                os._exit(KILLED)
            # A killed process loses nothing that it wrote: to wait for the disk shows nothing here.
            return None if name == "fsync" else function(*arguments)

        return counted

    def rmtree(self, folder):
        """As shutil.rmtree, one counted call after the other."""
        if not os.path.isdir(folder):
            raise FileNotFoundError(folder)
        for place, folders, files in os.walk(folder, topdown=False):
            for name in files:
                self.__getattr__("unlink")(os.path.join(place, name))
            for name in folders:
                self.__getattr__("rmdir")(os.path.join(place, name))
        self.__getattr__("rmdir")(folder)


def in_child(folder, deadly):
    """Run the engine in a forked process that dies at call `deadly`; (exit code, its calls)."""
    reader, writer = os.pipe()
    child = os.fork()
    if child == 0:
        code = 1
        try:
            durable.os = durable.shutil = count = Deadly(deadly)
            engine.run(folder / ".work/plus-000", folder / "plus-000.h5")
            os.write(writer, " ".join(count.calls).encode())
            code = 0
        finally:
            os._exit(code)
    os.close(writer)
    with os.fdopen(reader) as pipe:
        calls = pipe.read()
    return os.waitstatus_to_exitcode(os.waitpid(child, 0)[1]), calls.split()


@pytest.fixture(scope="module")
def undisturbed(tmp_path_factory):
    folder = tmp_path_factory.mktemp("undisturbed")
    engine.run(folder / ".work/plus-000", folder / "plus-000.h5")
    return (folder / "plus-000.h5").read_bytes()


@pytest.mark.filterwarnings("ignore:.*fork:DeprecationWarning")
@pytest.mark.parametrize("stride", [9, pytest.param(1, marks=pytest.mark.slow)])
def test_killed_once_at_every_sync_rename_removal_and_write(tmp_path, undisturbed, stride,
                                                            monkeypatch):
    """With a stride, of the many small writes only some."""
    monkeypatch.setattr(durable, "os", Deadly(0))
    code, calls = in_child(tmp_path / "count", 0)
    assert code == 0 and len(calls) > 60 and set(calls) >= set(COUNTED) - {"truncate"}
    writes = [n for n, name in enumerate(calls, 1) if name == "pwrite"]
    others = [n for n, name in enumerate(calls, 1) if name != "pwrite"]
    for deadly in others + writes[::stride]:
        folder = tmp_path / str(deadly)
        assert in_child(folder, deadly)[0] == KILLED
        engine.run(folder / ".work/plus-000", folder / "plus-000.h5")
        assert (folder / "plus-000.h5").read_bytes() == undisturbed, f"killed at call {deadly}"
        leftovers = [p for p in folder.rglob("*.tmp")]
        assert not leftovers
        shutil.rmtree(folder)


@pytest.mark.filterwarnings("ignore:.*fork:DeprecationWarning")
def test_killed_again_and_again(tmp_path, undisturbed):
    """Every resume dies a little later than the one before."""
    for deadly in (*range(7, 60, 4), *range(61, 400, 37)):
        if in_child(tmp_path, deadly)[0] == 0:
            break
    engine.run(tmp_path / ".work/plus-000", tmp_path / "plus-000.h5")
    assert (tmp_path / "plus-000.h5").read_bytes() == undisturbed


@pytest.mark.parametrize("stop", [101, 106, 116, 117, 131, 132, 139])
def test_stopped_and_resumed(tmp_path, undisturbed, stop):
    arguments = tmp_path / ".work/plus-000", tmp_path / "plus-000.h5"
    engine.run(*arguments, stop=stop)
    engine.run(*arguments)
    assert (tmp_path / "plus-000.h5").read_bytes() == undisturbed


def test_when_checkpoints_are_taken_does_not_show(tmp_path, undisturbed):
    engine.run(tmp_path / "w", tmp_path / "a.h5", checkpoint_every=1)
    assert (tmp_path / "a.h5").read_bytes() == undisturbed
    time.sleep(1.1)  # a time stamp in the file would differ now
    engine.run(tmp_path / "w", tmp_path / "b.h5", checkpoint_every=1000)
    assert (tmp_path / "b.h5").read_bytes() == undisturbed


def test_a_damaged_checkpoint_falls_back_on_the_one_before(tmp_path, undisturbed):
    work = tmp_path / ".work/plus-000"
    engine.run(work, tmp_path / "plus-000.h5", stop=130)
    older, newest = sorted((work / "checkpoints").glob("*.h5"))
    data = bytearray(newest.read_bytes())
    data[len(data) // 2] ^= 1
    newest.write_bytes(data)
    assert engine.load_checkpoint(work).step == int(older.stem)
    assert verify(tmp_path)[0].startswith(f"{newest}: damaged")
    engine.run(work, tmp_path / "plus-000.h5")
    assert (tmp_path / "plus-000.h5").read_bytes() == undisturbed


STEPS = 4000


@pytest.fixture(scope="module")
def long_undisturbed(tmp_path_factory):
    folder = tmp_path_factory.mktemp("long")
    subprocess.run([*_command(folder)], check=True, timeout=60, cwd=_root())
    return (folder / "plus-000.h5").read_bytes()


def _root():
    return pathlib.Path(__file__).parents[2]


def _command(folder):
    return [sys.executable, "-m", "tests.store.engine", str(folder / ".work/plus-000"),
            str(folder / "plus-000.h5"), str(STEPS)]


@pytest.mark.parametrize("seed", range(3))
def test_killed_for_real_at_random_moments(tmp_path, long_undisturbed, seed):
    """SIGKILL to a writer of its own, up to five times, then one that may finish."""
    moments, kills = random.Random(seed), 0
    for _ in range(5):
        writer = subprocess.Popen(_command(tmp_path), cwd=_root())
        started = time.monotonic()
        while not (tmp_path / ".work").exists() and writer.poll() is None:
            assert time.monotonic() - started < 60
            time.sleep(0.002)
        time.sleep(moments.uniform(0, 0.5))
        writer.send_signal(signal.SIGKILL)
        kills += writer.wait() == -signal.SIGKILL
    assert kills > 0
    with FolderLock(tmp_path / ".work/plus-000"):
        pass  # the kernel has let go of the dead writer's lock
    subprocess.run(_command(tmp_path), check=True, timeout=60, cwd=_root())
    assert (tmp_path / "plus-000.h5").read_bytes() == long_undisturbed
