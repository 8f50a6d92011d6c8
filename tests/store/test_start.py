"""Start files: every bit back, and what is wrong with one is said."""

from types import SimpleNamespace

import h5py
import numpy as np
import pytest

from swirlight.errors import InputError
from swirlight.store.start import load_state, save_state, species_of
from swirlight.store.verify import verify
from tests.store import engine

SYSTEM = SimpleNamespace(species=[SimpleNamespace(name=n) for n in engine.SPECIES],
                         species_of=engine.SPECIES_OF, bodies=7)


@pytest.fixture
def path(tmp_path):
    save_state(tmp_path / "000.h5", engine.first_state(), SYSTEM)
    return tmp_path / "000.h5"


def test_every_bit_comes_back_and_the_noise_goes_on(path):
    state, found = engine.first_state(), load_state(path, SYSTEM)
    for name in state.ARRAYS:
        np.testing.assert_array_equal(getattr(found, name), getattr(state, name))
    assert found.step == 100
    np.testing.assert_array_equal(found.random.normal(size=5), state.random.normal(size=5))


def test_layout_units_and_species(path):
    with h5py.File(path) as file:
        state = file["state"]
        assert set(state) == {"position", "orientation", "velocity", "angular_momentum", "box",
                              "species", "step", "generator"}
        assert all(state[n].dtype == np.float64 for n in state
                   if n not in ("species", "step", "generator"))
        assert state["angular_momentum"].attrs["unit"] == b"g mol-1 nm+2 ps-1"
        assert list(species_of(state)[[0, -1]]) == ["leaning top (invented)", "argon"]
    assert verify(path) == []


def test_same_state_same_bytes(path, tmp_path):
    save_state(tmp_path / "b.h5", engine.first_state(), SYSTEM)
    assert path.read_bytes() == (tmp_path / "b.h5").read_bytes()


def test_other_bodies_are_refused(path):
    with pytest.raises(InputError, match="holds 7 bodies, the sample 8"):
        load_state(path, SimpleNamespace(bodies=8))
    other = SimpleNamespace(species=SYSTEM.species, species_of=np.zeros(7, int), bodies=7)
    with pytest.raises(InputError, match="holds 5 leaning top .*, 2 argon; the sample is 7"):
        load_state(path, other)


def test_without_a_system_the_species_are_left_to_the_reader(tmp_path):
    save_state(tmp_path / "a.h5", engine.first_state())
    assert load_state(tmp_path / "a.h5", SYSTEM).step == 100


@pytest.mark.parametrize(("change", "message"), [
    (lambda s: s.pop("velocity"), "/state: without velocity"),
    (lambda s: s["position"].__setitem__((0, 0), np.nan), "/state/position: values that are not"),
    (lambda s: s["orientation"].__setitem__(0, 2.0), "orientation: not unit quaternions"),
    (lambda s: s["box"].__setitem__(0, -1.0), "/state/box: edges must be positive"),
    (lambda s: (s.pop("box"), s.create_dataset("box", data=np.ones(2))), "box: shape"),
    (lambda s: (s.pop("velocity"), s.create_dataset("velocity", data=np.ones((7, 3), "f4"))),
     "velocity: stored as float32"),
    (lambda s: (s.pop("generator"), s.create_dataset("generator", data=b"{}")), "generator"),
    (lambda s: s["generator"].write_direct(np.array(s["generator"][()].replace(b"PCG", b"GCP"))),
     "not the state of a generator"),
    (lambda s: (s.pop("species"), s.create_dataset("species", data=[1])), "species: expected one"),
])
def test_what_is_wrong_is_said(path, change, message):
    with h5py.File(path, "r+") as file:
        change(file["state"])
    with pytest.raises(InputError, match=message) as caught:
        load_state(path)
    assert str(caught.value).startswith(f"{path}:/state")
    assert any(message.lstrip("/") in text for text in verify(path))


def test_what_is_no_start_file(tmp_path, finished):
    with pytest.raises(InputError, match="not a start file"):
        load_state(finished)
    (tmp_path / "x").write_text("nonsense")
    with pytest.raises(InputError, match="cannot be read as a start file"):
        load_state(tmp_path / "x")
    with pytest.raises(InputError, match="cannot be read"):
        load_state(tmp_path / "nowhere")
