"""Correlation functions: the full 3×3 matrix of many vectors, beside the bare transforms of numpy.

    python benchmarks/analysis.py            2 · 10⁴ frames of 250 bodies
    python benchmarks/analysis.py --full     10⁵ frames of 1000 bodies, 1.2 GB on disk

A trajectory of white noise is written in the layout of a run's own files and correlated from
there, body block by body block, lags to half of its length. Beside it: numpy.fft.rfft and irfft
of the same numbers of transforms of that padded length, from memory and with nothing else done.
Peak memory is that of the whole process, library imports and the reading of the file included.
"""

import argparse
import pathlib
import resource
import sys
import tempfile
import time

import h5py
import numpy as np
from scipy import fft

from swirlight.analysis.correlation import lagged_sums
from swirlight.results.vectors import blocks, find_vectors
from swirlight.store.layout import Element, Header, lay_out
from swirlight.store.trajectory import Trajectory

SLAB = 2048  # frames written at once


def write_noise(path, frames, bodies):
    """A trajectory file that holds `torque` and nothing else."""
    element = Element("torque", "particles", (bodies, 3), np.float32, "kJ mol-1", 10)
    header = Header("nobody", 0.002, 0, np.ones(3), np.zeros(bodies, int), ("noise",),
                    np.ones(bodies), (element,))
    random = np.random.default_rng(1)
    with h5py.File(path, "w") as file:
        value = lay_out(file, header, {"torque": 0}, {"torque": frames}, final=True)["torque"]
        for start in range(0, frames, SLAB):
            stop = min(start + SLAB, frames)
            value[start:stop] = random.standard_normal((stop - start, bodies, 3), np.float32)


def correlate(path, longest):
    """The full matrix, from the file."""
    with_all = [0, 1, 2]
    vectors = find_vectors(Trajectory(path), "torque")
    return lagged_sums(blocks(vectors, vectors, (with_all, with_all)), longest).correlation()


def bare_transforms(frames, bodies, longest):
    """Three forward transforms a body and nine back, of the padded length, by numpy.fft."""
    size = fft.next_fast_len(frames + longest, real=True)
    rows = np.random.default_rng(2).standard_normal((3, frames))
    started = time.perf_counter()
    for _ in range(bodies):
        spectra = np.fft.rfft(rows, size)
    for _ in range(3):
        np.fft.irfft(spectra, size)
    return time.perf_counter() - started


def main(arguments=None):
    parser = argparse.ArgumentParser(description=__doc__,
                                     formatter_class=argparse.RawDescriptionHelpFormatter)
    parser.add_argument("--full", action="store_true", help="10⁵ frames of 1000 bodies")
    frames, bodies = (100_000, 1000) if parser.parse_args(arguments).full else (20_000, 250)
    longest = frames // 2
    with tempfile.TemporaryDirectory() as folder:
        path = pathlib.Path(folder) / "dark-000.h5"
        write_noise(path, frames, bodies)
        before = resource.getrusage(resource.RUSAGE_SELF).ru_maxrss
        started = time.perf_counter()
        found = correlate(path, longest)
        ours = time.perf_counter() - started
        peak = resource.getrusage(resource.RUSAGE_SELF).ru_maxrss
    bare = bare_transforms(frames, bodies, longest)
    at_zero = found[0, longest].diagonal()  # of noise: 1 each
    print(f"{frames} frames × {bodies} bodies × 3, full 3×3, lags to ±{longest} frames")
    print(f"  correlated from the file   {ours:8.2f} s   C(0) = {at_zero.round(3)}")
    print(f"  bare transforms, numpy.fft {bare:8.2f} s")
    print(f"  ratio                      {ours / bare:8.2f}")
    print(f"  peak memory                {peak / 1024:8.0f} MB (before {before / 1024:.0f} MB)")


if __name__ == "__main__":
    sys.exit(main())
