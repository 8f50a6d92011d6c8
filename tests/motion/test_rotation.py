"""Quaternions: the array form against scipy, the kernel form against the array form."""

import math

import numpy as np
import pytest
from scipy.spatial.transform import Rotation

from swirlight import rotation, rotation_kernels

RANDOM = np.random.default_rng(7)
QUATERNIONS = rotation.normalised(RANDOM.standard_normal((50, 4)))


def scipy_rotation(q):
    return Rotation.from_quat(np.roll(q, -1, axis=-1))  # scipy puts the scalar last


def test_matrices_and_products_agree_with_scipy():
    a, b = QUATERNIONS[:25], QUATERNIONS[25:]
    assert np.allclose(rotation.rotation_matrix(a), scipy_rotation(a).as_matrix(), atol=1e-14)
    product = (scipy_rotation(a) * scipy_rotation(b)).as_matrix()
    assert np.allclose(rotation.rotation_matrix(rotation.multiply(a, b)), product, atol=1e-14)


def test_vectors_go_to_the_laboratory_and_back():
    v = RANDOM.standard_normal((50, 3))
    lab = rotation.to_laboratory(QUATERNIONS, v)
    assert np.allclose(lab, scipy_rotation(QUATERNIONS).apply(v), atol=1e-14)
    assert np.allclose(rotation.to_body(QUATERNIONS, lab), v, atol=1e-14)


def test_rotation_vectors():
    turn = RANDOM.standard_normal((50, 3))
    turn[0] = 0
    expected = Rotation.from_rotvec(turn).as_matrix()
    assert np.allclose(rotation.rotation_matrix(rotation.from_vector(turn)), expected, atol=1e-14)


def test_kernel_form_equals_array_form():
    for q in QUATERNIONS:
        entries = np.reshape(rotation_kernels.matrix_entries(*q), (3, 3))
        assert np.allclose(entries, rotation.rotation_matrix(q), atol=1e-15)


@pytest.mark.parametrize("h", [0.0, 1e-9, 1e-3, 0.1, 0.2499999, 0.25, 0.2500001, 1.0, 3.0, 40.0])
def test_cosine_and_sinc_to_rounding(h):
    c, s = rotation_kernels.cosine_and_sinc(h * h)
    assert c == pytest.approx(math.cos(h), abs=3e-16 * max(1, h))
    assert s == pytest.approx(math.sin(h) / h if h else 1.0, abs=3e-16 * max(1, h))
