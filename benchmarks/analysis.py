"""Correlation functions: the full 3×3 matrix of many vectors, beside the bare transforms of numpy.

    python benchmarks/analysis.py            2 · 10⁴ frames of 250 bodies
    python benchmarks/analysis.py --full     10⁵ frames of 1000 bodies, 1.2 GB on disk

A trajectory of white noise is written in the layout of a run's own files and correlated from
there, body block by body block, lags to half of its length. Beside it: numpy.fft.rfft and irfft
of as many series of that padded length, from memory and with nothing else done. The two take
turns; the fastest of each counts. Seconds of the clock, and of all processors together, which
other work on the machine disturbs less. Peak memory is that of the whole process, libraries and
the reading of the file included.
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
    vectors, components = find_vectors(Trajectory(path), "torque"), [0, 1, 2]
    return lagged_sums(blocks(vectors, vectors, (components, components)), longest).correlation()


def bare_transforms(rows, bodies, longest):
    """Three forward transforms a body and nine back, of the padded length, by numpy.fft.

    rows : (n, 3, frames), taken round about, so that they come from memory and not from a cache.
    """
    size = fft.next_fast_len(rows.shape[-1] + longest, real=True)
    for body in range(bodies):
        spectra = np.fft.rfft(rows[body % len(rows)], size)
    for _ in range(3):
        np.fft.irfft(spectra, size)


def seconds(call):
    """(clock, processors) [s] of one call."""
    clock, processors = time.perf_counter(), time.process_time()
    call()
    return time.perf_counter() - clock, time.process_time() - processors


def peak_memory():
    """Of this process so far. [MB]"""
    return resource.getrusage(resource.RUSAGE_SELF).ru_maxrss / 1024


def main(arguments=None):
    parser = argparse.ArgumentParser(description=__doc__,
                                     formatter_class=argparse.RawDescriptionHelpFormatter)
    parser.add_argument("--full", action="store_true", help="10⁵ frames of 1000 bodies")
    parser.add_argument("--rounds", type=int, default=3)
    chosen = parser.parse_args(arguments)
    frames, bodies = (100_000, 1000) if chosen.full else (20_000, 250)
    longest = frames // 2
    ours, bare = [], []
    with tempfile.TemporaryDirectory() as folder:
        path = pathlib.Path(folder) / "dark-000.h5"
        write_noise(path, frames, bodies)
        before = peak_memory()
        ours.append(seconds(lambda: correlate(path, longest)))
        peak = peak_memory()
        rows = np.random.default_rng(2).standard_normal((16, 3, frames))
        for _ in range(chosen.rounds):
            bare.append(seconds(lambda: bare_transforms(rows, bodies, longest)))
            ours.append(seconds(lambda: correlate(path, longest)))
    ours, bare = np.min(ours, axis=0), np.min(bare, axis=0)
    print(f"{frames} frames × {bodies} bodies × 3, full 3×3, lags to ±{longest} frames")
    print("                               clock / s  processors / s")
    print(f"  correlated from the file    {ours[0]:10.2f}{ours[1]:16.2f}")
    print(f"  bare transforms, numpy.fft  {bare[0]:10.2f}{bare[1]:16.2f}")
    print(f"  ratio                       {ours[0] / bare[0]:10.2f}{ours[1] / bare[1]:16.2f}")
    print(f"  peak memory {peak:.0f} MB, of which {before:.0f} MB before the data were read")


if __name__ == "__main__":
    sys.exit(main())
