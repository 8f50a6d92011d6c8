"""A file broken in every way; each finding names the place and the rule."""

import h5py
import numpy as np
import pytest

from swirlight.cli.verify import verify as command
from swirlight.errors import InputError
from swirlight.store.start import save_state
from swirlight.store.verify import verify
from tests.store import engine

BODIES = "particles/bodies"


def test_what_we_write_is_right(finished, under_way):
    assert verify(finished) == []
    save_state_in(under_way)
    assert verify(under_way) == []
    for segment in under_way.rglob("segments/*.h5"):
        assert verify(segment) == []


def save_state_in(folder):
    (folder / "starts").mkdir()
    save_state(folder / "starts/000.h5", engine.first_state())


def replace(group, name, data, **options):
    attributes = dict(group[name].attrs)
    del group[name]
    group.create_dataset(name, data=data, **options).attrs.update(attributes)


def attribute(path, name, value):
    return lambda f: f[path].attrs.__setitem__(name, value)


def without(path, name=None):
    return lambda f: f[path].attrs.__delitem__(name) if name else f.__delitem__(path)


def explicit_time(f):
    group = f[f"{BODIES}/torque"]
    replace(group, "time", np.arange(6.0))
    replace(group, "step", np.arange(6))


def shorter(f):
    f["observables/temperature/value"].resize((3,))


def late(f):
    f["observables/temperature/step"].attrs["offset"] = np.int64(104)


def own_clock(f):
    del f[f"{BODIES}/image/step"]
    f[f"{BODIES}/image/step"] = f[f"{BODIES}/position/step"][()]


def fewer_bodies(f):
    replace(f[BODIES], "mass", np.ones(6))


def no_checksums(f):
    value = f[f"{BODIES}/torque/value"]
    replace(f[f"{BODIES}/torque"], "value", value[()], chunks=value.chunks,
            maxshape=(None, 7, 3))


def not_a_number(f):
    f[f"{BODIES}/torque/value"][3, 2, 1] = np.nan


def not_a_total(f):
    f["observables/temperature/value"][3] = np.inf


def long_quaternion(f):
    f[f"{BODIES}/orientation/value"][1, 1] *= 1.001


def outside(f):
    f[f"{BODIES}/position/value"][2, 2, 2] = 3.1


BREAKS = [
    (without("h5md"), "/h5md: is missing: not an H5MD file"),
    (attribute("h5md", "version", [1, 0]), "/h5md: attribute version must be the integers (1, 1)"),
    (attribute("h5md", "version", "1.1"), "/h5md: attribute version must be the integers (1, 1)"),
    (without("h5md/author"), "/h5md/author: is missing"),
    (without("h5md/author", "name"), "/h5md/author attribute name: is missing"),
    (attribute("h5md/creator", "version", "0.1"),
     "/h5md/creator attribute version: must be a fixed-length string"),
    (without("h5md/modules/units"), "/h5md/modules/units: is missing"),
    (without("h5md/modules/units", "system"), "/h5md/modules/units attribute system: is missing"),
    (without("particles"), "/particles: is missing"),
    (without(f"{BODIES}/box"), f"/{BODIES}: has no box, which H5MD requires"),
    (attribute(f"{BODIES}/box", "dimension", 3.0), "/box: attribute dimension must be an integer"),
    (attribute(f"{BODIES}/box", "boundary", np.array([b"periodic", b"nowhere", b"none"])),
     "/box: attribute boundary must be 3"),
    (without(f"{BODIES}/box/edges"), "/box: has no edges"),
    (lambda f: replace(f[f"{BODIES}/box"], "edges", np.ones(2)), "/box/edges: shape (2,)"),
    (fewer_bodies, f"/{BODIES}: its members disagree about the bodies"),
    (without(f"{BODIES}/species"), f"/{BODIES}: has no species"),
    (without(f"{BODIES}/torque/value"), "/torque: has no dataset value"),
    (without(f"{BODIES}/torque/step"), "/torque: has no dataset step"),
    (without("observables/light/amplitude/time"), "/light/amplitude: has no dataset time"),
    (explicit_time, "/torque/step: must be a positive integer scalar"),
    (attribute("observables/temperature/step", "offset", 0.5),
     "/temperature/step: attribute offset must be an integer"),
    (without("observables/temperature/time", "unit"), "/temperature/time: has no attribute unit"),
    (attribute("observables/temperature/value", "unit", np.bytes_("kelvin/2")),
     "/temperature/value: 'kelvin/2' is no H5MD unit string"),
    (attribute("observables/temperature/value", "unit", "K"),
     "/temperature/value attribute unit: must be a fixed-length string"),
    (own_clock, "/image/step: must be a hard link to /particles/bodies/position/step"),
    (without(f"{BODIES}/position"), "/image: recorded without position"),
    (shorter, "/temperature/value: ends at step 104; others go on to step 140"),
    (late, "/temperature/value: begins at step 104; others at step 100"),
    (no_checksums, "/torque/value: must be chunked and have Fletcher-32 checksums"),
    (not_a_number, "/torque/value frames 0 to 5: values that are not finite"),
    (not_a_total, "/temperature/value frames 0 to 20: values that are not finite"),
    (long_quaternion, "/orientation/value: not unit quaternions: off by 1.0e-03"),
    (outside, "/position/value: positions outside of the box"),
    (without("parameters"), "/parameters/swirlight: is missing"),
    (without("parameters/swirlight/config"), "/parameters/swirlight/config: is missing"),
    (without("parameters/swirlight/species/argon/sites"), "argon/sites: must be positions"),
    (without("parameters/swirlight/species/argon/charge"), "argon/charge: must have one number"),
]


@pytest.mark.parametrize(("damage", "message"), BREAKS, ids=[m for _, m in BREAKS])
def test_every_broken_rule_is_found_and_named(copy, damage, message):
    with h5py.File(copy, "r+") as file:
        damage(file)
    found = verify(copy)
    assert any(message in text for text in found), found
    assert all(text.startswith(f"{copy}:/") for text in found)


def test_a_total_that_the_sample_does_not_have_may_be_nan(copy):
    with h5py.File(copy, "r+") as file:
        file["observables/temperature/value"][...] = np.nan
    assert verify(copy) == []


def test_a_flipped_bit_in_any_chunk_is_found(copy):
    whole, places = copy.read_bytes(), []
    with h5py.File(copy) as file:
        for element in engine.header().elements:
            value = file[f"{element.path}/value"]
            places += [(value.name, value.id.get_chunk_info(i))
                       for i in range(value.id.get_num_chunks())]
    assert len(places) >= 6
    for name, chunk in places:
        data = bytearray(whole)
        data[chunk.byte_offset + chunk.size // 2] ^= 32
        copy.write_bytes(data)
        found = verify(copy)
        assert len(found) == 1 and f"{name} frames 0 to" in found[0] and "damaged" in found[0]


@pytest.mark.parametrize("share", [0.0, 0.01, 0.3, 0.9, 0.999])
def test_a_torn_file_is_found(copy, share):
    data = copy.read_bytes()
    copy.write_bytes(data[: int(len(data) * share)])
    found = verify(copy)
    assert found and found[0].startswith(f"{copy}: cannot be read as HDF5")


def test_a_broken_run_folder(under_way, capsys):
    save_state_in(under_way)
    (under_way / "config.yaml").unlink()
    (under_way / "summary.json").write_text("{")
    checkpoint = next(under_way.glob(".work/minus-000/checkpoints/*.h5"))
    checkpoint.write_bytes(checkpoint.read_bytes()[:-1])
    (under_way / ".work/minus-000/segments/000000.h5").unlink()
    with h5py.File(under_way / "starts/000.h5", "r+") as file:
        del file["state/box"]
    found = "\n".join(verify(under_way))
    for message in ("has no config.yaml", "summary.json: damaged", f"{checkpoint}: damaged",
                    "starts/000.h5:/state: without box", "segments are missing; there are [1]"):
        assert message in found
    with pytest.raises(Exception) as caught:
        command(under_way)
    assert caught.value.exit_code == 1 and "has no config.yaml" in capsys.readouterr().out


def test_a_run_under_way_may_replace_files_while_we_look(under_way, monkeypatch):
    """Every checkpoint goes between the listing and the reading, and so does a segment."""
    from swirlight.store import verify as module

    def vanishes(path, found=module.digest_is_right):
        path.unlink()
        return found(path)

    def cleared(path, found=module._verify_file):
        if path.parent.name == "segments":
            path.unlink()
        return found(path)

    monkeypatch.setattr(module, "digest_is_right", vanishes)
    monkeypatch.setattr(module, "_verify_file", cleared)
    found = [text for text in verify(under_way) if "segments are missing" not in text]
    assert [text for text in found if "config.yaml" not in text] == []


def test_the_command_says_that_all_is_well(finished, capsys):
    command(finished)
    assert capsys.readouterr().out == f"{finished}: every rule holds\n"
    command(finished, as_json=True)
    assert '"problems": []' in capsys.readouterr().out


def test_nothing_to_look_at(tmp_path):
    with pytest.raises(InputError, match="no such file"):
        verify(tmp_path / "nowhere")
    with pytest.raises(InputError, match="no trajectory"):
        verify(tmp_path)
