"""Where a command draws its picture."""

from swirlight.errors import InputError

ENDINGS = (".png", ".svg", ".pdf")


def picture_path(given, folder=None, name=None):
    """The path asked for, or `name` in `folder`.

    Raises InputError before any work for an ending that cannot be drawn, or no such folder.
    """
    if given is None:
        return folder / name
    if given.suffix not in ENDINGS:
        raise InputError(f"--picture {given}: needs a name that ends in .png, .svg or .pdf")
    if not given.absolute().parent.is_dir():
        raise InputError(f"--picture {given}: there is no folder {given.parent}")
    return given
