"""What a summary costs, and the errors of its averages."""

import numpy as np

from swirlight.config import load_config
from swirlight.run.folder import RunFolder
from swirlight.run.launch import launch
from swirlight.run.summary import blocking_error, write_summary
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
    assert sorted(t.name for t in opened) == sorted(e.name for e in work.exposures)
    still_open = [t.name for t in opened if t._files._open]
    assert len(still_open) <= 1  # the one that gave the times


def test_blocking_error_of_white_and_of_correlated_noise():
    random, n = np.random.default_rng(4), 2**14
    white = random.standard_normal(n)
    # the largest of 10 levels; the last, of 16 blocks, scatters by 1/sqrt(30) = 18 %: 4 of them
    assert 0.97 / np.sqrt(n) < blocking_error(white) < 1.75 / np.sqrt(n)
    c, slow = 0.9, np.empty(n)
    slow[0] = 0.0
    for k in range(1, n):
        slow[k] = c * slow[k - 1] + np.sqrt(1 - c * c) * white[k]
    true = np.sqrt((1 + c) / (1 - c) / n)  # of an AR(1) process's mean, unit variance
    assert 0.85 * true < blocking_error(slow) < 1.75 * true
    assert np.isnan(blocking_error(white[:15])) and np.isfinite(blocking_error(white[:16]))
