"""Samples and plain twins for the tests of the light; invented bodies, fixed seeds."""

import numpy as np

from swirlight.species.body import ATOM, GENERAL, LINEAR, OpticalResponse, Species
from swirlight.system import Interactions, System

LEVI_CIVITA = np.zeros((3, 3, 3))
for _a, _b, _c in ((0, 1, 2), (1, 2, 0), (2, 0, 1)):
    LEVI_CIVITA[_a, _b, _c], LEVI_CIVITA[_a, _c, _b] = 1.0, -1.0


def response(seed=1, alpha=True, absorption=True, gyration=True, kappa=False, at=None):
    """A general response; parts left out are zero. Absorption is positive definite."""
    rng = np.random.default_rng(seed)
    a, d, k = rng.normal(size=(3, 3, 3))
    return OpticalResponse(
        at,
        (a + a.T) * alpha,
        (d @ d.T) * absorption,
        rng.normal(size=3) * gyration,
        k * kappa,
    )


def isotropic(absorption=1.0):
    """A response that only absorbs, alike along every axis."""
    return OpticalResponse(None, np.zeros((3, 3)), absorption * np.eye(3), np.zeros(3),
                           np.zeros((3, 3)))


def species(*responses, name="top", freedom=GENERAL, charge=(0.5, -0.5, 0.0)):
    """Three sites: a general body, or a linear one along z, or an atom of one site."""
    sites = np.array([[0.03, -0.02, 0.05], [-0.01, 0.06, -0.04], [0.01, -0.02, 0.03]])
    inertia, charge = np.array([0.02, 0.03, 0.05]), np.array(charge)
    if freedom == LINEAR:
        sites, inertia = sites * [0.0, 0.0, 1.0], np.array([0.03, 0.03, 0.0])
    if freedom == ATOM:
        sites, inertia = np.zeros((3, 3)), np.zeros(3)
    ones = np.ones(3)
    return Species(name, "invented", ("A", "B", "C"), sites, 10.0 * ones, charge, 0.3 * ones,
                   0.5 * ones, inertia, freedom, np.eye(3), responses=tuple(responses))


def sample(*kinds, count=7, temperature=300.0):
    """A System of `count` bodies of each species."""
    return System(kinds, (count,) * len(kinds), Interactions(1.0), temperature=temperature)


def orientations(count, seed=2):
    """(count, 4) uniformly random unit quaternions."""
    q = np.random.default_rng(seed).normal(size=(count, 4))
    return q / np.linalg.norm(q, axis=1, keepdims=True)


def matrix(q):
    """R of one unit quaternion, by the textbook product of a rotation axis and angle."""
    axis, sine = q[1:] / np.linalg.norm(q[1:]), np.linalg.norm(q[1:])
    angle = 2.0 * np.arctan2(sine, q[0])
    skew = np.einsum("ikj,k->ij", LEVI_CIVITA, axis)
    return np.eye(3) + np.sin(angle) * skew + (1.0 - np.cos(angle)) * skew @ skew


def turned(q, turn):
    """Quaternions after a small further rotation vector `turn` in the laboratory frame."""
    half = 0.5 * np.asarray(turn)
    length = np.linalg.norm(half)
    p = np.array([np.cos(length), *(half * np.sinc(length / np.pi))])
    w, v = p[0] * q[:, 0] - q[:, 1:] @ p[1:], None
    v = p[0] * q[:, 1:] + q[:, :1] * p[1:] + np.cross(p[1:], q[:, 1:])
    return np.column_stack([w, v])


def complex_polarizability(block):
    """α_S + iα_D − iε_jlm g_m, body frame."""
    return (block.polarizability + 1j * block.absorptive
            - 1j * np.einsum("jlm,m->jl", LEVI_CIVITA, block.gyration))


def twin_averaged(q, block, amplitude, omega, free=(1.0, 1.0, 1.0)):
    """(torque, absorbed power, energy) of one body from τ = ½Re[(αe)×e*], plain numpy."""
    r = matrix(q)
    e = r.T @ amplitude
    p = complex_polarizability(block) @ e
    torque = r @ (np.array(free) * 0.5 * np.cross(p, e.conj()).real)
    conservative = block.polarizability - 1j * np.einsum("jlm,m->jl", LEVI_CIVITA, block.gyration)
    energy = -0.25 * (e.conj() @ conservative @ e).real
    return torque, 0.5 * omega * (e.conj() @ p).imag, energy


def twin_resolved(q, block, dipole, field, quadrature, omega, free=(1.0, 1.0, 1.0)):
    """(torque, absorbed power, energy) of one body in one colour E, Ė/ω, plain numpy."""
    r = matrix(q)
    e, d = r.T @ field, r.T @ quadrature
    p = dipole + block.polarizability @ e - block.absorptive @ d - np.cross(block.gyration, d)
    energy = -dipole @ e - 0.5 * e @ block.polarizability @ e
    return r @ (np.array(free) * np.cross(p, e)), omega * d @ block.absorptive @ d, energy
