"""How the Ewald sums meet the tolerance asked for: splitting, longest wave vector, mesh.

Model   Errors as for uncorrelated charges in the box: the mean square error of the force between
        two unit charges, ⟨δf²⟩, gives the rms error of the force on a body
            δF = ke Σq² √(⟨δf²⟩/N),     Σq² over all charges, N bodies,
        and the mesh adds a force of each charge on itself.
        Real space: Kolafa & Perram, Mol. Simul. 9 (1992) 351. Wave vectors left out: the same
        reasoning, for a sphere. Mesh: every alias that the splines let in, summed mode by mode,
        as in the analyses of Hockney & Eastwood (1988) and of Ballenegger, Cerdà & Holm, J. Chem.
        Theory Comput. 8 (2012) 936 (both from memory; derived anew here).
Units   nm, ps, u, e.
"""

from itertools import product

import numpy as np
import scipy.fft
from scipy.special import erfc, erfcinv

from swirlight.forces.splines import ORDERS, WIDTH, spline_moduli
from swirlight.rotation import rotation_matrix
from swirlight.units import COULOMB

SAFETY = 0.5  # of the tolerance is what real space, and what reciprocal space, may use
NEIGHBOURS = 12  # of a body in a dense liquid
PROXY = 32  # points per axis that the error of a mesh is summed over
# ns per charge, per charge and spline point, and per mesh point and log2 of their number: from
# timings on one core, only to choose among meshes that are all good enough.
COST = (36.0, 1.2, 0.4)


def typical_force(system, box):
    """Rms electric force on a body, as in a liquid of uncorrelated orientations. [u nm/ps²]

    A body and one neighbour at contact, or at the nearest-neighbour distance of the fcc lattice
    of this density if that is shorter, turned at random (fixed draws); then as many such
    neighbours as the density allows, at most 12, adding as independent. Bonds between
    neighbours make true forces larger: the tolerance is then kept with room to spare.
    """
    density = system.bodies / np.prod(box)
    lattice = (np.sqrt(2.0) / density) ** (1.0 / 3.0)
    draws = np.random.default_rng(20).normal(size=(2, 64, 4))
    turns = [rotation_matrix(d / np.linalg.norm(d, axis=1, keepdims=True)) for d in draws]
    share = np.array(system.counts) / system.bodies
    square = 0.0
    for (a, one), (b, two) in product(enumerate(system.species), repeat=2):
        size = 0.5 * (_diameter(one) + _diameter(two))
        distance = min(lattice, size) if size > 0.0 else lattice
        x1 = np.einsum("nij,sj->nsi", turns[0], one.sites)
        x2 = np.einsum("nij,sj->nsi", turns[1], two.sites) + [distance, 0.0, 0.0]
        apart = x1[:, :, None] - x2[:, None, :]
        r = np.maximum(np.linalg.norm(apart, axis=-1), 0.5 * distance / np.sqrt(3.0))
        pull = COULOMB * np.outer(one.charge, two.charge) / r**3
        force = np.einsum("nst,nsti->ni", pull, apart)
        neighbours = NEIGHBOURS * (distance / lattice) ** 3
        square += share[a] * share[b] * neighbours * np.median((force**2).sum(axis=1))
    return float(np.sqrt(square))


def _diameter(species):
    """Twice the distance of the outermost Lennard-Jones surface from the centre. [nm]"""
    sizes = 2.0 * np.linalg.norm(species.sites, axis=1) + species.sigma
    return float(np.max(sizes, where=species.epsilon > 0.0, initial=0.0))


def body_error(system, pair, own=0.0):
    """Rms force error of a body, from ⟨δf²⟩ between two unit charges and of one on itself."""
    square = (system.site_charge**2).sum() ** 2 * pair + (system.site_charge**4).sum() * own
    return COULOMB * np.sqrt(square / system.bodies)


def splitting(system, box):
    """α that brings the real-space error to its share of the tolerance. [1/nm]

    The sum cut at rc errs by ⟨δf²⟩ = 4 exp(−2α²rc²)/(rc V) between two unit charges.
    """
    rc = system.interactions.cutoff
    needed = (allowed_error(system, box) / body_error(system, 1.0)) ** 2
    return float(np.sqrt(max(0.5 * np.log(4.0 / (rc * np.prod(box) * needed)), 1.0)) / rc)


def allowed_error(system, box):
    """Rms force error of a body that real space, and again reciprocal space, may leave."""
    return SAFETY * system.interactions.tolerance * typical_force(system, box)


def left_out_error(alpha, radius, box):
    """⟨δf²⟩ of the waves longer than `radius`, ∫ (4π/Vk)² e^(−k²/2α²) V d³k/(2π)³. [1/nm⁴]"""
    volume = np.prod(box)
    return 8.0 / volume * np.sqrt(0.5 * np.pi) * alpha * erfc(radius / (np.sqrt(2.0) * alpha))


def longest_wave(system, box, alpha):
    """Radius that brings the error of the wave vectors left out to its share. [1/nm]"""
    needed = (allowed_error(system, box) / body_error(system, 1.0)) ** 2
    fraction = min(needed / left_out_error(alpha, 0.0, box), 0.5)
    return float(np.sqrt(2.0) * alpha * erfcinv(fraction))


def mesh_error(alpha, order, mesh, box):
    """⟨δf²⟩ of the mesh sum, between two unit charges and of one on itself. [1/nm⁴]

    A wave k on the mesh is Σ_s a_s exp(i k_s·r), k_s the aliases of k and a_s the splines'
    amplitudes, divided by their sum. A pair's force error is then, averaged over both places,
        Σ_k g² [ Σ_s k_s² a_s² · Σ_t a_t² − 2 k² a_0² + k² ],    g = 4π exp(−k²/4α²)/(V k²),
    summed below without its cancellation; and a charge pushes itself by waves of the mesh
    spacing, the strongest along each axis with amplitude Σ_k g Σ_t k_{t+1} a_{t+1} a_t.
    Meshes finer than PROXY points are taken as a smaller box of the same spacing.
    """
    points = np.minimum(mesh, PROXY)
    edges = np.asarray(box) * points / np.asarray(mesh)
    axes = [_aliases(int(n), order, edge) for n, edge in zip(points, edges, strict=True)]
    k2, first, rest, pull, push = (np.ix_(*part) for part in zip(*axes, strict=True))
    square = sum(k2)
    square[0, 0, 0] = np.inf
    strength = 4.0 * np.pi * np.exp(-square / (4.0 * alpha**2)) / square
    square[0, 0, 0] = 0.0
    a_0 = first[0] * first[1] * first[2]
    gradient, own = 0.0, 0.0
    for x, y, z in ((0, 1, 2), (1, 2, 0), (2, 0, 1)):
        both = (first[y] + rest[y]) * (first[z] + rest[z])  # Σ a_s² along two axes
        gradient = (gradient + pull[x] * both
                    + k2[x] * first[x] * (rest[y] * (first[z] + rest[z]) + first[y] * rest[z]))
        own += ((strength * push[x] * both).sum() / np.prod(edges)) ** 2
    strays = (rest[0] * (first[1] + rest[1]) * (first[2] + rest[2])
              + first[0] * (rest[1] * (first[2] + rest[2]) + first[1] * rest[2]))
    bracket = square * ((1.0 - a_0) ** 2 + a_0 * strays) + gradient * (a_0 + strays)
    pair = (strength**2 * bracket).sum() / np.prod(edges) / np.prod(box)
    coarsest = np.max(np.asarray(box) / np.asarray(mesh))
    return float(pair + left_out_error(alpha, np.pi / coarsest, box)), float(2.0 * own)


def _aliases(points, order, edge):
    """Along one axis, for each k: k², a_0², then over the aliases other than k itself Σ a_s² and
    Σ k_s² a_s², then Σ k_{t+1} a_{t+1} a_t.
    """
    x = scipy.fft.fftfreq(points)[:, None]
    s = np.arange(-3, 4)
    with np.errstate(invalid="ignore"):
        amplitude = np.where(s == 0, 1.0, (x / (x + s)) ** order)
    wave = 2.0 * np.pi * points / edge * (x + s)
    first = np.sinc(x[:, 0]) ** (2 * order) * spline_moduli(points, order)
    strays = np.where(s == 0, 0.0, amplitude**2)
    return (wave[:, 3] ** 2, first, first * strays.sum(axis=1),
            first * (wave**2 * strays).sum(axis=1),
            first * (wave[:, 1:] * amplitude[:, 1:] * amplitude[:, :-1]).sum(axis=1))


def choose_mesh(system, box, alpha):
    """Order and points per axis of the cheapest mesh that meets its share of the tolerance.

    Orders and spacings that the interactions fix are kept, whatever their error.
    """
    order, spacing = system.interactions.mesh_order, system.interactions.mesh_spacing
    orders = ORDERS if order is None else (order,)
    if spacing is not None:
        return max(orders) if order is None else order, mesh_points(box, spacing)
    charges = np.count_nonzero(system.site_charge)
    found = [(p, _coarsest(system, box, alpha, p)) for p in orders]
    return min(found, key=lambda f: _cost(charges, *f))


def mesh_points(box, spacing):
    """Points per axis, sizes that transform fast, at most `spacing` apart. [1]"""
    return tuple(max(scipy.fft.next_fast_len(int(np.ceil(edge / spacing - 1e-9)), real=True), WIDTH)
                 for edge in box)


def _coarsest(system, box, alpha, order):
    """Widest mesh of an order that is good enough, by bisection of the spacing."""
    allowed = allowed_error(system, box)
    fine, coarse = 0.05 / alpha, np.max(box) / WIDTH
    while coarse / fine > 1.02:
        middle = np.sqrt(fine * coarse)
        mesh = mesh_points(box, middle)
        if body_error(system, *mesh_error(alpha, order, mesh, box)) > allowed:
            coarse = middle
        else:
            fine = middle
    return mesh_points(box, fine)


def _cost(charges, order, mesh):
    per_charge, per_tap, per_point = COST
    points = float(np.prod(mesh))
    return charges * (per_charge + per_tap * order**2) + points * per_point * np.log2(points)
