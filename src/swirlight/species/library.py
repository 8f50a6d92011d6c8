"""Finding a species: by its name in the library, or by the path of a species file."""

import difflib
import pathlib
from importlib import resources

from swirlight.config.reader import printable, read_text, read_yaml
from swirlight.config.values import is_path
from swirlight.errors import InputError
from swirlight.species.file import read_species


def library_names():
    """The names of the library, sorted."""
    folder = resources.files("swirlight.species") / "library"
    names = [entry.name for entry in folder.iterdir()]
    return tuple(sorted(name.removesuffix(".yaml") for name in names if name.endswith(".yaml")))


def load_species(name_or_path, folder=None):
    """The `Species` of a library name or of a species file.

    name_or_path : a name without slash or suffix, or a path that has one.
    folder : what a relative path starts from; left out: the current folder.
    Raises InputError for a name that the library lacks or a file that cannot be read,
    ConfigError for what is in the file.
    """
    text = str(name_or_path)
    if isinstance(name_or_path, pathlib.Path) or is_path(text):
        return read_species(read_yaml(pathlib.Path(folder or ".") / text))
    names = library_names()
    if text not in names:
        near = difflib.get_close_matches(text.lower(), names, n=1)
        hint = f' (did you mean "{near[0]}"?)' if near else ""
        raise InputError(f'no species "{printable(text, 60)}" in the library{hint}; it has'
                         f" {', '.join(names)}; a species file is given by its path, ending in"
                         " .yaml")
    file = library_file(text)
    return read_species(read_text(file.read_text(encoding="utf-8"), str(file)))


def library_file(name):
    """The packaged file of a library species, as something with `read_bytes` and `name`."""
    return resources.files("swirlight.species") / "library" / f"{name}.yaml"
