"""Checkpoints: everything needed to go on as if nothing had happened.

A checkpoint is one HDF5 file, the last 32 bytes of which are the SHA-256 of the rest
(HDF5 ignores what follows its own end). The newest two are kept, so that one which the
disk has damaged does not end a run.

    /           attributes: step, segments (how many are sealed), layout (fingerprint)
    /state/     as in a start file, when the engine hands over a State
    /payload/   whatever else the engine wants back, nested
    /pending/   frames recorded since the last sealed segment, element by element
"""

import hashlib
import json
import pathlib
from dataclasses import dataclass

import h5py
import numpy as np

from swirlight.state import State
from swirlight.store.durable import remove, write_bytes
from swirlight.store.layout import FORMAT, write_dataset, write_text_attribute
from swirlight.store.start import read_state, write_state

KEPT = 2
DIGEST = hashlib.sha256().digest_size


@dataclass
class Checkpoint:
    """step : the engine's; payload : what it handed over; segments : how many are sealed;
    rows : {element: frames written in all}; pending : {element: frames not yet sealed};
    layout : fingerprint of the header they were made with."""

    step: int
    payload: dict
    segments: int
    rows: dict
    pending: dict
    layout: str


def write_checkpoint(folder, checkpoint):
    """Write durably into `folder`, then drop all but the newest two. Raises OSError."""
    folder = pathlib.Path(folder)
    image = _build(checkpoint)
    path = folder / f"{checkpoint.step:012d}.h5"
    write_bytes(path, image, hashlib.sha256(image).digest())
    for old in _newest_first(folder)[KEPT:]:
        remove(old)


def read_newest(folder):
    """The newest checkpoint whose digest is right, or None if there is none such."""
    for path in _newest_first(pathlib.Path(folder)):
        if digest_is_right(path):
            return read_checkpoint(path)
    return None


def digest_is_right(path):
    """Whether the file is whole, to the last bit."""
    data = path.read_bytes()
    return hashlib.sha256(data[:-DIGEST]).digest() == data[-DIGEST:]


def _newest_first(folder):
    return sorted(folder.glob("*.h5"), reverse=True)


def _build(checkpoint):
    with h5py.File("image", "w", driver="core", backing_store=False, **FORMAT) as file:
        file.attrs["step"] = checkpoint.step
        file.attrs["segments"] = checkpoint.segments
        write_text_attribute(file, "layout", checkpoint.layout)
        _write_payload(file, file.create_group("payload"), checkpoint.payload)
        pending = file.create_group("pending")
        # By number: an element's name may hold a slash.
        for number, (name, frames) in enumerate(checkpoint.pending.items()):
            item = pending.create_dataset(str(number), data=frames)
            write_text_attribute(item, "element", name)
            item.attrs["rows"] = checkpoint.rows[name]
        file.flush()
        return file.id.get_file_image()


def read_checkpoint(path):
    """Read a checkpoint whose digest has been looked at."""
    with h5py.File(path, "r", locking=False) as file:
        rows, pending = {}, {}
        for item in file["pending"].values():
            name = item.attrs["element"].decode()
            rows[name], pending[name] = int(item.attrs["rows"]), item[()]
        return Checkpoint(
            step=int(file.attrs["step"]),
            payload=_read_payload(file, file["payload"], path),
            segments=int(file.attrs["segments"]),
            rows=rows,
            pending=pending,
            layout=file.attrs["layout"].decode(),
        )


def _write_payload(file, group, payload):
    for name, value in payload.items():
        if not isinstance(name, str) or "/" in name or name in ("", "."):
            raise ValueError(f"{name!r} cannot be the name of something in a checkpoint")
        if isinstance(value, State):
            place = file.create_group("state") if "state" not in file else group.create_group(name)
            write_state(place, value)
            group.attrs[name] = place.name
        elif isinstance(value, dict):
            _write_payload(file, group.create_group(name), value)
        elif isinstance(value, np.ndarray):
            group.create_dataset(name, data=value)
        else:  # numbers, texts, None, lists of them: JSON keeps every bit of a float
            write_dataset(group, name, json.dumps(_number(value)))
            group[name].attrs["json"] = True


def _number(value):
    return value.item() if isinstance(value, np.generic) else value


def _read_payload(file, group, path):
    payload = {name: read_state(file[place], path) for name, place in group.attrs.items()}
    for name, item in group.items():
        if name in payload:
            continue
        if isinstance(item, h5py.Group):
            payload[name] = _read_payload(file, item, path)
        else:
            payload[name] = json.loads(item[()]) if "json" in item.attrs else item[()]
    return payload
