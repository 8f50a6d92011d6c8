"""Bad input on the command line: exit code 2, one message, no traceback, nothing written."""

import re

import pytest

from swirlight.cli.main import run
from tests.config.good import GOOD
from tests.config.test_broken import BROKEN


@pytest.mark.parametrize("name", BROKEN)
@pytest.mark.parametrize("command", ["check", "launch"])
def test_broken_configs(name, command, tmp_path, monkeypatch, capsys):
    good, broken, key, _ = BROKEN[name]
    path = tmp_path / "broken.yaml"
    path.write_text(GOOD.replace(good.replace("«", ""), broken.replace("«", ""), 1))
    monkeypatch.chdir(tmp_path)
    assert run([command, str(path)]) == 2
    out, error = capsys.readouterr()
    assert out == "" and "Traceback" not in error
    assert re.match(rf"{re.escape(str(path))}:\d+:\d+: {re.escape(key)}: ", error)
    assert [entry.name for entry in tmp_path.iterdir()] == ["broken.yaml"]


@pytest.mark.parametrize("arguments, words", [
    (["launch", "nowhere.yaml"], "nowhere.yaml"),
    (["resume", "nowhere"], "not a run folder"),
    (["status", "nowhere"], "not a run folder"),
    (["convert", "nowhere", "--to", "csv"], "not a run folder"),
    (["species", "watr"], 'did you mean "water"'),
    (["schema", "everything"], "expected config, species or summary"),
    (["dance"], "dance"),
    (["launch"], "--help"),
])
def test_other_bad_input(arguments, words, tmp_path, monkeypatch, capsys):
    monkeypatch.chdir(tmp_path)
    assert run(arguments) == 2
    out, error = capsys.readouterr()
    assert out == "" and words in error and "Traceback" not in error
    assert not list(tmp_path.iterdir())
