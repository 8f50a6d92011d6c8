"""What goes wrong around a run: folders half made or half lost, two at once, a failing exposure."""

import shutil

import numpy as np
import pytest

from swirlight.config import load_config
from swirlight.errors import InputError, RunError, StopRequested
from swirlight.run.launch import launch, resume
from swirlight.run.status import read_status
from swirlight.run.trajectory import Trajectory
from swirlight.run.work import Work
from swirlight.store.lock import FolderLock
from tests.run.small import CONFIG, fingerprints, write_config


def config_of(folder, old="", new=""):
    return load_config(write_config(folder, CONFIG.replace(old, new)))


@pytest.fixture(scope="module")
def config(tmp_path_factory):
    return config_of(tmp_path_factory.mktemp("config"))


@pytest.fixture(scope="module")
def expected(config, tmp_path_factory):
    folder = tmp_path_factory.mktemp("runs") / "a"
    launch(config, into=folder, progress=False, threads=1)
    return fingerprints(folder)


def failing_exposure(monkeypatch, failing, error):
    plain = Work.exposure

    def exposure(self, name):
        if name == failing:
            raise error
        return plain(self, name)

    monkeypatch.setattr(Work, "exposure", exposure)


def test_a_folder_whose_launch_died_before_there_was_a_config_is_made_again(config, expected,
                                                                            tmp_path):
    folder = tmp_path / "a"
    FolderLock(folder).acquire().release()
    (folder / "inputs").mkdir()
    (folder / "inputs" / "nitrogen.yaml").write_text("cut sho")
    with pytest.raises(InputError, match="launch again"):
        resume(folder, progress=False)
    launch(config, into=folder, progress=False, threads=1)
    assert fingerprints(folder).keys() == expected.keys()


@pytest.mark.parametrize("names", [["notes.txt"], ["inputs"], [".lock", "notes.txt"]])
def test_a_folder_of_somebody_else_is_refused(config, tmp_path, names):
    for name in names:
        (tmp_path / name).touch()
    with pytest.raises(InputError, match="exists already"):
        launch(config, into=tmp_path, progress=False)
    assert sorted(path.name for path in tmp_path.iterdir()) == sorted(names)


def test_of_two_launches_at_once_the_second_writes_nothing(config, tmp_path):
    with FolderLock(tmp_path), pytest.raises(InputError, match="another process is writing"):
        launch(config, into=tmp_path, progress=False)
    assert [path.name for path in tmp_path.iterdir()] == [".lock"]


def test_a_folder_used_again_forgets_the_run_before(config, tmp_path):
    """In one process, one after the other: nothing of the first may be remembered."""
    folder = tmp_path / "a"
    launch(config, into=folder, progress=False, threads=1)
    shutil.rmtree(folder)
    dimmer = config_of(tmp_path, "1e13", "1e12")
    run = launch(dimmer, into=folder, progress=False, threads=1)
    intensity = run["plus", 0].parameters["light"]["0"]["intensity"]
    assert float(np.asarray(intensity)) == pytest.approx(1e12)


def test_a_failing_exposure_is_named_and_the_others_finish(config, expected, tmp_path,
                                                            monkeypatch):
    folder = tmp_path / "a"
    with monkeypatch.context() as patch:
        failing_exposure(patch, "minus-000", ValueError("no such thing"))
        with pytest.raises(RunError, match="minus-000: ValueError: no such thing"):
            launch(config, into=folder, progress=False, threads=1)
    status = read_status(folder)
    assert status["failed"] == {"minus-000": "ValueError: no such thing"}
    assert status["complete"] == 5
    resume(folder, progress=False, threads=1)
    assert read_status(folder)["failed"] == {}
    assert fingerprints(folder) == expected


def test_a_failure_is_forgotten_when_the_trajectory_is_tried_again(config, tmp_path,
                                                                   monkeypatch):
    folder = tmp_path / "a"
    with monkeypatch.context() as patch:
        failing_exposure(patch, "minus-000", RunError("blew up"))
        with pytest.raises(RunError):
            launch(config, into=folder, progress=False, threads=1)

    def stopped(self, *_):
        raise StopRequested(1, 15)

    monkeypatch.setattr(Trajectory, "travel", stopped)
    with pytest.raises(StopRequested):
        resume(folder, progress=False, threads=1)
    assert read_status(folder)["failed"] == {}


@pytest.mark.parametrize("after", ["equilibrium", "continuation"])
def test_a_lost_working_folder_costs_time_alone(config, expected, tmp_path, monkeypatch, after):
    folder, plain = tmp_path / "a", Trajectory.travel

    def travel(self, *arguments):
        state = plain(self, *arguments)
        if self.final.stem == after:
            raise StopRequested(state.step, 15)
        return state

    with monkeypatch.context() as patch:
        patch.setattr(Trajectory, "travel", travel)
        with pytest.raises(StopRequested):
            launch(config, into=folder, progress=False, threads=1)
    shutil.rmtree(folder / ".work")
    resume(folder, progress=False, threads=1)
    assert fingerprints(folder) == expected


def test_a_lost_trajectory_is_made_again(config, expected, tmp_path):
    folder = tmp_path / "a"
    launch(config, into=folder, progress=False, threads=1)
    (folder / "minus-001.h5").unlink()
    assert read_status(folder)["state"] == "interrupted"
    resume(folder, progress=False, threads=1)
    assert fingerprints(folder) == expected


def test_a_run_that_died_while_tidying_up_keeps_its_summary(config, tmp_path):
    folder = tmp_path / "a"
    launch(config, into=folder, progress=False, threads=1)
    before = (folder / "summary.json").read_bytes()
    (folder / ".work" / "plus-000").mkdir(parents=True)
    resume(folder, progress=False)
    assert (folder / "summary.json").read_bytes() == before
    assert not (folder / ".work").exists()


def test_a_full_disk_says_how_to_go_on(config, tmp_path, monkeypatch):
    folder = tmp_path / "a"

    def full(path, *_, **__):
        raise OSError(28, "No space left on device", str(path))

    with monkeypatch.context() as patch:
        patch.setattr("swirlight.run.work.save_state", full)
        patch.setattr("swirlight.run.trajectory.write_json", full)  # progress is no result
        with pytest.raises(RunError, match="No space left.*swirlight resume"):
            launch(config, into=folder, progress=False, threads=1)
    assert "No space left" in read_status(folder)["failed"]["equilibrium"]
    resume(folder, progress=False, threads=1)


def test_the_caller_keeps_its_threads(config, tmp_path):
    import numba

    before = numba.get_num_threads()
    launch(config, into=tmp_path / "a", progress=False, threads=1)
    assert numba.get_num_threads() == before


def test_checkpoints_by_the_clock_bound_what_a_kill_costs_and_change_no_byte(config, expected,
                                                                             tmp_path,
                                                                             monkeypatch):
    """Saved at every step; then each trajectory is left once, right after a checkpoint."""
    folder, plain, left = tmp_path / "a", Trajectory._checkpoint, set()

    class Killed(BaseException):
        pass

    def checkpoint(self, state, index, step, mover):
        plain(self, state, index, step, mover)
        if step == 17 and self.final.stem not in left:
            left.add(self.final.stem)
            raise Killed

    monkeypatch.setattr(Trajectory, "_checkpoint", checkpoint)
    monkeypatch.setattr("swirlight.run.trajectory.SAVE_EVERY", 0.0)
    with pytest.raises(Killed):
        launch(config, into=folder, progress=False, threads=1)
    for _ in range(7):
        with pytest.raises(Killed):
            resume(folder, progress=False, threads=1)
    resume(folder, progress=False, threads=1)
    assert left == {"equilibrium", "continuation"} | {n[:-3] for n in expected if "-" in n}
    assert fingerprints(folder) == expected
