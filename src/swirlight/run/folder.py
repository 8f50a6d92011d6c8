"""A run folder: which file lies where, and how it is made.

Everything a run needs is copied into its folder, so that it can be resumed after the
originals were edited or lost, and on another machine.
"""

import contextlib
import pathlib

from swirlight import __version__
from swirlight.config import load_config
from swirlight.config.reader import yaml_text
from swirlight.config.values import is_path
from swirlight.errors import InputError
from swirlight.run.stop import StopFile
from swirlight.species.library import library_file
from swirlight.store.durable import PARTIAL, make_folder, write_bytes, write_json
from swirlight.store.lock import FolderLock

# All that there can be before there is a config.
_BEGINNING = {FolderLock.NAME, ".work", "inputs", "starts", f"config.yaml{PARTIAL}"}


class RunFolder:
    """Paths inside a run folder.

    root : the folder; `work` inside it is hidden and goes when the run is complete.
    """

    def __init__(self, root):
        self.root = pathlib.Path(root)
        self.work = self.root / ".work"
        self.config_file = self.root / "config.yaml"
        self.inputs = self.root / "inputs"
        self.starts = self.root / "starts"
        self.equilibrium = self.root / "equilibrium.h5"
        self.continuation = self.root / "continuation.h5"
        self.summary = self.root / "summary.json"
        self.picture = self.root / "response.png"
        self.physics = self.work / "physics.json"
        self.notes = self.work / "warnings.json"
        self.stop = StopFile(self.work / "stop")

    def start(self, index):
        """Start file of start `index`."""
        return self.starts / f"{index:03d}.h5"

    def final(self, name):
        """The finished trajectory `name`; its presence means that it is complete."""
        return self.root / f"{name}.h5"

    def working(self, name):
        """Working folder of trajectory `name` while it is under way."""
        return self.work / name

    def failure(self, name):
        """Where the reason is kept when trajectory `name` cannot be finished."""
        return self.working(name) / "FAILED.json"

    def config(self):
        """The config this folder was made from.

        Raises InputError when this is not a run folder.
        """
        if not self.config_file.is_file():
            raise InputError(f"{self.root}: not a run folder: it has no config.yaml"
                             " (if its launch was interrupted, launch again)")
        return load_config(self.config_file)


@contextlib.contextmanager
def created(config, into=None, notes=()):
    """Make the run folder of a config; a context that holds its lock and yields the RunFolder.

    into : the folder; the config's `output` (relative to the current folder) if not given.
    notes : warnings to keep for the summary.
    Raises InputError when it exists already, naming `resume`, or cannot be made. The config is
    written last: without it, what an interruption left is a beginning to be made again.
    """
    folder = RunFolder(into if into is not None else config.output)
    _refuse_existing(folder)
    lock = FolderLock(folder.root)
    try:
        lock.acquire()
    except OSError as error:
        raise InputError(f"{folder.root}: cannot be made: {error.strerror}; --into names another"
                         " folder") from None
    try:
        _refuse_existing(folder)  # another launch may have been faster
        _fill(folder, config, notes)
        yield folder
    finally:
        lock.release()


def _refuse_existing(folder):
    root = folder.root
    if not root.exists():
        return
    names = {path.name for path in root.iterdir()} if root.is_dir() else {root.name}
    begun = FolderLock.NAME in names and names <= _BEGINNING
    if names and not begun:
        raise InputError(
            f"{root}: exists already; `swirlight resume {root}` goes on with an interrupted run,"
            " --into names another folder"
        )


def _fill(folder, config, notes):
    resolved = config.resolved()
    for path in (folder.inputs, folder.starts, folder.work):
        make_folder(path)
    _copy_inputs(resolved, folder)
    write_json(folder.notes, notes)
    text = yaml_text(resolved)
    head = f"# resolved by swirlight {__version__}: every default written out\n"
    write_bytes(folder.config_file, (head + text).encode())


def _copy_inputs(resolved, folder):
    """Copy species files, envelope tables and a start file; point `resolved` at the copies."""
    for entry in resolved["sample"]["species"]:
        own = is_path(entry["use"])
        entry["use"] = _copy(entry["use"] if own else library_file(entry["use"]), folder)
    for pulse in resolved.get("light") or []:
        if pulse.get("file") is not None:
            pulse["file"] = _copy(pulse["file"], folder)
    if resolved["sample"].get("begin_from") is not None:
        resolved["sample"]["begin_from"] = _copy(resolved["sample"]["begin_from"], folder)


def _copy(source, folder):
    """Copy a file (a path or a packaged one) into the inputs; return the copy's relative path."""
    source = pathlib.Path(source) if isinstance(source, str) else source
    content, name = source.read_bytes(), pathlib.PurePath(source.name)
    target, count = folder.inputs / name, 1
    while target.exists() and target.read_bytes() != content:
        count += 1
        target = folder.inputs / f"{name.stem}-{count}{name.suffix}"
    write_bytes(target, content)
    return str(target.relative_to(folder.root))
