"""`check` must not wait for the compiler: what describes light imports no numba."""

import subprocess
import sys


def test_describing_light_imports_no_compiler():
    names = ("build", "describe", "envelope", "exposure", "limits", "polarisation", "pulse",
             "regime", "response", "schedule")
    lines = "; ".join(f"import swirlight.light.{n}" for n in names)
    code = f"import sys; {lines}; print([m for m in ('numba', 'scipy.interpolate'," \
           " 'h5py', 'matplotlib') if m in sys.modules])"
    out = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    assert out.stdout.strip() == "[]"
