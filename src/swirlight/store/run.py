"""A run folder, read: `open_run("runs/a")["plus", 0].angular_momentum`."""

import json
import pathlib
import re
from dataclasses import dataclass

from swirlight.errors import InputError
from swirlight.store.trajectory import Trajectory

WORK = ".work"
KINDS = ("plus", "minus", "dark")
_NAME = re.compile(r"(plus|minus|dark)-(\d{3,})(?:-p(\d+))?")


@dataclass(frozen=True)
class Exposure:
    """One trajectory of a run: kind "plus", "minus" or "dark", start, carrier phase."""

    kind: str
    start: int
    phase: int = 0

    @property
    def name(self):
        """Its name without ending: "plus-000", of a further carrier phase "plus-000-p1"."""
        return f"{self.kind}-{self.start:03d}" + (f"-p{self.phase}" if self.phase else "")

    @classmethod
    def named(cls, name):
        """The exposure of that name, or None."""
        match = _NAME.fullmatch(name)
        return match and cls(match[1], int(match[2]), int(match[3] or 0))


def open_run(path):
    """Open a run folder, finished or under way. Raises InputError if it is none."""
    return Run(path)


class Run:
    """What a run has left so far. Nothing is read before it is used, nothing is locked.

    run["plus", 0] : `Trajectory` of the light as written, first start; run["plus", 0, 1] of
        a further carrier phase; `for trajectory in run` gives them all.
    run.equilibrium : totals of the unlit stages.
    """

    def __init__(self, path):
        self.path = pathlib.Path(path)
        if not self.path.is_dir():
            raise InputError(f"{path}: not a run folder")
        known = [self.path / "config.yaml", self.path / WORK, self.path / "equilibrium.h5"]
        if not any(p.exists() for p in known) and not self.exposures:
            raise InputError(f"{path}: not a run folder (no config.yaml and no trajectory in it)")

    @property
    def exposures(self):
        """`Exposure` of every trajectory of which there is something to read, in order."""
        names = {p.stem for p in self.path.glob("*.h5")}
        names |= {p.parent.parent.name for p in self.path.glob(f"{WORK}/*/segments/*.h5")}
        found = filter(None, map(Exposure.named, names))
        return tuple(sorted(found, key=lambda e: (e.start, KINDS.index(e.kind), e.phase)))

    @property
    def starts(self):
        """Paths of the start files, in order."""
        return tuple(sorted((self.path / "starts").glob("*.h5")))

    def __len__(self):
        return len(self.exposures)

    def __iter__(self):
        for exposure in self.exposures:
            yield self._trajectory(exposure.name)

    def __contains__(self, key):
        return self._there(_exposure(key))

    def __getitem__(self, key):
        """A `Trajectory`; raises KeyError listing what there is."""
        exposure = _exposure(key)
        if not self._there(exposure):
            there = ", ".join(e.name for e in self.exposures) or "no trajectory yet"
            raise KeyError(f"{self.path} has no {exposure.name}; it has {there}")
        return self._trajectory(exposure.name)

    def _there(self, exposure):
        """Whether it can be read; looks for its own files only, as there may be thousands."""
        segments = self.path / WORK / exposure.name / "segments"
        return exposure.kind in KINDS and (
            (self.path / f"{exposure.name}.h5").is_file() or any(segments.glob("*.h5")))

    @property
    def equilibrium(self):
        """`Trajectory` with the totals of the unlit stages. Raises InputError if there are none."""
        return self._trajectory("equilibrium")

    def _trajectory(self, name):
        return Trajectory(self.path / f"{name}.h5", self.path / WORK / name)

    @property
    def summary(self):
        """Content of summary.json, or None as long as there is none."""
        return read_json(self.path / "summary.json")

    @property
    def config_text(self):
        """The config as resolved. Raises InputError if it is missing."""
        try:
            return (self.path / "config.yaml").read_text(encoding="utf-8")
        except FileNotFoundError:
            raise InputError(f"{self.path}: has no config.yaml") from None

    @property
    def config(self):
        """The config as a model, `swirlight.config.load_config` of config.yaml."""
        from swirlight.config import load_config

        return load_config(self.path / "config.yaml")

    def __repr__(self):
        return f"<run {self.path}: {', '.join(e.name for e in self.exposures) or 'nothing yet'}>"


def _exposure(key):
    if isinstance(key, Exposure):
        return key
    if isinstance(key, str):
        return Exposure.named(key) or Exposure(key, 0)
    return Exposure(*key)


def read_json(path):
    """Content of a JSON file, None if there is none. Raises InputError if it is damaged."""
    try:
        return json.loads(path.read_text(encoding="utf-8"))
    except FileNotFoundError:
        return None
    except ValueError as error:
        raise InputError(f"{path}: damaged: {error}") from None
