"""What the writer refuses, what it keeps when the disk is full, one writer per folder."""

import hashlib
import json
import os
import pathlib
import pickle
import subprocess
import sys
import textwrap
import threading

import h5py
import numpy as np
import pytest

from swirlight.errors import InputError, RunError
from swirlight.store import durable, writer
from swirlight.store.checkpoint import Checkpoint, read_newest, write_checkpoint
from swirlight.store.durable import write_bytes, write_json
from swirlight.store.layout import Element
from swirlight.store.lock import FolderLock, locked
from swirlight.store.writer import TrajectoryWriter, load_checkpoint, segment_steps
from tests.store import engine

ROOT = pathlib.Path(__file__).parents[2]


def test_frames_out_of_turn_are_refused(tmp_path):
    w = TrajectoryWriter.create(tmp_path / "w", engine.header(), 16)
    with pytest.raises(KeyError):
        w.append(100, {"nonsense": 1.0})
    with pytest.raises(ValueError, match="shape"):
        w.append(100, {"torque": np.zeros((3, 7))})
    with pytest.raises(ValueError, match="due at step 100, not at 102"):
        w.append(102, {"temperature": 1.0})
    w.append(100, {"temperature": 1.0})
    for step in range(102, 118, 2):
        w.append(step, {"temperature": 1.0})
    w.checkpoint(116, {})
    with pytest.raises(ValueError, match="sealed"):
        w.append(116, {"torque": np.zeros((7, 3))})
    w.close()
    with pytest.raises(ValueError, match="segments of 15 steps"):
        TrajectoryWriter.create(tmp_path / "v", engine.header(), 15)


def test_what_is_appended_is_copied(tmp_path):
    one = (Element("temperature", "observables", (2,), "f8", "K", 1),)
    w = TrajectoryWriter.create(tmp_path / "w", engine.header(elements=one), 4)
    buffer = np.zeros(2)
    for step in range(100, 110):
        buffer[:] = step
        w.append(step, {"temperature": buffer})
    w.finish(tmp_path / "x.h5")
    with h5py.File(tmp_path / "x.h5") as file:
        found = file["observables/temperature/value"][:, 0]
    np.testing.assert_array_equal(found, range(100, 110))
    assert not (tmp_path / "w").exists()


def test_resuming_with_other_elements_is_refused(tmp_path):
    engine.run(tmp_path / "w", tmp_path / "x.h5", stop=120)
    saved = load_checkpoint(tmp_path / "w")
    with pytest.raises(RunError, match="other bodies, elements or strides"):
        TrajectoryWriter.reopen(tmp_path / "w", engine.header(timestep=0.001), 16, saved)
    with pytest.raises(RunError, match="other bodies, elements or strides"):
        TrajectoryWriter.reopen(tmp_path / "w", engine.header(), 32, saved)
    TrajectoryWriter.reopen(tmp_path / "w", engine.header(author="else"), 16, saved).close()


def test_a_missing_segment_is_named(tmp_path):
    engine.run(tmp_path / "w", tmp_path / "x.h5", stop=120)
    (tmp_path / "w/segments/000000.h5").unlink()
    with pytest.raises(RunError, match="000000.h5: this segment is missing"):
        engine.run(tmp_path / "w", tmp_path / "x.h5")


def test_a_damaged_segment_is_named_and_nothing_final_is_left(tmp_path):
    engine.run(tmp_path / "w", tmp_path / "x.h5", stop=138)
    segment = tmp_path / "w/segments/000001.h5"
    with h5py.File(segment, "r") as file:
        info = file["particles/bodies/torque/value"].id.get_chunk_info(0)
    data = bytearray(segment.read_bytes())
    data[info.byte_offset + 5] ^= 4
    segment.write_bytes(data)
    with pytest.raises(RunError, match=r"000001.h5:/particles/bodies/torque/value: damaged"):
        engine.run(tmp_path / "w", tmp_path / "x.h5")
    assert not (tmp_path / "x.h5").exists() and not list(tmp_path.rglob("*.tmp"))


def test_everything_in_a_payload_comes_back_bit_for_bit(tmp_path):
    state = engine.first_state()
    payload = {
        "state": state, "other": engine.first_state(), "array": np.arange(6.0).reshape(2, 3) / 7,
        "small": np.float32([1.1]), "counts": np.arange(3, dtype=np.int32), "on": np.array([True]),
        "empty": np.zeros((0, 3)), "third": 1 / 3, "huge": 2**127 + 1, "text": "å/ö", "no": None,
        "numpy": np.float64(0.1), "infinite": float("inf"), "list": [1, "a", [2.5]],
        "nested": {"deep": {"array": np.array(3.5)}, "empty": {}},
    }
    write_checkpoint(tmp_path, Checkpoint(7, payload, 2, {"light/x": 9}, {"light/x": np.ones(3)},
                                          "f"))
    saved = read_newest(tmp_path)
    assert (saved.step, saved.segments, saved.rows, saved.layout) == (7, 2, {"light/x": 9}, "f")
    np.testing.assert_array_equal(saved.pending["light/x"], np.ones(3))
    found, states = saved.payload, {"state", "other"}
    assert set(found) == set(payload)
    for name in states:
        for array in state.ARRAYS:
            np.testing.assert_array_equal(getattr(found[name], array), getattr(state, array))
        assert found[name].random.random() == engine_random(state)
    np.testing.assert_equal({k: v for k, v in found.items() if k not in states},
                            {k: v for k, v in payload.items() if k not in states})
    assert found["small"].dtype == np.float32 and found["counts"].dtype == np.int32
    with pytest.raises(ValueError, match="cannot be the name"):
        write_checkpoint(tmp_path, Checkpoint(8, {"a/b": 1}, 0, {}, {}, ""))


def engine_random(state):
    return state.copy().random.random()


def test_a_checkpoint_is_a_start_file_too(tmp_path):
    from swirlight.store.start import load_state
    engine.run(tmp_path / "w", tmp_path / "x.h5", stop=130)
    newest = max((tmp_path / "w/checkpoints").glob("*.h5"))
    assert load_state(newest).step == int(newest.stem)


def test_segments_cover_every_stride_and_stay_small():
    vector = Element("torque", "particles", (1000, 3), "f4", "kJ mol-1", 10)
    total = Element("temperature", "observables", (), "f8", "K", 4)
    steps = segment_steps((vector, total), 10**7)
    assert steps % 20 == 0 and 30e6 < steps / 10 * 12000 <= 32e6
    assert segment_steps((vector, total), 4000) == 500
    assert segment_steps((vector, total), 7) == 20


def test_a_second_writer_is_refused_clearly(tmp_path):
    first = TrajectoryWriter.create(tmp_path / "w", engine.header(), 16)
    with pytest.raises(InputError, match=f"another process is writing here .process {os.getpid()}"):
        TrajectoryWriter.create(tmp_path / "w", engine.header(), 16)
    assert locked(tmp_path / "w")
    first.close()
    assert not locked(tmp_path / "w") and not locked(tmp_path / "nowhere")
    TrajectoryWriter.create(tmp_path / "w", engine.header(), 16).close()


def test_asking_whether_a_folder_is_locked_disturbs_no_writer(tmp_path):
    (tmp_path / ".lock").touch()
    stop = threading.Event()
    asking = threading.Thread(target=lambda: [locked(tmp_path) for _ in iter(stop.is_set, True)])
    asking.start()
    for _ in range(200):
        FolderLock(tmp_path).acquire().release()
    stop.set()
    asking.join()


def test_two_processes_cannot_write_at_once(tmp_path):
    code = textwrap.dedent("""
        import sys
        from swirlight.store.lock import FolderLock
        with FolderLock(sys.argv[1]):
            print("mine", flush=True)
            sys.stdin.read()
    """)
    holder = subprocess.Popen([sys.executable, "-c", code, str(tmp_path)], text=True,
                              stdin=subprocess.PIPE, stdout=subprocess.PIPE)
    assert holder.stdout.readline() == "mine\n"
    with pytest.raises(InputError, match=f"process {holder.pid} on"):
        FolderLock(tmp_path).acquire()
    holder.kill()
    holder.communicate()
    FolderLock(tmp_path).acquire().release()


def test_disk_full_is_a_plain_error_and_keeps_what_was_kept(tmp_path):
    """A limit on the size of a file, as a full disk, at each stage in a process of its own."""
    engine.run(tmp_path / "ok/w", tmp_path / "ok/x.h5")
    whole = (tmp_path / "ok/x.h5").read_bytes()
    code = textwrap.dedent("""
        import resource, sys
        from swirlight.errors import RunError
        from tests.store import engine
        resource.setrlimit(resource.RLIMIT_FSIZE, (int(sys.argv[3]), resource.RLIM_INFINITY))
        try:
            engine.run(sys.argv[1], sys.argv[2])
        except RunError as error:
            print(error)
            sys.exit(1)
    """)
    messages = []
    for limit in (1000, 30_000, len(whole) - 4000):
        work, final = tmp_path / str(limit) / "w", tmp_path / str(limit) / "x.h5"
        done = subprocess.run([sys.executable, "-c", code, str(work), str(final), str(limit)],
                              cwd=ROOT, capture_output=True, text=True, timeout=60)
        assert done.returncode == 1 and done.stderr == ""  # no traceback, no crash at exit
        messages.append(done.stdout)
        assert not final.exists() and not list(tmp_path.rglob("*.tmp"))
        engine.run(work, final)
        assert final.read_bytes() == whole
    assert "File too large; nothing is kept yet. Make room, then resume." in messages[0]
    assert "everything up to step" in messages[-1]


def test_the_disk_fills_during_consolidation(tmp_path, monkeypatch):
    """Every write of the final file fails once; HDF5 never notices, the caller always does."""
    engine.run(tmp_path / "ok", tmp_path / "ok.h5")
    real, left = durable._write_all, [0]

    def scarce(descriptor, data, offset):
        left[0] -= 1
        if left[0] < 0:
            raise OSError(28, "No space left on device")
        real(descriptor, data, offset)

    failures = 0
    for room in range(0, 200, 23):
        work, final = tmp_path / f"{room}", tmp_path / f"{room}.h5"
        engine.run(work, final, stop=139)
        monkeypatch.setattr(durable, "_write_all", scarce)
        left[0] = room
        try:
            engine.run(work, final)
        except RunError as error:
            failures += 1
            assert "No space left on device; everything up to step 1" in str(error)
            assert pickle.loads(pickle.dumps(error)).args == error.args
            assert not final.exists() and not list(tmp_path.rglob("*.tmp"))
        monkeypatch.undo()
        engine.run(work, final)
        assert final.read_bytes() == (tmp_path / "ok.h5").read_bytes()
    assert failures > 3


def test_consolidation_in_little_memory_gives_the_same_bytes(tmp_path, monkeypatch, finished):
    monkeypatch.setattr(writer, "CONSOLIDATION_BYTES", 100)
    engine.run(tmp_path / "w", tmp_path / "x.h5")
    assert (tmp_path / "x.h5").read_bytes() == finished.read_bytes()


def test_consolidation_needs_memory_of_a_block_only(tmp_path):
    """160 MB consolidated in less than 100 MB more than the writer had before."""
    code = textwrap.dedent("""
        import resource, sys
        import numpy as np
        from swirlight.store.layout import Element
        from swirlight.store.writer import TrajectoryWriter
        from tests.store import engine
        n, frames = 6000, 2300
        torque = (Element("torque", "particles", (n, 3), "f4", "kJ mol-1", 1),)
        w = TrajectoryWriter.create(sys.argv[1], engine.header(0, n, elements=torque), 200)
        frame = np.random.default_rng(0).random((n, 3))
        for step in range(frames):
            w.append(step, {"torque": frame})
        before = resource.getrusage(resource.RUSAGE_SELF).ru_maxrss
        w.finish(sys.argv[2])
        print((resource.getrusage(resource.RUSAGE_SELF).ru_maxrss - before) / 1024)
    """)
    done = subprocess.run([sys.executable, "-c", code, str(tmp_path / "w"), str(tmp_path / "x.h5")],
                          cwd=ROOT, capture_output=True, text=True, timeout=120, check=True)
    assert (tmp_path / "x.h5").stat().st_size > 160e6
    (tmp_path / "x.h5").unlink()
    assert float(done.stdout) < 100


def test_json_is_atomic_and_standard(tmp_path):
    write_json(tmp_path / "a.json", {"x": np.float64(1.5), "y": [np.nan, np.arange(2)], 3: "ß"})
    text = (tmp_path / "a.json").read_text(encoding="utf-8")
    assert json.loads(text) == {"x": 1.5, "y": [None, [0, 1]], "3": "ß"} and "ß" in text
    with pytest.raises(TypeError):
        write_json(tmp_path / "a.json", {"x": object()})
    assert (tmp_path / "a.json").read_text(encoding="utf-8") == text
    write_json(tmp_path / "b.json", 1, sync=False)
    assert [p.name for p in sorted(tmp_path.iterdir())] == ["a.json", "b.json"]


def test_a_failed_write_leaves_the_old_file(tmp_path, monkeypatch):
    path = tmp_path / "x"
    write_bytes(path, b"old")
    monkeypatch.setattr(durable.os, "pwrite", lambda *_: (_ for _ in ()).throw(OSError(28, "full")))
    with pytest.raises(OSError, match="full"):
        write_bytes(path, b"new")
    monkeypatch.undo()
    assert path.read_bytes() == b"old" and len(list(tmp_path.iterdir())) == 1


def test_checkpoint_digest_covers_everything(tmp_path):
    write_checkpoint(tmp_path, Checkpoint(1, {"a": 1.0}, 0, {}, {}, ""))
    path = next(tmp_path.glob("*.h5"))
    data = path.read_bytes()
    assert data[-32:] == hashlib.sha256(data[:-32]).digest()
    for position in range(0, len(data), 997):
        changed = bytearray(data)
        changed[position] ^= 16
        path.write_bytes(changed)
        assert read_newest(tmp_path) is None
    path.write_bytes(data[: len(data) // 2])
    assert read_newest(tmp_path) is None
