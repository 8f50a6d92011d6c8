"""A run folder: which file lies where, and how it is made.

Everything a run needs is copied into its folder, so that it can be resumed after the
originals were edited or lost, and on another machine.
"""

import pathlib

from swirlight import __version__
from swirlight.config import load_config
from swirlight.config.reader import yaml_text
from swirlight.config.values import is_path
from swirlight.errors import InputError
from swirlight.run.stop import StopFile
from swirlight.species.library import library_file
from swirlight.store.durable import make_folder, write_bytes


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
            raise InputError(f"{self.root}: not a run folder: it has no config.yaml")
        return load_config(self.config_file)


def create(config, into=None):
    """Make the run folder of a config.

    into : the folder; the config's `output` (relative to the current folder) if not given.
    Raises InputError when it exists already, naming `resume`.
    """
    root = pathlib.Path(into if into is not None else config.output)
    if root.exists() and (not root.is_dir() or any(root.iterdir())):
        raise InputError(
            f"{root}: exists already; `swirlight resume {root}` goes on with an interrupted run,"
            " --into names another folder"
        )
    folder = RunFolder(root)
    resolved = config.resolved()
    try:
        for path in (folder.inputs, folder.starts, folder.work):
            make_folder(path)
    except OSError as error:
        raise InputError(f"{root}: cannot be made: {error.strerror}; --into names another folder"
                         ) from None
    _copy_inputs(config, resolved, folder)
    text = yaml_text(resolved)
    head = f"# resolved by swirlight {__version__}: every default written out\n"
    write_bytes(folder.config_file, (head + text).encode())
    return folder


def _copy_inputs(config, resolved, folder):
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
