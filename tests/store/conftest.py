import pytest

from tests.store import engine


@pytest.fixture(scope="session")
def finished(tmp_path_factory):
    """Path of a complete trajectory file; not to be changed."""
    folder = tmp_path_factory.mktemp("finished")
    engine.run(folder / "w", folder / "plus-000.h5")
    return folder / "plus-000.h5"


@pytest.fixture
def copy(finished, tmp_path):
    """Path of a copy that may be changed."""
    path = tmp_path / "plus-000.h5"
    path.write_bytes(finished.read_bytes())
    return path


@pytest.fixture
def recorded():
    """What was recorded: {element: list of (step, frame)}."""
    head, state = engine.header(), engine.first_state()
    kept = {e.name: [] for e in head.elements}
    for step in range(engine.STEPS + 1):
        if step:
            engine.advance(state)
        for name, value in engine.frames(state, head.elements, head.first_step).items():
            kept[name].append((state.step, value.copy() if hasattr(value, "copy") else value))
    return kept


@pytest.fixture
def under_way(tmp_path, finished):
    """A run folder with one trajectory complete and one stopped in its second segment."""
    folder = tmp_path / "run"
    engine.run(folder / ".work/minus-000", folder / "minus-000.h5", stop=135)
    (folder / "plus-000.h5").write_bytes(finished.read_bytes())
    (folder / "config.yaml").write_text("title: ångström\n", encoding="utf-8")
    return folder
