"""Free rotation of a rigid body over one interval; its angular momentum L stays untouched.

Linear, spherical and symmetric tops   exact, two commuting rotations: about L in the
    laboratory at L/I₁, and about the body's own z at L_z (1/I₃ − 1/I₁).
Asymmetric tops   H = Σ L_k²/2I_k split by axis, each part an exact rotation about a principal
    axis; the symmetric order x y z y x with half intervals outside (Dullweber, Leimkuhler &
    McLachlan, J. Chem. Phys. 107, 5840 (1997); with quaternions Miller et al., J. Chem. Phys.
    116, 8649 (2002)): symplectic, time-reversible, second order.

L is kept in the laboratory frame, where free rotation does not change one bit of it.
"""

import numpy as np

from swirlight.compiled import kernel
from swirlight.rotation_kernels import cosine_and_sinc, matrix_entries

ATOM, SYMMETRIC, ASYMMETRIC = 0, 1, 2
EQUAL_MOMENTS = 1e-9  # relative; nearer moments are one moment to more digits than anyone knows


def rotor_kinds(inertia):
    """(N,) int8: which propagator each body needs, from its principal moments (N, 3). [u nm²]

    Linear and spherical bodies are special symmetric tops. The axis of a symmetric top is
    the body's z; equal moments about another pair of axes take the asymmetric path, which
    is right for any moments.
    """
    x, y, z = np.asarray(inertia, float).T
    largest = np.maximum(np.maximum(x, y), z)
    equal = np.abs(x - y) <= EQUAL_MOMENTS * largest
    kinds = np.where(equal & (x > 0), SYMMETRIC, ASYMMETRIC)
    return np.where(largest == 0, ATOM, kinds).astype(np.int8)


@kernel
def turn_symmetric(w, x, y, z, lx, ly, lz, across, along, t):
    """Quaternion after a symmetric top (linear: along = 0) turned freely for the time t.

    across, along : 1/I₁ and 1/I₃, reciprocal moments across and along the body's z.
    """
    # about the laboratory's L: q → exp(½ t L/I₁) q
    f = 0.5 * t * across
    c, s = cosine_and_sinc(f * f * (lx * lx + ly * ly + lz * lz))
    a, b, d = f * s * lx, f * s * ly, f * s * lz
    qw = c * w - a * x - b * y - d * z
    qx = c * x + a * w + b * z - d * y
    qy = c * y - a * z + b * w + d * x
    qz = c * z + a * y - b * x + d * w
    if along == 0.0 or along == across:
        return qw, qx, qy, qz
    # about the body's z: q → q exp(½ t L_z (1/I₃ − 1/I₁) ẑ), with L_z = L·u of the axis u
    spin = (
        lx * 2.0 * (x * z + w * y) + ly * 2.0 * (y * z - w * x)
        + lz * (w * w - x * x - y * y + z * z)
    )
    h = 0.5 * t * (along - across) * spin
    c, s = cosine_and_sinc(h * h)
    s *= h
    return c * qw - s * qz, c * qx + s * qy, c * qy - s * qx, c * qz + s * qw


@kernel
def _about(w, a, b, c, lb, lc, half):
    """Turn by the angle 2 half about body axis a, where a, b, c are the axes in cyclic order.

    The body turns one way and its L, seen from the body, the other.
    """
    cosine, sine = cosine_and_sinc(half * half)
    sine *= half
    turned = (cosine * w - sine * a, cosine * a + sine * w, cosine * b + sine * c,
              cosine * c - sine * b)
    cosine, sine = cosine * cosine - sine * sine, 2.0 * cosine * sine
    return (*turned, cosine * lb + sine * lc, cosine * lc - sine * lb)


@kernel
def turn_asymmetric(w, x, y, z, lx, ly, lz, px, py, pz, t):
    """Quaternion after the five rotations; p are the reciprocal principal moments."""
    r00, r01, r02, r10, r11, r12, r20, r21, r22 = matrix_entries(w, x, y, z)
    bx = r00 * lx + r10 * ly + r20 * lz
    by = r01 * lx + r11 * ly + r21 * lz
    bz = r02 * lx + r12 * ly + r22 * lz
    h = 0.25 * t
    w, x, y, z, by, bz = _about(w, x, y, z, by, bz, h * px * bx)
    w, y, z, x, bz, bx = _about(w, y, z, x, bz, bx, h * py * by)
    w, z, x, y, bx, by = _about(w, z, x, y, bx, by, 2.0 * h * pz * bz)
    w, y, z, x, bz, bx = _about(w, y, z, x, bz, bx, h * py * by)
    w, x, y, z, by, bz = _about(w, x, y, z, by, bz, h * px * bx)
    return w, x, y, z


@kernel
def turn_freely(kind, w, x, y, z, lx, ly, lz, px, py, pz, t):
    """Quaternion of a body of the given kind after free rotation for the time t.

    p are the reciprocal principal moments. The length is corrected to first order in its
    error, which is of rounding size; time reversal holds to rounding.
    """
    if kind == 0:
        return w, x, y, z
    if kind == 1:
        w, x, y, z = turn_symmetric(w, x, y, z, lx, ly, lz, 0.5 * (px + py), pz, t)
    else:
        w, x, y, z = turn_asymmetric(w, x, y, z, lx, ly, lz, px, py, pz, t)
    f = 1.5 - 0.5 * (w * w + x * x + y * y + z * z)
    return f * w, f * x, f * y, f * z
