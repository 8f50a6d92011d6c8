"""Reading: like NumPy, lazily, and the same from segments, from the final file and in between."""

import json
import pickle
import subprocess
import sys

import h5py
import numpy as np
import pytest

from swirlight.errors import InputError, RunError
from swirlight.rotation import body_axes
from swirlight.store.parts import Parts
from swirlight.store.run import Exposure, open_run
from swirlight.store.trajectory import Trajectory
from tests.store import engine

KEYS = [
    np.s_[0], np.s_[-1], np.s_[2:9], np.s_[::3], np.s_[::-1], np.s_[8:1:-3], np.s_[...], np.s_[:0],
    np.s_[5:2], np.s_[:, 3], np.s_[:, -2:], np.s_[1, 2, 0], np.s_[..., 1], np.s_[3:, ..., ::-1],
    np.s_[[1, 5, 3]], np.s_[:, [6, 0]], np.s_[[0, -1], [2, 3]], np.s_[2, :, [0, 2]], np.s_[[]],
    np.s_[:, np.arange(7) > 3], np.s_[None, 2], np.s_[100:200], np.s_[np.int64(4), 1:2],
    np.s_[1, [0, 2], :], np.s_[:, np.array([[0, 1], [2, 3]])], np.s_[4:1000:2, 0:7:2],
]


@pytest.mark.parametrize("key", KEYS, ids=str)
@pytest.mark.parametrize("which", ["plus", "minus"])
def test_indexing_is_that_of_numpy(under_way, which, key):
    series = open_run(under_way)[which, 0].position
    whole = np.asarray(series)
    found = series[key]
    assert found.shape == whole[key].shape and found.dtype == whole.dtype
    np.testing.assert_array_equal(found, whole[key])


@pytest.mark.parametrize("key", [99, (0, 7), (0, 0, 0, 0), ([12],), 1.5, (slice(None), [True])])
def test_indices_outside_are_refused(under_way, key):
    with pytest.raises(IndexError):
        open_run(under_way)["minus", 0].position[key]


def test_segments_and_final_file_are_seen_alike(under_way, recorded):
    run = open_run(under_way)
    final, sealed = run["plus", 0], run["minus", 0]
    assert final.complete and not sealed.complete
    assert final.names == sealed.names == tuple(sorted(final.names, key=final.names.index))
    assert len(sealed.path.parts) and sealed.path.name == "minus-000"
    for name in final.names:
        a, b = final[name], sealed[name]
        assert (a.unit, a.attributes, a.dimensions) == (b.unit, b.attributes, b.dimensions)
        rows = len(b)
        assert 0 < rows < len(a)
        assert b.steps[-1] == 132 or b.steps[-1] + (b.steps[1] - b.steps[0]) > 132
        np.testing.assert_array_equal(a[:rows], b)
        np.testing.assert_array_equal(a.times[:rows], b.times)
        expected = np.array([frame for _, frame in recorded[name]]).astype(a.dtype)
        np.testing.assert_array_equal(a, expected)


def test_a_trajectory_finished_while_it_is_read(under_way):
    trajectory = open_run(under_way)["minus", 0]
    series = trajectory.torque
    before = series[...]
    engine.run(under_way / ".work/minus-000", under_way / "minus-000.h5")
    trajectory.close()  # nothing open any more: the segments are gone for good
    assert not (under_way / ".work/minus-000").exists()
    np.testing.assert_array_equal(series, before)
    run = open_run(under_way)
    assert run["minus", 0].complete
    np.testing.assert_array_equal(trajectory.position[0], run["plus", 0].position[0])


def test_names_attributes_and_messages(under_way):
    run = open_run(under_way)
    t = run["plus", 0]
    np.testing.assert_array_equal(t.light_amplitude, t["light/amplitude"])
    assert t.torque.unit == "kJ mol-1" and t.torque.attributes == {"frame": "laboratory"}
    assert t.temperature.attributes["per"] == "box" and t.orientation.unit is None
    assert t.torque.dimensions == ("time", "body", "component")
    np.testing.assert_array_equal(t.box, engine.BOX)
    assert t.species_names == tuple(engine.SPECIES) and t.mass.shape == (7,)
    np.testing.assert_array_equal(t.species, engine.SPECIES_OF)
    assert t.config_text == run.config_text == "title: ångström\n"
    assert t.parameters["species"]["argon"]["labels"] == ["Ar"] and t.parameters["seed"] == 41
    with pytest.raises(KeyError, match="has no 'velocity'; it has image"):
        t["velocity"]
    with pytest.raises(AttributeError, match="has no 'velocity'"):
        t.velocity  # noqa: B018
    with pytest.raises(KeyError, match="has no dark-003; it has plus-000, minus-000"):
        run["dark", 3]
    assert "axis_z" in dir(t) and "torque" in repr(t) and "plus-000" in repr(run)


def test_a_run_lists_and_iterates(under_way):
    run = open_run(under_way)
    (under_way / "plus-000-p1.h5").write_bytes((under_way / "plus-000.h5").read_bytes())
    assert [e.name for e in run.exposures] == ["plus-000", "plus-000-p1", "minus-000"]
    assert [t.name for t in run] == ["plus-000", "plus-000-p1", "minus-000"] and len(run) == 3
    assert ("plus", 0, 1) in run and ("plus", 1) not in run
    assert run["plus", 0, 1].name == "plus-000-p1"
    assert Exposure.named("dark-1234") == Exposure("dark", 1234)
    assert run.summary is None
    (under_way / "summary.json").write_text(json.dumps({"seed": 41}))
    assert run.summary == {"seed": 41}
    with pytest.raises(InputError, match="equilibrium.h5: not there"):
        run.equilibrium  # noqa: B018
    (under_way / "equilibrium.h5").write_bytes((under_way / "plus-000.h5").read_bytes())
    assert run.equilibrium.temperature.unit == "K"


def test_what_is_no_run_is_refused(tmp_path):
    with pytest.raises(InputError, match="not a run folder"):
        open_run(tmp_path / "nowhere")
    with pytest.raises(InputError, match="no config.yaml and no trajectory"):
        open_run(tmp_path)
    (tmp_path / "x.h5").write_bytes(b"nonsense")
    with pytest.raises(InputError, match="x.h5: cannot be read as a trajectory"):
        Trajectory(tmp_path / "x.h5")
    h5py.File(tmp_path / "y.h5", "w").close()
    with pytest.raises(InputError, match="no /h5md"):
        Trajectory(tmp_path / "y.h5")


def test_only_what_is_asked_for_is_read(under_way, monkeypatch):
    from swirlight.store.parts import Parts
    series = open_run(under_way)["minus", 0].position
    sizes, read = [], Parts.read

    def watched(self, *arguments):
        block = read(self, *arguments)
        sizes.append(block.size)
        return block

    monkeypatch.setattr(Parts, "read", watched)
    series.times, series.shape, repr(series)  # noqa: B018
    assert sizes == []
    series[2:4, 1]
    series[::-1, [3, 5], 0]
    assert sizes == [2 * 3, len(series) * 3]


def test_arithmetic_and_numpy_functions(under_way):
    t = open_run(under_way)["plus", 0]
    a, b = t.position, t.torque
    whole = np.asarray(a)
    assert isinstance(a - a, np.ndarray)
    np.testing.assert_array_equal(2 * a + a, 3 * whole)
    np.testing.assert_allclose(np.mean(a, axis=0), whole.mean(axis=0))
    np.testing.assert_allclose(np.linalg.norm(b, axis=-1), np.linalg.norm(b[...], axis=-1))
    assert np.asarray(a, dtype=float).dtype == np.float64
    assert (a.ndim, a.size, a.nbytes, len(a)) == (3, whole.size, whole.nbytes, len(whole))


def test_wrapped_positions_and_images_make_the_track_again(under_way, recorded):
    t = open_run(under_way)["plus", 0]
    track = np.array([i * engine.BOX + p for (_, p), (_, i) in
                      zip(recorded["position"], recorded["image"], strict=True)])
    assert np.ptp(track, axis=0).max() > engine.BOX.max()
    found = t.position_unwrapped
    assert found.unit == "nm" and found.dtype == np.float64
    np.testing.assert_allclose(found, track, atol=2e-7 * engine.BOX.max())  # float32 rounding
    np.testing.assert_array_equal(found[2:5, 1, ::2], found[...][2:5, 1, ::2])


def test_axes_follow_from_the_orientation(under_way):
    """lab = q body q*, by products of quaternions written out; scalar first."""
    def product(a, b):
        (w, x), (v, y) = (a[0], a[1:]), (b[0], b[1:])
        return np.array([w * v - x @ y, *(w * y + v * x + np.cross(x, y))])

    t = open_run(under_way)["plus", 0]
    for k, name in enumerate(("axis_x", "axis_y", "axis_z")):
        unit = np.zeros(4)
        unit[k + 1] = 1.0
        for frame, body in ((0, 0), (4, 6), (10, 2)):
            q = t.orientation[frame, body].astype(float)
            turned = product(product(q, unit), q * [1, -1, -1, -1])[1:]
            np.testing.assert_allclose(t[name][frame, body], turned, atol=1e-6)
    assert t.axis_z.attributes["frame"] == "laboratory" and t.axis_z.shape == (11, 7, 3)
    turn = body_axes(np.array([0.8, 0.0, 0.0, 0.6]))
    np.testing.assert_allclose(turn @ turn.T, np.eye(3), atol=1e-15)
    np.testing.assert_allclose(turn[0], [0.28, 0.96, 0.0], atol=1e-15)  # x turned towards y


def test_handles_do_not_travel(under_way):
    series = open_run(under_way)["minus", 0].torque
    there = pickle.loads(pickle.dumps(series))
    np.testing.assert_array_equal(there, series)


def test_damage_is_reported_where_it_is(under_way):
    path = under_way / "plus-000.h5"
    with h5py.File(path, "r") as file:
        place = file["particles/bodies/torque/value"].id.get_chunk_info(0).byte_offset
    data = bytearray(path.read_bytes())
    data[place] ^= 1
    path.write_bytes(data)
    with pytest.raises(RunError, match="plus-000.h5:/particles/bodies/torque/value: damaged:"
                                       " frames 0 to 5"):
        open_run(under_way)["plus", 0].torque[...]


def test_xarray(under_way):
    xarray = pytest.importorskip("xarray")
    t = open_run(under_way)["minus", 0]
    a = t.torque.to_xarray()
    assert isinstance(a, xarray.DataArray) and a.dims == ("time", "body", "component")
    assert a.attrs == {"units": "kJ mol-1", "frame": "laboratory"} and a.name == "torque"
    np.testing.assert_array_equal(a.time, t.torque.times)
    assert a.time.attrs["units"] == "ps"
    np.testing.assert_array_equal(a.sel(component="y").isel(body=[5, 1]), t.torque[:, [5, 1], 1])
    np.testing.assert_array_equal(a.isel(time=slice(None, None, -1), body=2), t.torque[::-1, 2])
    amplitude = t["light/amplitude"].to_xarray()
    assert amplitude.dims == ("time", "component", "part")
    np.testing.assert_array_equal(amplitude.sel(part="imaginary"), t.light_amplitude[..., 1])
    assert t.orientation.to_xarray().dims == ("time", "body", "quaternion")
    np.testing.assert_array_equal(t.axis_x.to_xarray()[3], t.axis_x[3])


def test_a_trajectory_as_a_dataset_is_read_when_it_is_used(under_way, monkeypatch):
    pytest.importorskip("xarray")
    read, parts = [], Parts.read

    def count(self, frames, rest=()):
        block = parts(self, frames, rest)
        read.append((self.dataset, block.size))
        return block

    monkeypatch.setattr(Parts, "read", count)
    t = open_run(under_way)["minus", 0]
    whole = t.to_xarray()
    part = whole.torque.sel(component="z").isel(body=slice(0, 2), time_2=slice(1, 3))
    later = (whole.torque.chunk(body=3) ** 2).sum("body")
    assert read == [] and "torque" in repr(whole)
    np.testing.assert_array_equal(part, t.torque[1:3, :2, 2])
    assert read[0] == ("particles/bodies/torque/value", 4)
    np.testing.assert_allclose(later, (t.torque[...] ** 2).sum(axis=1), rtol=1e-12)
    # Three clocks; those of the position, which the orientation shares, come first.
    assert whole.position.dims == whole.orientation.dims[:2] + ("component",)
    assert whole.position.dims[0] == "time" and whole.torque.dims[0] == "time_2"
    assert whole.temperature.dims == ("time_3",) == whole.light_amplitude.dims[:1]
    np.testing.assert_array_equal(whole.time_2, t.torque.times)
    np.testing.assert_array_equal(whole.step_3, t.temperature.steps)
    assert whole.axis_z.dims == ("time", "body", "component")
    assert list(whole.species.values[[0, -1]]) == ["leaning top (invented)", "argon"]
    assert whole.torque.units == "kJ mol-1" and whole.attrs["complete"] == "false"


def test_reading_needs_neither_numba_nor_matplotlib():
    code = ("import sys, swirlight.store.run, swirlight.store.verify, swirlight.store.convert,"
            "swirlight.store.writer; print({'numba', 'matplotlib', 'xarray', 'pint', 'dask'}"
            " & set(sys.modules))")
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    assert done.stdout == "set()\n"


def test_derived_axes_have_the_type_they_announce(finished):
    axis = Trajectory(finished).axis_z
    assert axis[:2].dtype == axis.dtype
