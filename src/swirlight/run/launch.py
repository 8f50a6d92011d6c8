"""Launch and resume: equilibrate, collect starts, expose, summarise.

    equilibrium    the unlit stages, one after the other            -> equilibrium.h5
    continuation   on by `spacing` for each further start           -> starts/, continuation.h5
    exposures      every kind, start and carrier phase, side by side -> plus-000.h5 ...

Every part is a file that is there when the part is complete, so resuming is launching again
in a folder that holds some of them.
"""

import os
import time
from functools import partial

import numpy as np

from swirlight.config import physical_differences, physical_part
from swirlight.errors import InputError, RunError, StopRequested
from swirlight.run import progress as displays
from swirlight.run.executor import side_by_side
from swirlight.run.folder import RunFolder, create
from swirlight.run.plan import check_config
from swirlight.run.rates import record_rate, workload
from swirlight.run.stop import Signals
from swirlight.run.summary import write_summary
from swirlight.run.work import Work, expose, note_failure
from swirlight.store.durable import remove_folder, write_json
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
    folder = create(config, into)
    write_json(folder.work / "warnings.json", [[w.code, w.text] for w in warnings])
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
    begun = read_json(folder.work / "physics.json")
    if begun is not None and (different := physical_differences(begun, physical_part(own))):
        raise InputError(f"{folder.config_file}: was changed after the run began; put it back, or"
                         " launch it as a run of its own:\n" + "\n".join(different))
    if folder.summary.is_file() and not folder.work.is_dir():
        display.say(f"{path}: nothing to do, the run is complete")
        return open_run(folder.root)
    return _carry_out(folder, display, threads, resumed=True)


def _carry_out(folder, display, threads, resumed=False):
    cores = min(threads or _cores(), _cores())
    with FolderLock(folder.root):
        folder.stop.clear()
        with Signals(folder.stop):
            try:
                _Conductor(folder, display, cores, resumed).run()
            finally:
                display.leave()
    return open_run(folder.root)


def _cores():
    return len(os.sched_getaffinity(0)) if hasattr(os, "sched_getaffinity") else os.cpu_count()


class _Conductor:
    """The order of things in one launch or resume."""

    def __init__(self, folder, display, cores, resumed):
        self.folder, self.display, self.cores = folder, display, cores
        self.work = Work(folder)
        self.timings = {}
        path = folder.work / "physics.json"
        if not path.is_file():
            write_json(path, physical_part(self.work.config))
        if resumed:
            self._say_where()

    def run(self):
        """Do what is left, then summarise and tidy up."""
        import numba

        numba.set_num_threads(max(1, min(self.cores, numba.config.NUMBA_NUM_THREADS)))
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
            try:
                trajectory.travel(begin, self.folder.stop, self._show)
            except RunError as error:
                note_failure(self.folder, trajectory.workdir.name, error)
                raise
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
            expose, [(str(self.folder.root), e.name) for e in todo], self.cores,
            self.folder.stop, self._take, self._tick,
            here=partial(expose, report=lambda facts: self._tick()),
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

    def _take(self, record):
        if isinstance(record, StopRequested):
            self._stopped = max(self._stopped or record, record, key=lambda stop: stop.step)
        elif isinstance(record, Exception):
            self._failed.append(("?", f"{type(record).__name__}: {record}"))
        elif record["failed"]:
            self._failed.append((record["name"], record["failed"]))
        elif record["pace"]:
            self._paces.append(record["pace"])
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


