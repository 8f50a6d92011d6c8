"""The file against the H5MD 1.1 specification, with nothing but h5py and NumPy.

Rules: P. de Buyl, P. H. Colberg and F. Höfling, Comput. Phys. Commun. 185, 1546 (2014), and
the specification's pages for version 1.1 and for version 1.0 of its "units" module.
"""

import h5py
import numpy as np
import pytest

from swirlight.store.layout import Element, Header, build_image, chunk_shape, is_unit
from swirlight.store.writer import TrajectoryWriter
from tests.store import engine


@pytest.fixture
def file(finished):
    with h5py.File(finished, "r") as opened:
        yield opened


def fixed_string(attributes, name):
    kind = attributes.get_id(name).get_type()
    assert kind.get_class() == h5py.h5t.STRING and not kind.is_variable_str()
    return attributes[name].decode()


def test_root_group_h5md(file):
    assert file["h5md"].attrs["version"].dtype.kind == "i"
    assert list(file["h5md"].attrs["version"]) == [1, 1]
    assert fixed_string(file["h5md/author"].attrs, "name") == "nobody in particular"
    assert fixed_string(file["h5md/creator"].attrs, "name") == "swirlight"
    assert fixed_string(file["h5md/creator"].attrs, "version")
    assert list(file["h5md/modules/units"].attrs["version"]) == [1, 0]
    assert fixed_string(file["h5md/modules/units"].attrs, "system") == "SI"


def test_box(file):
    box = file["particles/bodies/box"]
    assert box.attrs["dimension"] == 3 and np.ndim(box.attrs["dimension"]) == 0
    assert [b.decode() for b in box.attrs["boundary"]] == ["periodic"] * 3
    np.testing.assert_array_equal(box["edges"], engine.BOX)
    assert fixed_string(box["edges"].attrs, "unit") == "nm"


def test_species_is_an_enumeration(file):
    species = file["particles/bodies/species"]
    assert h5py.check_enum_dtype(species.dtype) == {"leaning top (invented)": 0, "argon": 1}
    np.testing.assert_array_equal(species, engine.SPECIES_OF)


def test_every_element_in_fixed_form_with_what_was_recorded(file, recorded):
    for e in engine.header().elements:
        group = file[e.path]
        rows = engine.STEPS // e.every + 1
        assert group["value"].shape == (rows, *e.shape) and group["value"].maxshape[0] is None
        assert group["value"].dtype == e.dtype and group["value"].fletcher32
        assert group["step"].shape == () and group["step"].dtype.kind == "i"
        assert group["time"].shape == () and group["time"].dtype == np.float64
        assert fixed_string(group["time"].attrs, "unit") == "ps"
        if e.unit:
            assert fixed_string(group["value"].attrs, "unit") == e.unit
        steps = group["step"].attrs["offset"] + group["step"][()] * np.arange(rows)
        np.testing.assert_array_equal(steps, [step for step, _ in recorded[e.name]])
        times = group["time"].attrs["offset"] + group["time"][()] * np.arange(rows)
        np.testing.assert_allclose(times, (steps - 100) * 0.002, rtol=1e-12)
        expected = np.array([frame for _, frame in recorded[e.name]]).astype(e.dtype)
        np.testing.assert_array_equal(group["value"], expected)


def test_image_has_the_steps_and_times_of_position_by_hard_links(file):
    bodies = file["particles/bodies"]
    for name in ("step", "time"):
        assert isinstance(bodies["image"].get(name, getlink=True), h5py.HardLink)
        assert bodies["image"][name] == bodies["position"][name]
    absolute = bodies["position/value"][()] + engine.BOX * bodies["image/value"][()]
    jumps = np.abs(np.diff(absolute, axis=0))
    assert jumps.max() > engine.BOX.max()  # it did cross, or this shows nothing
    assert (bodies["position/value"][()] <= engine.BOX.astype("f4")).all()


def test_a_changing_box_shares_the_steps_of_position(tmp_path):
    plain = engine.header()
    edges = Element("box/edges", "particles", (3,), np.float64, "nm", 4)
    with pytest.raises(ValueError, match="with position, at the same steps"):
        engine.header(elements=(*plain.elements, Element("box/edges", "particles", (3,), "f8",
                                                         "nm", 2)))
    head = engine.header(elements=(*plain.elements, edges))
    nothing = {e.name: 0 for e in head.elements}
    path = tmp_path / "x.h5"
    path.write_bytes(build_image(head, nothing, nothing, {}))
    with h5py.File(path) as file:
        bodies = file["particles/bodies"]
        assert bodies["box/edges/step"] == bodies["position/step"]
        assert bodies["box/edges/value"].shape == (0, 3)


@pytest.mark.parametrize("unit", ["nm", "nm ps-1", "g mol-1 nm+2 ps-1", "60 s", "C m", "1e3 m"])
def test_units_of_the_grammar(unit):
    assert is_unit(unit)


@pytest.mark.parametrize("unit", ["", "nm/ps", "nm^2", "nm  ps-1", "nm ", "nm 60", "Å", "ps-",
                                  "2 3 m"])
def test_what_is_not_a_unit(unit):
    assert not is_unit(unit)
    with pytest.raises(ValueError, match="H5MD unit"):
        Element("x", "observables", (), "f8", unit, 1)


@pytest.mark.parametrize(("frames", "bodies", "final", "chunk"), [
    (2048, 1024, True, (1024, 16, 3)), (512, 256, False, (256, 64, 3)),
    (10, 5, True, (10, 5, 3)), (1025, 17, True, (513, 9, 3)), (0, 3, False, (1, 3, 3)),
])
def test_chunks_are_even_and_no_larger_than_the_formats(frames, bodies, final, chunk):
    element = Element("torque", "particles", (bodies, 3), "f4", "kJ mol-1", 1)
    assert chunk_shape(element, frames, final) == chunk


def test_bodies_without_frames_and_nobody_watched(tmp_path):
    nobody = Element("watched/axis_z", "observables", (0, 3), "f4", None, 1)
    writer = TrajectoryWriter.create(tmp_path / "w", engine.header(elements=(nobody,)), 10)
    writer.append(100, {"watched/axis_z": np.zeros((0, 3))})
    writer.finish(tmp_path / "x.h5")
    with h5py.File(tmp_path / "x.h5") as file:
        assert file["observables/watched/axis_z/value"].shape == (1, 0, 3)


def test_two_elements_of_one_name_are_refused():
    twice = Element("temperature", "observables", (), "f8", "K", 1)
    with pytest.raises(ValueError, match="same name"):
        Header("a", 0.1, 0, engine.BOX, np.zeros(1), ("argon",), np.ones(1), (twice, twice))


def test_text_is_kept_whatever_its_letters(file):
    assert file["parameters/swirlight/config"].asstr()[()] == "title: ångström\n"
    labels = file["parameters/swirlight/species/leaning top (invented)/labels"]
    assert list(labels.asstr()) == ["A", "B", "C"]
