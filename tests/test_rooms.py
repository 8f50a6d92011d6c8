"""The order of the house: who may import whom, and what stays out of where."""

import ast
import pathlib
import subprocess
import sys

import pytest

import swirlight

SOURCE = pathlib.Path(swirlight.__file__).parent


def loaded_after(statement):
    """Names of all modules that a fresh interpreter has after a statement."""
    code = f"{statement}\nimport sys\nprint(*sys.modules)"
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    return set(done.stdout.split())


def test_layers_are_kept():
    contract = SOURCE.parent.parent / "pyproject.toml"
    if not contract.is_file():
        pytest.skip("installed without its source tree, which holds the contract")
    done = subprocess.run(
        [sys.executable, "-c", "from importlinter.cli import lint_imports; "
         "raise SystemExit(lint_imports(no_cache=True))"],
        cwd=contract.parent, capture_output=True, text=True,
    )
    assert done.returncode == 0, done.stdout


def test_the_numerical_rooms_load_no_files_models_or_terminals():
    loaded = loaded_after("import swirlight.forces.field, swirlight.light.light,"
                          " swirlight.motion.step")
    assert "numba" in loaded  # which itself loads yaml where it can
    assert not loaded & {"pydantic", "h5py", "pint", "typer", "rich", "matplotlib", "dask"}


@pytest.mark.parametrize("statement", [
    "import swirlight; swirlight.load_config, swirlight.open_run, swirlight.load_species",
    "import swirlight.cli.main",
    "import swirlight.run.status",
    "import swirlight; swirlight.spectrum",
])
def test_light_doors_load_no_compiler(statement):
    assert not loaded_after(statement) & {"numba", "matplotlib", "distributed"}


def public_functions():
    for path in sorted(SOURCE.rglob("*.py")):
        tree = ast.parse(path.read_text())
        for node in tree.body:
            if isinstance(node, ast.FunctionDef | ast.ClassDef) and not node.name.startswith("_"):
                yield f"{path.relative_to(SOURCE)}:{node.name}", node


def test_everything_public_is_documented():
    bare = [name for name, node in public_functions() if not ast.get_docstring(node)]
    assert bare == []


def test_every_module_says_what_it_is_for():
    bare = [
        str(path.relative_to(SOURCE)) for path in sorted(SOURCE.rglob("*.py"))
        if path.read_text().strip() and not ast.get_docstring(ast.parse(path.read_text()))
    ]
    assert bare == []
