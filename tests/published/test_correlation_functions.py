"""Correlation functions whose exact form is known.

Free rotors: thermal ensembles in units of I = kT = 1, as in R. G. Gordon, J. Chem. Phys. 44, 1830
(1966) and A. G. St. Pierre & W. A. Steele, Phys. Rev. 184, 172 (1969) (both from memory); the
linear rotor is checked by quadrature here, the asymmetric one against the expansion in time that
follows from its equations of motion.
"""

import numpy as np
import pytest
from scipy import integrate, special

from swirlight.analysis.correlation import lagged_sums, locked_sums
from swirlight.results.correlate import _blocked
from swirlight.rotation import multiply, rotation_matrix

pytestmark = pytest.mark.published
RUNGE_KUTTA = 1e-6  # |u|² of the tops drifts by some 1e-7
SIGMA = 4.5  # over some hundred lags that are not independent


def per_body(a, longest, pair=None):
    """(bodies, lags) of ⟨a·a⟩, or of one pair of components: one sum for each body."""
    found = []
    for body in range(a.shape[1]):
        one = a[:, [body]]
        c = lagged_sums([(one, one)], longest).correlation()[0]
        found.append(c[:, pair[0], pair[1]] if pair else np.einsum("lpp->l", c))
    return np.array(found)


def hold(samples, exact, made_to=1e-12):
    """Mean over independent bodies within SIGMA standard errors, at every lag.

    made_to : error of the data themselves.
    """
    error = samples.std(axis=0, ddof=1) / np.sqrt(len(samples))
    np.testing.assert_array_less(abs(samples.mean(axis=0) - exact), SIGMA * error + made_to)


def ornstein_uhlenbeck(random, frames, bodies, tau):
    """Exactly: x' = e x + √(1 − e²) noise with e = exp(−1/τ), from the stationary state."""
    decay = np.exp(-1.0 / tau)
    x = np.empty((frames, bodies, 1))
    x[0] = random.normal(size=(bodies, 1))
    for k in range(1, frames):
        x[k] = decay * x[k - 1] + np.sqrt(1 - decay**2) * random.normal(size=(bodies, 1))
    return x


def test_ornstein_uhlenbeck_process_decays_exponentially():
    """Uhlenbeck & Ornstein, Phys. Rev. 36, 823 (1930): C(t) = exp(−|t|/τ)."""
    x = ornstein_uhlenbeck(np.random.default_rng(11), 1000, 300, 12.0)
    hold(per_body(x, 60), np.exp(-abs(np.arange(-60, 61)) / 12.0))


def test_errors_of_one_start_cover_the_truth():
    """Blocks of origins: 300 records of 100 correlation times each, truth e^(−t/τ).

    The mean squared deviation over the mean squared error is 1; blocks of some three correlation
    times are a little too short, and the largest of two estimates is a little too large. The
    scatter of the ratio is about 10 %.
    """
    x = ornstein_uhlenbeck(np.random.default_rng(12), 1200, 300, 12.0)
    lags = [0, 12, 24]
    deviation, error = [], []
    for body in range(x.shape[1]):
        one = x[:, [body]]
        sums = lagged_sums([(one, one)], 24, 32)
        c = sums.joined().correlation()[0, 24:, 0, 0][lags]
        deviation.append(c - np.exp(-np.array(lags) / 12.0))
        error.append(_blocked(sums.correlation()[..., 0])[24:, 0][lags])
    ratio = np.mean(np.square(deviation), axis=0) / np.mean(np.square(error), axis=0)
    assert (ratio > 0.7).all() and (ratio < 1.45).all(), ratio


def test_a_turning_vector_has_c_xy_of_the_right_sign():
    """Counter-clockwise seen against z, phases spread evenly: C_xy = ½ sin Ωt, C_xx = ½ cos Ωt."""
    times, rate = 0.05 * np.arange(200), 1.7
    phase = 2 * np.pi * np.arange(8) / 8
    angle = rate * times[:, None] + phase
    a = np.stack([np.cos(angle), np.sin(angle), np.zeros_like(angle)], axis=-1)
    c = lagged_sums([(a, a)], 80).correlation()[0]
    t = 0.05 * np.arange(-80, 81)
    np.testing.assert_allclose(c[:, 0, 1], 0.5 * np.sin(rate * t), atol=1e-12)
    np.testing.assert_allclose(c[:, 1, 0], -0.5 * np.sin(rate * t), atol=1e-12)
    np.testing.assert_allclose(c[:, 0, 0], 0.5 * np.cos(rate * t), atol=1e-12)


def second_rank(u):
    """(..., 5) whose scalar product is P2 of the angle."""
    x, y, z = np.moveaxis(u, -1, 0)
    root = np.sqrt(3.0)
    return np.stack([root * x * y, root * y * z, root * x * z, root / 2 * (x * x - y * y),
                     1.5 * z * z - 0.5], axis=-1)


def test_free_linear_rotor():
    """C1 = ⟨cos ωt⟩ and C2 = ¼ + ¾⟨cos 2ωt⟩ over ω exp(−ω²/2); C1 = 1 − √2 t D(t/√2) too."""
    random = np.random.default_rng(13)
    bodies, times = 4000, 0.1 * np.arange(60)
    first = random.normal(size=(bodies, 3))
    first /= np.linalg.norm(first, axis=1)[:, None]
    spin = np.cross(first, random.normal(size=(bodies, 3)))  # two thermal components across
    rate = np.linalg.norm(spin, axis=1)
    second = np.cross(spin / rate[:, None], first)
    angle = times[:, None, None] * rate[:, None]
    u = np.cos(angle) * first + np.sin(angle) * second
    lags = 0.1 * np.arange(-40, 41)

    def thermal(t):
        return integrate.quad(lambda w: w * np.exp(-w * w / 2) * np.cos(w * t), 0, 40,
                              limit=400)[0]

    exact = np.array([thermal(abs(t)) for t in lags])
    np.testing.assert_allclose(exact, 1 - np.sqrt(2) * abs(lags)
                               * special.dawsn(abs(lags) / np.sqrt(2)), atol=1e-9)
    hold(per_body(u, 40), exact)
    twice = np.array([thermal(abs(2 * t)) for t in lags])
    hold(per_body(second_rank(u), 40), 0.25 + 0.75 * twice)


def free_tops(random, inertia, bodies, frames, step, inner):
    """Orientations (frames, bodies, 4) and ω of thermal free tops, Euler's equations by RK4."""
    def slope(q, w):
        torque_free = np.cross(inertia * w, w) / inertia
        turn = np.concatenate([np.zeros((len(w), 1)), w], axis=1)
        return 0.5 * multiply(q, turn), torque_free

    q = random.normal(size=(bodies, 4))
    q /= np.linalg.norm(q, axis=1)[:, None]
    w = random.normal(size=(bodies, 3)) / np.sqrt(inertia)
    h, kept = step / inner, [(q, w)]
    for _ in range(frames - 1):
        for _ in range(inner):
            k1 = slope(q, w)
            k2 = slope(q + h / 2 * k1[0], w + h / 2 * k1[1])
            k3 = slope(q + h / 2 * k2[0], w + h / 2 * k2[1])
            k4 = slope(q + h * k3[0], w + h * k3[1])
            q = q + h / 6 * (k1[0] + 2 * k2[0] + 2 * k3[0] + k4[0])
            w = w + h / 6 * (k1[1] + 2 * k2[1] + 2 * k3[1] + k4[1])
        kept.append((q, w))
    return [np.array(each) for each in zip(*kept, strict=True)]


def test_free_spherical_top():
    """C1 = ⅓ + ⅔(1 − t²)e^(−t²/2), C2 = ⅕[1 + 2(1 − t²)e^(−t²/2) + 2(1 − 4t²)e^(−2t²)]."""
    q, _ = free_tops(np.random.default_rng(14), np.ones(3), 3000, 40, 0.1, 2)
    u = rotation_matrix(q)[..., 2]
    t = 0.1 * np.arange(-30, 31)
    one, two = (1 - t**2) * np.exp(-t**2 / 2), (1 - 4 * t**2) * np.exp(-2 * t**2)
    hold(per_body(u, 30), 1 / 3 + 2 / 3 * one, RUNGE_KUTTA)
    hold(per_body(second_rank(u), 30), 0.2 * (1 + 2 * one + 2 * two), RUNGE_KUTTA)


def test_free_asymmetric_top_at_short_times():
    """C1 of body z to fourth order, 1 − ½⟨u̇²⟩t² + ⟨ü²⟩t⁴/24, by averages of Euler's equations.

    With s = 1/I: ⟨u̇²⟩ = sx + sy, and of ü = ω̇×u + ω×(ω×u) in the body frame
    ⟨ü²⟩ = ⟨ω̇x² + ω̇y²⟩ + ⟨ω²(ωx² + ωy²)⟩ + 2⟨ω̇y ωx ωz − ω̇x ωy ωz⟩.
    """
    inertia = np.array([1.0, 1.7, 2.3])
    (ix, iy, iz), (sx, sy, sz) = inertia, 1 / inertia
    bend, twist = (iy - iz) / ix, (iz - ix) / iy  # ω̇x = bend ωy ωz, ω̇y = twist ωz ωx
    fourth = (bend**2 * sy * sz + twist**2 * sx * sz
              + 3 * sx**2 + 3 * sy**2 + 2 * sx * sy + sz * (sx + sy)
              + 2 * (twist * sx * sz - bend * sy * sz))
    q, w = free_tops(np.random.default_rng(15), inertia, 4000, 13, 0.05, 1)
    u = rotation_matrix(q)[..., 2]
    hold(per_body(u, 4), 1 - 0.5 * (sx + sy) * (t := 0.05 * np.arange(-4, 5))**2
         + fourth * t**4 / 24, 0.1 * fourth * 0.2**6)
    # Around one origin the second order of each body is known: what is left is the fourth.
    c = np.array([np.einsum("tpp->t", locked_sums([(u[:, [n]], u[:, [n]])], [6]).correlation()[0])
                  for n in range(u.shape[1])])
    t = 0.05 * np.arange(-6, 7)
    rest = c - 1 + 0.5 * (w[6, :, 0]**2 + w[6, :, 1]**2)[:, None] * t**2
    even = 0.5 * (rest + rest[:, ::-1])
    hold(even, fourth * t**4 / 24, RUNGE_KUTTA + 0.1 * fourth * t**6)
    error = even[:, 0].std(ddof=1) / np.sqrt(len(even))
    assert even[:, 0].mean() > 10 * error
