"""Leaving for other tools, checked by reading back what was written with plain means."""

import json

import numpy as np
import pytest

from swirlight.cli.convert import Format
from swirlight.cli.convert import convert as command
from swirlight.errors import InputError
from swirlight.store import convert as module
from swirlight.store.convert import convert
from swirlight.store.layout import Element
from swirlight.store.run import open_run
from swirlight.store.trajectory import Trajectory
from tests.store import engine


@pytest.fixture(params=[16e6, 1])
def blocks(request, monkeypatch):
    monkeypatch.setattr(module, "BLOCK_BYTES", request.param)


def test_xyz_places_every_site(finished, tmp_path, blocks):
    (path,) = convert(finished, "xyz", into=tmp_path)
    t = Trajectory(finished)
    lines = path.read_text(encoding="utf-8").splitlines()
    sites = 5 * 3 + 2
    assert path.name == "plus-000.xyz" and len(lines) == len(t.position) * (sites + 2)
    for frame in (0, 4, 10):
        block = lines[frame * (sites + 2):][: sites + 2]
        assert block[0] == "17"
        box = "20.000000 25.000000 30.000000"
        assert block[1] == f"plus-000 time {frame * 0.008:.6f} ps box {box} A"
        rows = [line.split() for line in block[2:]]
        assert [r[0] for r in rows] == ["A", "B", "C"] * 5 + ["Ar"] * 2
        found = np.array([[float(x) for x in r[1:]] for r in rows])
        expected = []
        for body, kind in enumerate(engine.SPECIES_OF):
            for site in list(engine.SPECIES.values())[kind][1]:
                axes = [t[name][frame, body] for name in ("axis_x", "axis_y", "axis_z")]
                expected.append(t.position[frame, body] + sum(s * a for s, a in zip(
                    site, axes, strict=True)))
        np.testing.assert_allclose(found, 10 * np.array(expected), atol=2e-5)


def test_csv_has_totals_and_vectors(finished, tmp_path, blocks):
    paths = {p.name: p for p in convert(finished, "csv", into=tmp_path)}
    assert set(paths) == {"plus-000-totals.csv", "plus-000-position.csv", "plus-000-image.csv",
                          "plus-000-orientation.csv", "plus-000-torque.csv"}
    t = Trajectory(finished)
    head = paths["plus-000-totals.csv"].read_text().splitlines()[0].split(",")
    table = np.loadtxt(paths["plus-000-totals.csv"], delimiter=",", skiprows=1)
    np.testing.assert_allclose(table[:, 0], t.temperature.times, rtol=1e-11)
    np.testing.assert_array_equal(table[:, head.index("temperature [K]")], t.temperature)
    np.testing.assert_array_equal(table[:, head.index("light/amplitude_y_im [V m-1]")],
                                  t.light_amplitude[:, 1, 1])
    text = paths["plus-000-torque.csv"].read_text().splitlines()
    assert text[0] == ("time [ps],body,torque_x [kJ mol-1],torque_y [kJ mol-1],"
                       "torque_z [kJ mol-1]")
    table = np.loadtxt(text[1:], delimiter=",").reshape(len(t.torque), 7, 5)
    np.testing.assert_array_equal(table[..., 2:], t.torque)
    np.testing.assert_array_equal(table[3, :, 1], range(7))
    np.testing.assert_allclose(table[:, 0, 0], t.torque.times, rtol=1e-11)
    numbers = np.loadtxt(paths["plus-000-position.csv"], delimiter=",", skiprows=1)[:, 2:]
    np.testing.assert_array_equal(numbers.astype("f4").reshape(t.position.shape), t.position)


def test_npz_holds_every_array(finished, tmp_path, blocks):
    (path,) = convert(finished, "npz", into=tmp_path)
    t = Trajectory(finished)
    with np.load(path, allow_pickle=False) as found:
        for name in t.names:
            key = name.replace("/", "_")
            np.testing.assert_array_equal(found[key], t[name])
            assert found[key].dtype == t[name].dtype
            np.testing.assert_array_equal(found[f"{key}_time"], t[name].times)
        assert json.loads(str(found["units"]))["torque"] == "kJ mol-1"
        assert list(found["species"][[0, -1]]) == list(engine.SPECIES)
    first = path.read_bytes()
    path.unlink()
    convert(finished, "npz", into=tmp_path)
    assert path.read_bytes() == first


def test_only_some(finished, tmp_path):
    paths = convert(finished, "csv", into=tmp_path, only=["axis_z", "temperature"])
    assert [p.name for p in paths] == ["plus-000-axis_z.csv", "plus-000-totals.csv"]
    with pytest.raises(InputError, match="velocity not recorded; there are"):
        convert(finished, "npz", into=tmp_path, only=["velocity"])


def test_a_whole_run_also_under_way(under_way, capsys):
    command(under_way, Format.npz, only="torque, temperature")
    assert capsys.readouterr().out.split() == [str(under_way / "npz" / name) for name in
                                               ("plus-000.npz", "minus-000.npz")]
    with np.load(under_way / "npz/minus-000.npz") as found:
        np.testing.assert_array_equal(found["torque"], open_run(under_way)["minus", 0].torque)
        assert "position" not in found


def test_nothing_is_overwritten_and_nothing_half_written(finished, tmp_path):
    (tmp_path / "plus-000-torque.csv").write_text("mine")
    with pytest.raises(InputError, match="plus-000-torque.csv: exists already"):
        convert(finished, "csv", into=tmp_path)
    assert [p.name for p in tmp_path.iterdir()] == ["plus-000-torque.csv"]
    with pytest.raises(InputError, match="known are xyz, csv, npz"):
        convert(finished, "doc", into=tmp_path)


@pytest.mark.parametrize(("kept", "message"), [
    ("temperature", "xyz needs the vector position"),
    ("position", "xyz needs the vector orientation"),
])
def test_xyz_says_what_is_missing(tmp_path, kept, message):
    elements = tuple(e for e in engine.header().elements if e.name == kept)
    engine.run(tmp_path / "w", tmp_path / "x.h5", elements=elements)
    with pytest.raises(InputError, match=message):
        convert(tmp_path / "x.h5", "xyz")
    assert sorted(p.name for p in tmp_path.iterdir()) == ["x.h5"]


def test_atoms_need_no_orientation(tmp_path):
    atoms = engine.header().parameters | {"species": {"argon": engine.describe(
        *engine.SPECIES["argon"])}}
    position = (Element("position", "particles", (7, 3), "f4", "nm", 4),)
    engine.run(tmp_path / "w", tmp_path / "x.h5", elements=position, parameters=atoms,
               species=np.zeros(7, int), species_names=("argon",))
    (path,) = convert(tmp_path / "x.h5", "xyz")
    assert path.parent.name == "xyz" and path.read_text().count("\nAr ") == 7 * 11
