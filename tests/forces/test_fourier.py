"""Transforms of many lines against numpy's, and what rows of numbers do."""

import numpy as np
import pytest

from swirlight.compiled import kernel
from swirlight.forces.kernels.fourier import transform, transform_plan, transformer, turn
from swirlight.forces.kernels.rows import aligned_zeros
from swirlight.forces.kernels.waves import lanes_of


@kernel
def _both_ways(machine, source, target, spare, at, to, factors, turns, width, lanes):
    transform(machine, False, source, at, target, to, spare, 0, 2 * to[2], (factors, turns),
              width, lanes)
    transform(machine, True, target, to, source, at, spare, 0, 2 * to[2], (factors, turns),
              width, lanes)


@kernel
def _on_the_side(array, at, to, numbers, wide, lines):
    turn(array, at, to, numbers, wide, lines)


@pytest.mark.parametrize("dtype, rounding", [(np.float32, 3e-7), (np.float64, 1e-15)])
@pytest.mark.parametrize("points", [2, 3, 4, 5, 8, 27, 30, 54, 100])
def test_transform_is_that_of_numpy_and_back(points, dtype, rounding):
    """Errors relative to the largest wave; the passes of 100 points round at most 3 times each."""
    rng, lanes = np.random.default_rng(points), lanes_of(dtype)
    width, pitch = 2 * lanes, 3 * lanes
    source = aligned_zeros((2, points, pitch), dtype)
    source[:] = rng.normal(size=source.shape)
    before, size = source.copy(), points * width
    target = aligned_zeros((2, points, width), dtype)
    spare = aligned_zeros(4 * size, dtype)
    _both_ways(transformer(np.dtype(dtype)), source.reshape(-1), target.reshape(-1), spare,
               (0, pitch, points * pitch), (0, width, size), *transform_plan(points, dtype), width,
               lanes)
    expected = np.fft.fft((before[0] + 1j * before[1])[:, :width], axis=0)
    found = target[0] + 1j * target[1]
    assert np.abs(found - expected).max() < rounding * np.abs(expected).max()
    np.testing.assert_allclose(source[:, :, :width] / points, before[:, :, :width],
                               atol=rounding * np.abs(expected).max())
    np.testing.assert_array_equal(source[:, :, width:], before[:, :, width:])


@pytest.mark.parametrize("points", [7, 22])
def test_other_primes_are_refused(points):
    with pytest.raises(ValueError, match="prime factors"):
        transform_plan(points, np.float64)


@pytest.mark.parametrize("dtype", [np.float32, np.float64])
def test_turning_a_plane(dtype):
    """10 numbers of 24 lines become 24 numbers of 16 lines, the last 6 of them zeros."""
    array = np.random.default_rng(1).normal(size=2 * 2 * 16 * 24).astype(dtype)
    plane = array[:768].reshape(2, 16, 24).copy()
    plane[:, 10:] = 0.0
    _on_the_side(array, (0, 24, 384), (768, 16, 384), 10, 16, 24)
    np.testing.assert_array_equal(array[768:].reshape(2, 24, 16), plane.transpose(0, 2, 1))
