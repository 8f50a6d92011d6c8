"""Responses of made-up runs, in which every number is known."""

from dataclasses import replace

import numpy as np
import pytest
from scipy import stats

from swirlight.errors import InputError
from swirlight.results.observables import OBSERVABLES
from swirlight.results.response import respond, response
from swirlight.results.trajectories import Experiment
from swirlight.store.run import open_run
from swirlight.units import HBAR
from tests.results.made import write_run

FRAMES, BODIES = 31, 6
BEAM = np.array([0.0, 0.0, 1.0])


def spins(odd=2.0, even=0.5, noise=0.1, phases=0.0, dipole=0.0):
    """make(kind, start, phase): total angular momentum [u nm²/ps] whose noise twins share and which
    carrier phases shift by ± phases."""

    def make(kind, start, phase):
        shared = np.random.default_rng(start).normal(size=(FRAMES, 3)) * noise
        own = np.random.default_rng([start, "plus minus dark".split().index(kind)])
        lit = kind != "dark"
        sign = {"plus": 1.0, "minus": -1.0, "dark": 0.0}[kind]
        spin = (shared + 0.01 * noise * own.normal(size=(FRAMES, 3))
                + (sign * odd + lit * even + lit * (-1) ** phase * phases) * BEAM)
        torque = np.ones((FRAMES, BODIES, 3)) * (1 + sign) + np.arange(BODIES)[:, None]
        return {"total_angular_momentum": spin * BODIES * HBAR,
                "total_dipole": np.full((FRAMES, 3), 1e-29) * (1 + dipole * sign),
                "temperature": 300.0 + shared[:, 0],
                "torque": torque}

    return make


@pytest.fixture(scope="module")
def run(tmp_path_factory):
    folder = write_run(tmp_path_factory.mktemp("made") / "a", spins(phases=3.0), starts=8)
    return open_run(folder)


def test_parts_are_those_put_in_per_body_after_the_mean_over_phases(run):
    """The noise of twins is 0.001 a frame: 6 standard errors of 8 starts."""
    found = response(run, "angular_momentum")
    assert found.odd.shape == found.even.shape == (FRAMES, 3) and found.unit == "hbar"
    assert found.starts == 8 and found.beam.tolist() == [0, 0, 1]
    np.testing.assert_allclose(found.odd, np.outer(np.ones(FRAMES), 2 * BEAM), atol=0.0022)
    np.testing.assert_allclose(found.even, np.outer(np.ones(FRAMES), 0.5 * BEAM), atol=0.0036)
    np.testing.assert_array_equal(found.along.odd, found.odd @ BEAM)
    np.testing.assert_allclose(found.times, np.arange(FRAMES) * 0.1)
    reference = stats.ttest_1samp(found.along.of_starts("odd")[:, 7], 0.0)
    figures = found.figures("odd", time=0.7)
    assert figures["p"] == pytest.approx(reference.pvalue)
    assert figures["at"] == {"value": pytest.approx(0.7), "unit": "ps"}
    low, high = reference.confidence_interval(0.95)
    assert figures["half_width_95"] == pytest.approx(0.5 * (high - low))
    assert found.half_width()[7, 2] == pytest.approx(0.5 * (high - low))


def test_significance_gain_and_planning(run):
    found = response(run, "total_angular_momentum")  # the name in the files
    odd = found.significance["odd"]
    assert odd.peak_p == odd.smallest_p == 1 / 128 and odd.integrated_p < 1e-12
    assert odd.integrated == pytest.approx(2.0, abs=0.001) and found.starts_needed() <= 3
    # shared noise 1, own 0.01 twice: (1 + 1)/(2 · 0.01²), within the scatter of 8 starts
    assert 3e3 < np.median(found.gain) < 3e4 and found.parted is None
    assert found.phase_gain == pytest.approx(1.0)  # phases shift plus and minus alike
    peak = found.peak()
    assert peak.interval[0] < peak.value < peak.interval[1] and peak.value > 2.0


def test_observables_of_bodies_scalars_and_polarisation(run):
    torque = response(run, "torque")
    np.testing.assert_allclose(torque.plus, 2.0 + 2.5)
    np.testing.assert_allclose(torque.odd, 1.0)
    temperature = response(run, "temperature")
    assert temperature.along is temperature and temperature.odd.shape == (FRAMES,)
    assert "no response: the twins are identical" in temperature.notes
    polarisation = response(run, "polarisation")
    np.testing.assert_allclose(polarisation.plus, 1e-29 / 1e-27)  # a box of 1 nm³
    assert any("ordinary linear response" in note for note in polarisation.notes)


def test_dataset_is_labelled(run):
    xarray = pytest.importorskip("xarray")
    data = response(run, "angular_momentum").to_xarray()
    assert isinstance(data, xarray.Dataset) and data.odd.dims == ("time", "component")
    assert data.odd.units == "hbar" and data.time.units == "ps" and data.starts == 8
    np.testing.assert_allclose(data.odd.sel(component="z"), data.odd_along)


def test_few_starts_are_said_and_have_no_interval(tmp_path):
    found = response(open_run(write_run(tmp_path / "a", spins(), starts=3)), "angular_momentum")
    assert np.isnan(found.peak().interval).all()
    assert found.significance["odd"].smallest_p == 0.25
    assert any("3 starts" in note and "takes 8" in note for note in found.notes)
    assert any("cannot be below 0.25" in note for note in found.notes)


def test_one_start_has_values_and_no_errors(tmp_path):
    found = response(open_run(write_run(tmp_path / "a", spins(), starts=1)), "angular_momentum")
    assert found.along.odd == pytest.approx(2.0, abs=0.005)
    figures = found.figures()
    assert np.isnan([figures["error"], figures["p"], figures["peak"]["p"]]).all()
    assert np.isnan(found.gain).all() and found.phase_gain is None
    assert figures["starts_needed"] > 1000


def test_starts_count_only_when_all_their_twins_are_there(tmp_path):
    folder = write_run(tmp_path / "a", spins(), starts=4)
    (folder / "minus-001-p1.h5").unlink()
    (folder / "dark-002.h5").unlink()
    experiment = Experiment(open_run(folder))
    assert experiment.complete == (0, 3) and experiment.phases == {"plus": 2, "minus": 2, "dark": 1}
    found = respond(experiment, "angular_momentum")
    assert found.starts == 2 and "2 of 4 starts are complete and count" in found.notes


def test_refusals_say_why(run, tmp_path):
    with pytest.raises(InputError, match="no observable 'spin'.*angular_momentum"):
        response(run, "spin")
    with pytest.raises(InputError, match="light_torque was not recorded"):
        response(run, "light_torque")
    folder = write_run(tmp_path / "a", spins(), starts=1)
    (folder / "minus-000.h5").unlink()
    with pytest.raises(InputError, match="no start is complete"):
        response(folder, "angular_momentum")


def test_null_p_values_are_uniform(run, table):
    """Plus and minus that differ by noise alone, 16 starts, strongly correlated times; the p of
    the peak by Kolmogorov-Smirnov, which fails once in 1000 seeds."""
    found, random = [], np.random.default_rng(12)
    one = response(run, "angular_momentum").along
    for _ in range(200):
        plus, minus = random.normal(size=(2, 16, FRAMES)).cumsum(axis=2)
        null = replace(one, plus=plus, minus=minus, dark=None)
        found.append(null.significance["odd"].peak_p)
    p = stats.kstest(found, "uniform").pvalue
    table("p of peaks where there is nothing, KS", f"p = {p:.2g}", "> 0.001")
    assert p > 0.001


def test_every_observable_names_itself():
    assert all(name == o.name and o.label for name, o in OBSERVABLES.items())
