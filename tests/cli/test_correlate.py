"""`swirlight correlate` on made-up runs: table, JSON, pictures, refusals."""

import json

import pytest

from swirlight.cli.main import run as command
from tests.results import made


@pytest.fixture(scope="module")
def folder(tmp_path_factory):
    return made.write_run(tmp_path_factory.mktemp("noise") / "run", made.noise)


def test_table_and_picture(folder, capsys):
    assert command(["correlate", str(folder), "--of", "torque", "--components", "xx,xy-yx",
                    "--longest-lag", "0.5 ps"]) == 0
    out, error = capsys.readouterr()
    lines = out.splitlines()
    assert lines[0] == "torque: torque, dark, 3 starts" and "kJ+2 mol-2" in lines[1]
    assert lines[2].split() == ["lag", "/", "ps", "xx", "±", "xy-yx", "±"]
    assert len(lines) == 3 + 11 and lines[3].split()[0] == "-0.5"
    picture = folder / "correlation-torque-xx,xy-yx-dark.png"
    assert str(picture) in error and picture.read_bytes()[:4] == b"\x89PNG"


def test_a_long_table_is_thinned_about_lag_zero(folder, capsys, monkeypatch):
    monkeypatch.setattr("swirlight.cli.correlate.ROWS", 8)
    assert command(["correlate", str(folder), "--of", "torque", "--locked-to", "1 ps"]) == 0
    *rows, last = capsys.readouterr()[0].splitlines()[3:]
    assert [row.split()[0] for row in rows] == ["-0.8", "-0.4", "0", "0.4", "0.8", "1.2", "1.6",
                                                "2"]
    assert last == "one of 4 lags; --json has all"


def test_json_of_locked_data_and_the_map(folder, tmp_path, capsys):
    assert command(["correlate", str(folder), "--of", "axis_z,angular_momentum", "--locked-to",
                    "1 ps", "--kind", "odd", "--components", "xy-yx", "--json", "--picture",
                    str(tmp_path / "c.png")]) == 0
    out, error = capsys.readouterr()
    (found,) = json.loads(out)
    assert found["locked_to"] == {"value": 1.0, "unit": "ps"} and found["starts"] == 3
    assert len(found["lags"]["value"]) == len(found["components"]["xy-yx"]["value"]) == 31
    assert found["unit"] == "g mol-1 nm+2 ps-1" and found["kinds"] == "odd"
    for name in ("c.png", "c-map.png"):
        assert (tmp_path / name).read_bytes()[:4] == b"\x89PNG" and name in error


def test_numbers_that_are_not_are_null(tmp_path, capsys):
    folder = made.write_config(tmp_path / "run", text=made.PLAIN)
    made.write_trajectory(folder / "dark-000.h5", made.noise("dark", 0, 0), lit=False)
    assert command(["correlate", str(folder), "--of", "torque", "--json"]) == 0
    (found,) = json.loads(capsys.readouterr()[0])
    assert set(found["components"]["xy"]["half_width_95"]) == {None}


def test_signature(folder, capsys):
    assert command(["correlate", str(folder), "--signature", "--kind", "odd",
                    "--longest-lag", "0.2 ps"]) == 0
    out, _ = capsys.readouterr()
    assert [line.split(":")[0] for line in out.splitlines() if "3 starts" in line] == [
        "axis-axis", "axis-L", "L-L"]
    assert (folder / "correlation-signature-odd.png").is_file()


@pytest.mark.parametrize(("options", "message"), [
    (["--of", "axis_q"], "no 'axis_q'; there are"),
    ([], "expected either --of"),
    (["--of", "torque", "--signature"], "expected either --of"),
    (["--of", "torque", "--picture", "nowhere/c.png"], "there is no folder nowhere"),
    (["--of", "torque", "--picture", "c.txt"], "ends in .png"),
    (["--of", "torque", "--frame", "box"], "'box' is not one of"),
])
def test_refusals_leave_nothing(folder, options, message, capsys):
    before = sorted(folder.iterdir())
    assert command(["correlate", str(folder), *options]) == 2
    out, error = capsys.readouterr()
    assert message in error and out == "" and sorted(folder.iterdir()) == before
