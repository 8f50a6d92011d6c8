"""Written kernels become modules: files named by their text, whose compiled form numba keeps.

Two processes may write the same file at once: each writes its own and renames it, and the
texts are the same.
"""

import functools
import hashlib
import importlib.util
import os
import pathlib
import sys
import tempfile
import types
import warnings

from swirlight import compiled


@functools.cache
def module_of(text):
    """The module with this text, from the folder of compiled kernels."""
    # The key of the compiled package goes in: what the text imports may have changed.
    key = compiled.cache_folder().name + text
    name = f"pairs_{hashlib.sha256(key.encode()).hexdigest()[:20]}"
    folder = pathlib.Path(os.environ["NUMBA_CACHE_DIR"]) / "written"
    path = folder / f"{name}.py"
    try:
        if not path.exists():
            folder.mkdir(parents=True, exist_ok=True)
            handle, draft = tempfile.mkstemp(dir=folder, suffix=".draft")
            with os.fdopen(handle, "w", encoding="utf-8") as file:
                file.write(text)
            os.replace(draft, path)
        specification = importlib.util.spec_from_file_location(name, path)
        module = importlib.util.module_from_spec(specification)
        sys.modules[name] = module  # numba asks for the module by name when it loads its cache
        specification.loader.exec_module(module)
    except OSError:  # nowhere to write: compile from memory, at each start
        warnings.warn("no folder to keep written kernels in; they are compiled at each start"
                      " (set NUMBA_CACHE_DIR)", stacklevel=2)
        module = types.ModuleType(name)
        exec(compile(text, name, "exec"), module.__dict__)
    return module
