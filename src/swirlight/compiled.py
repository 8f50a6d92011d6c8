"""How kernels are compiled: one decorator, one cache, explicit floating-point flags.

numba's own cache does not notice an edited callee, other flags or other constants, so the
cache folder is named by a hash of every source file that may hold a kernel, and of this one.
A package folder that cannot be cached (read-only, or not a file) still works: it compiles at
each start.
"""

import hashlib
import os
import pathlib
import sys
import warnings

# NaN and infinity stay visible (no nnan, ninf): a trajectory that blows up must be seen.
FAST = {"reassoc", "nsz", "contract", "arcp", "afn"}
KERNEL_ROOMS = ("light", "forces", "motion", "observe")
KERNEL_FILES = ("compiled.py", "rotation_kernels.py")  # outside of them
# Parallel kernels split their work into this many parts whatever the number of threads,
# and add the parts in order: the same bits on any machine.
CHUNKS = 32

# Settings of a kernel that only other kernels call: without a door for Python it compiles faster.
INNER = {"no_cpython_wrapper": True, "no_cfunc_wrapper": True}


def _source_hash():
    root = pathlib.Path(__file__).parent
    digest = hashlib.sha256()
    rooms = sorted(p for room in KERNEL_ROOMS for p in (root / room).rglob("*.py"))
    for path in [*(root / name for name in KERNEL_FILES), *rooms]:
        digest.update(path.name.encode() + b"\0" + path.read_bytes())
    return digest.hexdigest()[:12]


def cache_folder():
    """Where compiled kernels are kept: in NUMBA_CACHE_DIR if set, else in the user's cache."""
    name, given = f"kernels-{_source_hash()}", os.environ.get("NUMBA_CACHE_DIR")
    if given:  # worker processes inherit what was set below
        return pathlib.Path(given) if os.path.basename(given) == name else pathlib.Path(given, name)
    base = os.environ.get("XDG_CACHE_HOME") or pathlib.Path.home() / ".cache"
    return pathlib.Path(base) / "swirlight" / name


if "numba" not in sys.modules:
    # Idle OpenMP threads must sleep: on a busy machine ones that spin on cost a factor of ten.
    # But waking one takes 60 to 80 µs, so they spin for some 0.1 ms first: from one kernel of
    # a step to the next.
    os.environ.setdefault("OMP_WAIT_POLICY", "PASSIVE")
    os.environ.setdefault("GOMP_SPINCOUNT", "20000")
os.environ["NUMBA_CACHE_DIR"] = str(cache_folder())

import numba  # noqa: E402

numba.config.CACHE_DIR = os.environ["NUMBA_CACHE_DIR"]


def kernel(function=None, *, fast=False, parallel=False, **options):
    """Compile a plain function on floats and arrays; the package's only door to numba.

    fast : allow reassociation, contraction and reciprocal estimates (never "no NaN").
    parallel : `numba.prange` loops run on threads; reduce per chunk, in order.
    """
    if function is None:
        return lambda f: kernel(f, fast=fast, parallel=parallel, **options)
    settings = {
        "fastmath": FAST if fast else False,
        "parallel": parallel,
        "nogil": True,
        "error_model": "numpy",
        **options,
    }
    try:
        return _with_cached_code(numba.njit(cache=True, **settings)(function))
    except RuntimeError:  # no locator available: nowhere to keep a cache
        warnings.warn("no folder to keep compiled kernels in; they are compiled at each start"
                      " (set NUMBA_CACHE_DIR)", stacklevel=2)
        return numba.njit(**settings)(function)


def _with_cached_code(dispatcher):
    """A kernel with everything that the cache holds for it, loaded at once.

    When a kernel calls another that is not inlined, the caller's machine code carries a copy
    of the callee, optimised once more, with other roundings. Which of the two runs depends on
    whether the callee's own code was there first: always in the process that compiles, never
    in one that finds the caller in the cache. Kernels are defined before their callers, so
    loading here makes it always, and the bits the same. Without numba's index (it is not
    public) kernels still run; only this guarantee is lost, and a test tells.
    """
    cache = getattr(dispatcher, "_cache", None)
    try:
        saved = list(cache._cache_file._load_index())
        codegen = dispatcher.targetctx.codegen()
        wanted = [key[0] for key in saved if key == cache._index_key(key[0], codegen)]
    except (AttributeError, OSError):
        return dispatcher
    for signature in wanted:
        dispatcher.compile(signature)
    return dispatcher
