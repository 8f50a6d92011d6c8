"""Launch and resume: equilibrate, collect starts, expose, summarise.

    equilibrium    the unlit stages, one after the other            -> equilibrium.h5
    continuation   on by `spacing` for each further start           -> starts/, continuation.h5
    exposures      every kind, start and carrier phase, side by side -> plus-000.h5 ...

Every part is a file that is there when the part is complete, so resuming is launching again
in a folder that holds some of them.
"""

import contextlib
import os
import time

import numpy as np

from swirlight import __version__
from swirlight.config import config_hash, physical_differences, physical_part
from swirlight.errors import InputError, RunError, StopRequested
from swirlight.run import progress as displays
from swirlight.run.executor import side_by_side
from swirlight.run.folder import RunFolder, created
from swirlight.run.plan import check_config
from swirlight.run.rates import record_rate, workload
from swirlight.run.stop import Signals
from swirlight.run.summary import write_summary
from swirlight.run.work import (
    Work,
    expose,
    expose_in_worker,
    note_failure,
    noting_failure,
    reason_of,
)
from swirlight.store.durable import make_folder, remove_folder, write_json
from swirlight.store.lock import FolderLock
from swirlight.store.run import open_run, read_json
from swirlight.store.start import load_state


def launch(config, into=None, progress=True, threads=None):
    """Run a config to its end.

    config : of `load_config`.
    into : the run folder; the config's `output` if not given. It must not exist yet.
    progress : show it on stderr.
    threads : cores to use at most; all there are if not given.
    Returns the Run. Raises InputError before anything is written, RunError when a trajectory
    cannot be finished (the others are), StopRequested after a signal, with everything saved.
    """
    warnings = check_config(config).warnings
    with created(config, into, [[w.code, w.text] for w in warnings]) as folder:
        display = displays.choose(progress)
        for warning in warnings:
            display.say(f"warning: {warning.text}")
        return _carry_out(folder, display, threads)


def resume(path, progress=True, threads=None, config=None):
    """Go on with an interrupted run.

    path : the run folder. config : the one meant to be run, if it is at hand: refused, key by
        key, when its physics differs from the folder's.
    Returns the Run. Raises as `launch`.
    """
    folder, display = RunFolder(path), displays.choose(progress)
    own = folder.config()
    if config is not None and (different := physical_differences(own, config)):
        raise InputError(f"{path}: was begun with other physics:\n" + "\n".join(different))
    with FolderLock(folder.root):
        _hold_against_beginning(folder, own, display)
        return _carry_out(folder, display, threads, resumed=True)


def _hold_against_beginning(folder, config, display):
    """Refuse a config edited since the run began; warn of another version of the program."""
    begun = read_json(folder.physics)
    if begun is not None:
        different = physical_differences(begun["physics"], physical_part(config))
        if begun["version"] != __version__:
            display.say(f"warning: begun with swirlight {begun['version']}, resumed with"
                        f" {__version__}: the bits may differ from those of one version")
    else:  # complete before: only the hash is left
        summary = read_json(folder.summary) or {}
        changed = summary.get("config_hash") not in (None, config_hash(config))
        different = ["what differs is no longer known"] * changed
    if different:
        raise InputError(f"{folder.config_file}: was changed after the run began; put it back,"
                         " or launch it as a run of its own:\n" + "\n".join(different))


def _carry_out(folder, display, threads, resumed=False):
    """Do what is left in a folder whose lock is held."""
    cores = max(1, min(threads or _cores(), _cores()))
    try:
        make_folder(folder.work)
        folder.stop.clear()
        with Signals(folder.stop):
            _Conductor(folder, display, cores, resumed).run()
    except OSError as error:
        place = f"{error.filename}: " if error.filename else ""
        raise RunError(f"{place}{error.strerror or error}; what is finished is kept:"
                       f" `swirlight resume {folder.root}` goes on") from error
    finally:
        display.leave()
    return open_run(folder.root)


def _cores():
    return len(os.sched_getaffinity(0)) if hasattr(os, "sched_getaffinity") else os.cpu_count()


@contextlib.contextmanager
def _threads(cores):
    """Let kernels use that many threads, as far as this process was given them."""
    import numba

    before = numba.get_num_threads()
    numba.set_num_threads(min(cores, numba.config.NUMBA_NUM_THREADS))
    try:
        yield
    finally:
        numba.set_num_threads(before)


class _Conductor:
    """The order of things in one launch or resume."""

    def __init__(self, folder, display, cores, resumed):
        self.folder, self.display, self.cores = folder, display, cores
        self.work = Work(folder)
        self.timings = {}
        self.resumed = resumed
        if not folder.physics.is_file():
            write_json(folder.physics, {"version": __version__,
                                        "physics": physical_part(self.work.config)})

    def run(self):
        """Do what is left, then summarise and tidy up."""
        complete = all(self.folder.final(e.name).is_file() for e in self.work.exposures)
        if complete and self.folder.summary.is_file():
            self.display.say(f"{self.folder.root}: nothing to do, the run is complete")
        else:
            if self.resumed:
                self._say_where()
            with _threads(self.cores):
                self._timed("equilibrate", self._prepare)
                self._timed("expose", self._expose)
            self._timed("summarise", lambda: write_summary(self.work, self.timings))
        remove_folder(self.folder.work)

    def _timed(self, name, action):
        began = time.monotonic()
        action()
        self.timings[name] = time.monotonic() - began

    def _prepare(self):
        for name, trajectory, begin in self.work.preparations():
            self.display.phase(name, trajectory.steps)
            with noting_failure(self.folder, trajectory.workdir.name):
                trajectory.travel(begin, self.folder.stop, self._show)
            if trajectory.pace:
                self._remember_pace(trajectory.pace, self.cores)
            self.display.finish()

    def _show(self, facts):
        self.display.update(facts["step"], temperature=facts["temperature"],
                            residual=facts["residual"], what=facts["stage"])

    def _expose(self):
        todo = [e for e in self.work.exposures if not self.folder.final(e.name).is_file()]
        if not todo:
            return
        steps = self.work.exposure_steps
        self.display.phase(f"expose ({len(todo)} trajectories)", steps * len(todo))
        self._left, self._failed, self._stopped, self._paces = todo, [], None, []
        side_by_side(
            expose_in_worker, [(str(self.folder.root), e.name) for e in todo], self.cores,
            self.folder.stop, self._take, self._tick,
            here=lambda root, name: expose(self.work, name, report=lambda facts: self._tick()),
        )
        if self._stopped is not None:
            raise self._stopped
        if self._paces:
            self._remember_pace(float(np.median(self._paces)), self.cores if len(todo) == 1 else 1)
        if self._failed:
            raise RunError("\n".join(
                [f"{len(self._failed)} of {len(todo)} trajectories could not be finished:"]
                + [f"  {name}: {reason}" for name, reason in self._failed]
                + [f"the others are complete in {self.folder.root}; `swirlight resume` tries again"]
            ))
        self.display.finish()

    def _take(self, task, found):
        _, name = task
        if isinstance(found, StopRequested):
            self._stopped = max(self._stopped or found, found, key=lambda stop: stop.step)
        elif isinstance(found, Exception):
            self._failed.append((name, reason_of(found)))
            if not self.folder.failure(name).is_file():  # the worker died before it could tell
                note_failure(self.folder, name, found)
        elif found:
            self._paces.append(found)
        self._tick()

    def _tick(self):
        """Progress of all trajectories together, from the files their workers rewrite."""
        steps, done, facts = self.work.exposure_steps, 0, []
        for exposure in self._left:
            if self.folder.final(exposure.name).is_file():
                done += steps
            else:
                found = read_json(self.folder.working(exposure.name) / "progress.json")
                if found:
                    facts.append(found)
                    done += found["step"]
        latest = facts[-1] if facts else {}
        self.display.update(done, temperature=latest.get("temperature"),
                            residual=latest.get("residual"))

    def _remember_pace(self, pace, threads):
        """For the next estimate of `check`."""
        box = load_state(self.folder.start(0)).box
        record_rate(workload(self.work.system, box, threads), pace)

    def _say_where(self):
        total = len(self.work.exposures)
        there = sum(self.folder.final(e.name).is_file() for e in self.work.exposures)
        self.display.say(f"{self.folder.root}: from {there} of {total} trajectories complete to"
                         f" {total} of {total}")


