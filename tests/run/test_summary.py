"""What a summary costs."""

from swirlight.config import load_config
from swirlight.run.folder import RunFolder
from swirlight.run.launch import launch
from swirlight.run.summary import write_summary
from swirlight.run.work import Work
from swirlight.store.trajectory import Trajectory
from tests.run.small import write_config


def test_each_trajectory_is_looked_through_once_and_left_closed(tmp_path, monkeypatch):
    """Runs of hundreds of starts: a handful of openings each would take minutes, and handles."""
    folder = tmp_path / "a"
    launch(load_config(write_config(tmp_path)), into=folder, progress=False, threads=1)
    work, opened, plain = Work(RunFolder(folder)), [], Trajectory.__init__

    def counted(self, final, workdir=None):
        plain(self, final, workdir)
        opened.append(self)

    monkeypatch.setattr(Trajectory, "__init__", counted)
    write_summary(work, {})
    names = [t.name for t in opened]
    assert set(names) == {e.name for e in work.exposures}
    assert len(names) <= len(work.exposures) + 3  # one of each kind tells whether it saw a carrier
    still_open = [t.name for t in opened if t._files._open]
    assert len(still_open) <= 1  # the one that gave the times
