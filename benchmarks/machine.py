"""What was measured on, with which versions and settings."""

import os
import pathlib
import platform
from importlib.metadata import version

from swirlight.compiled import numba


def processor():
    try:
        found = [x for x in pathlib.Path("/proc/cpuinfo").read_text().splitlines()
                 if x.startswith("model name")]
        return found[0].partition(":")[2].strip()
    except (OSError, IndexError):
        return platform.processor() or platform.machine()


def vectors():
    """How wide the vectors of the processor are, as the compiler knows them."""
    from llvmlite import binding

    features = {name for name, there in binding.get_host_cpu_features().items() if there}
    bits = 512 if "avx512f" in features else 256 if "avx2" in features else 128
    return f"{bits}-bit vectors"


def heading():
    """Lines to print above the tables."""
    versions = ", ".join(f"{name} {version(name)}" for name in
                         ("swirlight", "numba", "llvmlite", "numpy", "scipy"))
    # The folder of compiled kernels is named by a hash: it says nothing about speed.
    settings = ", ".join(f"{name}={value}" for name, value in sorted(os.environ.items())
                         if name.startswith(("NUMBA_", "OMP_", "GOMP_", "KMP_"))
                         and name != "NUMBA_CACHE_DIR")
    return [f"{processor()}, {os.cpu_count()} cores, {vectors()}; {platform.system()}"
            f" {platform.release()}",
            f"Python {platform.python_version()}, {versions}",
            f"settings: {settings or 'none'}; up to"
            f" {numba.config.NUMBA_NUM_THREADS} threads; {load()}"]


def load():
    """How busy the machine is, its own work of the last minutes included."""
    return "load over 1, 5, 15 minutes: " + ", ".join(f"{x:.2f}" for x in os.getloadavg())
