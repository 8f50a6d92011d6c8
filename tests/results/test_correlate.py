"""Correlation functions of whole runs: what is averaged, what is refused, what is said."""

import numpy as np
import pytest

import swirlight as sw
from swirlight.errors import InputError
from swirlight.results import vectors
from swirlight.results.correlate import correlate, correlation_map, helicity_signature
from swirlight.results.job import product_unit
from swirlight.rotation import from_vector, multiply, rotation_matrix, to_body
from tests.results import made


@pytest.fixture(scope="module")
def run(tmp_path_factory):
    """Three starts of noise, two carrier phases."""
    return sw.open_run(made.write_run(tmp_path_factory.mktemp("noise") / "run", made.noise))


def data(name, kind, starts=3, phases=2):
    """(starts, phases, frames, bodies, 3)"""
    return np.array([[made.noise(kind, s, p)[name] for p in range(phases)] for s in range(starts)])


def stationary(a, b, longest):
    """(starts, lags, p, q) by the definition, mean over phases."""
    frames, found = a.shape[2], []
    for lag in range(-longest, longest + 1):
        head = slice(max(0, -lag), frames - max(0, lag))
        tail = slice(max(0, lag), frames - max(0, -lag))
        found.append(np.einsum("srtnp,srtnq->spq", a[:, :, head], b[:, :, tail])
                     / (a.shape[1] * a.shape[3] * (frames - abs(lag))))
    return np.stack(found, axis=1)


def test_all_origins_of_the_dark_runs(run):
    c = sw.correlate(run, "torque", components="all", longest_lag="0.5 ps")
    samples = stationary(*[data("torque", "dark", phases=1)] * 2, 5)
    np.testing.assert_allclose(c.values, samples.mean(axis=0), atol=1e-12)
    np.testing.assert_allclose(c.errors, samples.std(axis=0, ddof=1) / np.sqrt(3), atol=1e-12)
    np.testing.assert_allclose(c.samples, samples, atol=1e-12)
    np.testing.assert_allclose(c.lags, 0.1 * np.arange(-5, 6))
    assert (c.starts, c.unit, c.kinds, c.notes) == (3, "kJ+2 mol-2", "dark", [])
    # 4.303: Student's t of 2 degrees at 97.5 %, from a printed table.
    np.testing.assert_allclose(c.half_width(), 4.303 * c.errors, rtol=1e-3)


def test_components_pick_from_the_matrix(run):
    whole = correlate(run, "torque", "all", 0.5, with_vector="angular_momentum")
    one = correlate(run, "torque", "xy", 0.5, with_vector="angular_momentum")
    np.testing.assert_allclose(one.values, whole.values[:, 0, 1], atol=1e-12)
    assert set(one.unit.split()) == {"kJ", "mol-2", "g", "nm+2", "ps-1"}
    many = correlate(run, "torque", ["xy-yx", "xx+yy+zz"], 0.5, with_vector="angular_momentum")
    both = np.stack([whole.values[:, 0, 1] - whole.values[:, 1, 0],
                     np.einsum("lpp->l", whole.values)], axis=1)
    np.testing.assert_allclose(many.values, both, atol=1e-12)
    # The error of a difference is that of the differences, not of two unrelated numbers.
    difference = whole.samples[..., 0, 1] - whole.samples[..., 1, 0]
    np.testing.assert_allclose(many.errors[:, 0], difference.std(axis=0, ddof=1) / np.sqrt(3),
                               atol=1e-12)


def test_carrier_phases_come_before_starts_and_twins_stay_paired(run):
    plus, minus = (stationary(data("torque", k), data("torque", k), 3) for k in ("plus", "minus"))
    dark = stationary(*[data("torque", "dark", phases=1)] * 2, 3)
    for kinds, samples in (("odd", (plus - minus) / 2), ("even", (plus + minus) / 2 - dark),
                           (["plus", "minus"], (plus + minus) / 2)):
        c = correlate(run, "torque", "xy", 0.3, kinds=kinds)
        np.testing.assert_allclose(c.values, samples[..., 0, 1].mean(axis=0), atol=1e-12)
        np.testing.assert_allclose(c.errors, samples[..., 0, 1].std(axis=0, ddof=1) / np.sqrt(3),
                                   atol=1e-12)
        assert any("Not stationary" in note for note in c.notes)


def test_locked_to_an_instant_and_the_map(run):
    a = data("torque", "plus")
    c = correlate(run, "torque", "xy", locked_to="1.23 ps")
    assert c.origin == pytest.approx(1.2) and "nearest frame, 1.2 ps" in " ".join(c.notes)
    samples = np.einsum("srn,srtn->st", a[:, :, 12, :, 0], a[..., 1]) / 12
    np.testing.assert_allclose(c.values, samples.mean(axis=0), atol=1e-12)
    np.testing.assert_allclose(c.errors, samples.std(axis=0, ddof=1) / np.sqrt(3), atol=1e-12)
    np.testing.assert_allclose(c.lags, 0.1 * (np.arange(31) - 12))
    short = correlate(run, "torque", "xy", "0.4 ps", locked_to=1.2)
    np.testing.assert_allclose(short.values, c.values[8:17])
    found = correlation_map(run, "torque", "xy")
    row = found.values[12]
    np.testing.assert_allclose(row[np.isfinite(row)], c.values, atol=1e-12)
    assert found.values.shape == (31, 61) and np.isnan(found.values[0, :30]).all()
    np.testing.assert_allclose(found.origins, 0.1 * np.arange(31))


def test_locked_means_are_those_of_each_instant(run):
    a = data("torque", "plus")
    c = correlate(run, "torque", "xx", locked_to=1.0, subtract_mean=True, normalised=True)
    centre = a[..., 0].mean(axis=(0, 1, 3))
    about = a[..., 0] - centre[:, None]
    square = (about**2).mean(axis=(0, 1, 3))
    plain = (about[:, :, [10]] * about).mean(axis=(0, 1, 3)) / np.sqrt(square[10] * square)
    np.testing.assert_allclose(c.values, plain, atol=1e-12)
    assert c.values[10] == pytest.approx(1.0) and c.errors[10] < 1e-12 and c.unit is None


def test_a_map_of_many_frames_is_thinned(tmp_path, monkeypatch):
    folder = made.write_run(tmp_path / "run", made.noise, starts=2, phases=1)
    monkeypatch.setattr("swirlight.results.correlate.MAP_ORIGINS", 10)
    found = correlation_map(folder, "torque", "xx")
    locked = correlate(folder, "torque", "xx", locked_to=0.8)
    np.testing.assert_allclose(found.origins, 0.4 * np.arange(8))
    np.testing.assert_allclose(found.values[2, 5:13], locked.values[::4], atol=1e-12)


def test_blocks_of_bodies_make_no_difference(run, monkeypatch):
    for of in ("torque", "axis_y", "total_torque"):
        before = correlate(run, of, "all", 0.5)
        with monkeypatch.context() as patch:
            patch.setattr(vectors, "BLOCK", 1)
            after = correlate(run, of, "all", 0.5)
        np.testing.assert_allclose(after.values, before.values, atol=1e-12)


def test_totals_and_sums_over_bodies(run):
    dipole = data("total_dipole", "dark", phases=1)[:, :, :, None]
    np.testing.assert_allclose(correlate(run, "total_dipole", "all", 0.5).values,
                               stationary(dipole, dipole, 5).mean(axis=0), atol=1e-12)
    total = data("torque", "dark", phases=1).sum(axis=3, keepdims=True)
    np.testing.assert_allclose(correlate(run, "total_torque", "all", 0.5).values,
                               stationary(total, total, 5).mean(axis=0), atol=1e-11)


def turning(kind, start, phase):
    """Bodies that turn about z, counter-clockwise in plus, each with its own phase.

    L is fixed in the body and across z, so it turns along with the axes.
    """
    rate = {"plus": 1.5, "minus": -1.5, "dark": 0.0}[kind]
    times = made.INTERVAL * np.arange(31)
    angle = rate * times[:, None] + 2 * np.pi * np.arange(6) / 6 + 0.1 * start
    turn = np.stack([0 * angle, 0 * angle, angle], axis=-1)
    tilt = from_vector(np.array([0.0, np.pi / 2, 0.0]))  # body z to laboratory x
    q = np.array([[multiply(from_vector(v), tilt) for v in row] for row in turn])
    spin = rotation_matrix(q) @ np.array([0.3, 0.0, 2.0])
    return {"orientation": q, "angular_momentum": spin}


@pytest.fixture(scope="module")
def swirl(tmp_path_factory):
    return made.write_run(tmp_path_factory.mktemp("turning") / "run", turning)


def test_signature_of_turning_bodies_has_the_right_sign(swirl):
    c = correlate(swirl, "axis_z", "xy", 1.0, kinds="plus")
    np.testing.assert_allclose(c.values, 0.5 * np.sin(1.5 * c.lags), atol=1e-7)
    for locked in (None, "1 ps"):
        found = helicity_signature(swirl, longest_lag=1.0, kinds="odd", locked_to=locked)
        for pair, size in (("axis-axis", 1.0), ("axis-L", 2.0), ("L-L", 4.0)):
            one = found[pair]
            np.testing.assert_allclose(one.values, size * np.sin(1.5 * one.lags), atol=1e-6)
            assert (one.errors < 1e-6).all() and one.starts == 3
    dark = helicity_signature(swirl, longest_lag=1.0)["axis-axis"]
    assert abs(dark.values).max() < 1e-7


def test_signature_about_another_beam(tmp_path):
    """The same bodies, the beam along −z: everything changes sign."""
    folder = made.write_run(tmp_path / "run", turning, starts=2, phases=1, beam=(0.0, 0.0, -1.0))
    one = helicity_signature(folder, longest_lag=1.0, kinds="plus")["axis-L"]
    np.testing.assert_allclose(one.values, -2.0 * np.sin(1.5 * one.lags), atol=1e-6)
    assert one.components == "xy-yx about the beam"


def test_body_frame_takes_the_rotation_out(swirl, run):
    c = correlate(swirl, "angular_momentum", "all", 1.0, frame="body", kinds="plus")
    fixed = np.array([0.3, 0.0, 2.0])
    np.testing.assert_allclose(c.values, np.broadcast_to(np.outer(fixed, fixed), c.values.shape),
                               atol=1e-6)
    noisy = correlate(run, "torque", "xz", 0.5, frame="body")
    seen = to_body(data("orientation", "dark", phases=1), data("torque", "dark", phases=1))
    np.testing.assert_allclose(noisy.values, stationary(seen, seen, 5)[..., 0, 2].mean(axis=0),
                               atol=1e-12)
    assert "seen from the body" in noisy.title


def test_species_are_told_apart(tmp_path):
    folder = made.write_run(tmp_path / "run", made.noise, starts=2, phases=1,
                            inertia=(made.GENERAL, made.LINEAR, made.ATOM))
    a = data("torque", "dark", 2, 1)[..., 2:4, :]
    one = correlate(folder, "torque", "all", 0.5, species="species-1")
    np.testing.assert_allclose(one.values, stationary(a, a, 5).mean(axis=0), atol=1e-12)
    assert "All species together" in correlate(folder, "torque", "xy").notes[0]
    assert correlate(folder, "axis_x", "xy", species="species-0").starts == 2
    for message, options in (
        ("species-1 is linear: its axis_x carries no physics; take axis_z",
         {"of": "axis_x", "species": "species-1"}),
        ("species-2 is an atom: its axes carry no physics", {"of": "axis_z"}),
        ("species-1 is linear: its axis_y carries no physics", {"of": "axis_y"}),
        ("species-1 is linear: its axis_x carries no physics", {"of": "total_axis_x"}),
        ("x and y of its body frame carry no physics",
         {"of": "torque", "frame": "body", "species": "species-1"}),
        ("no species 'water' in the sample; there are species-0, species-1",
         {"of": "torque", "species": "water"}),
        ("belongs to the whole box", {"of": "total_dipole", "species": "species-1"}),
    ):
        with pytest.raises(InputError, match=message):
            correlate(folder, **options)
    assert correlate(folder, "torque", "zz", frame="body", species="species-1").starts == 2


@pytest.mark.parametrize(("message", "options"), [
    ("no 'spin'; there are angular_momentum, torque", {"of": "spin"}),
    ("temperature is no vector", {"of": "temperature"}),
    ("is a quaternion; correlate axis_x", {"of": "orientation"}),
    ("never changes", {"of": "axis_z", "frame": "body"}),
    ("has no body frame", {"of": "total_dipole", "frame": "body"}),
    ("expected lab or body", {"of": "torque", "frame": "box"}),
    ("one belongs to each body", {"of": "torque", "with_vector": "total_dipole"}),
    ("expected two of x, y, z", {"of": "torque", "components": "xw"}),
    ("cancel", {"of": "torque", "components": "xy-xy"}),
    ("the record is 3 ps long", {"of": "torque", "longest_lag": "4 ps"}),
    ("recorded from 0 to 3 ps", {"of": "torque", "locked_to": "9 ps"}),
    ("kind light: the run has plus, minus, dark", {"of": "torque", "kinds": "light"}),
    ("for example \"120 fs\"", {"of": "torque", "longest_lag": "1 nm"}),
])
def test_what_cannot_be_is_refused(run, message, options):
    with pytest.raises(InputError, match=message):
        correlate(run, **options)


def test_locked_data_of_one_start_are_refused_with_the_count(tmp_path):
    folder = made.write_run(tmp_path / "run", made.noise, starts=1, phases=1)
    for options in ({"locked_to": "1 ps"}, {"kinds": "plus"}):
        with pytest.raises(InputError, match="must be 2 at least; at 95 % .* 2.4 with 8"):
            correlate(folder, "torque", **options)


def test_probes_make_dark_runs_unfit_for_one_start(tmp_path):
    folder = made.write_config(tmp_path / "run", 1, 1, "same")
    for kind in ("plus", "minus", "dark"):
        made.write_trajectory(folder / f"{kind}-000.h5", made.noise(kind, 0, 0), lit=True)
    with pytest.raises(InputError, match="dark, which are not stationary"):
        correlate(folder, "torque")


def test_one_start_takes_its_errors_from_blocks(tmp_path):
    folder = made.write_config(tmp_path / "run", text=made.PLAIN)
    random = np.random.default_rng(8)
    torque = random.normal(size=(3200, 6, 3))
    made.write_trajectory(folder / "dark-000.h5", {"torque": torque}, lit=False)
    c = sw.correlate(folder, "torque", "xy", longest_lag="40 ps")
    np.testing.assert_allclose(c.values[400], (torque[..., 0] * torque[..., 1]).mean(), atol=1e-12)
    # White noise: 1/√(3200 · 6), with 32 blocks known to 13 %; the larger of two estimates.
    assert 0.9 < c.errors[380:421].mean() * np.sqrt(3200 * 6) < 1.35
    assert c.starts == 1 and c.samples is None and "blocks" in c.notes[0]
    with_all = sw.correlate(folder, "torque", "xy", longest_lag="310 ps")
    assert np.isfinite(with_all.values).all() and np.isnan(with_all.errors[-1])
    assert any("No error where" in note for note in with_all.notes)


def test_starts_that_are_not_complete_do_not_count(tmp_path):
    folder = made.write_run(tmp_path / "run", made.noise)
    (folder / "minus-001-p1.h5").unlink()
    c = correlate(folder, "torque", "xx", 0.2)
    samples = stationary(*[data("torque", "dark", phases=1)[[0, 2]]] * 2, 2)[..., 0, 0]
    np.testing.assert_allclose(c.values, samples.mean(axis=0), atol=1e-12)
    assert c.starts == 2 and c.notes == ["2 of 3 starts are complete and count."]
    for start in (0, 2):
        (folder / f"plus-00{start}.h5").unlink()
    with pytest.raises(InputError, match="no start is complete yet, of 3"):
        correlate(folder, "torque")


def test_results_as_labelled_arrays(run):
    xarray = pytest.importorskip("xarray")
    c = correlate(run, "torque", "all", 0.5).to_xarray()
    assert isinstance(c, xarray.Dataset) and c.value.dims == ("lag", "first", "second")
    assert c.value.units == "kJ+2 mol-2" and c.lag.units == "ps" and c.starts == 3
    assert c.error.sel(first="x", second="y").shape == (11,)
    some = correlate(run, "torque", ["xy", "xx"], 0.5).to_xarray()
    assert list(some.components.values) == ["xy", "xx"]
    assert correlation_map(run, "torque").to_xarray().value.dims == ("origin", "lag")


def test_units_multiply():
    assert product_unit("kJ mol-1", "kJ mol-1") == "kJ+2 mol-2"
    assert product_unit("C m", None) == "C m"
    assert product_unit("nm ps-1", "ps nm-1") is None
    assert product_unit(None, None) is None
