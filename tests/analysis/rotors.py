"""Independent rotors moved by the engine, and their linear response from the dark, body by body.

Without interactions each body is a start of its own: kernels are averaged over bodies, and
errors come from the spread over bodies. kT = 1, moments (1, 1.7, 2.3), Langevin γ = 0.4, a
Gaussian pulse of FWHM 1.5 at t = 2.5. The tensors are invented.
"""

import numpy as np

from swirlight.analysis import kubo
from swirlight.light.envelope import Gaussian
from swirlight.light.light import Light
from swirlight.light.pulse import Pulse
from swirlight.light.schedule import make_block
from swirlight.motion.step import Mover
from swirlight.motion.thermostats import make_thermostat
from swirlight.units import BOLTZMANN

from ..motion.bodies import body, response, system, thermal

INERTIA = np.array([1.0, 1.7, 2.3])
ALPHA_S = np.array([[1.0, 0.3, -0.2], [0.3, 1.6, 0.4], [-0.2, 0.4, 2.5]])
ALPHA_D = np.array([[0.9, 0.2, 0.1], [0.2, 0.5, -0.1], [0.1, -0.1, 1.3]])
GYRATION = np.array([0.5, -0.4, 0.8])
FRICTION, STEP, EVERY = 0.4, 0.02, 4  # EVERY: steps from frame to frame
INTERVAL = STEP * EVERY
Z = np.array([0.0, 0.0, 1.0])
OPTICAL = 2354.6  # rad/ps: averaged


def rotors(count, alpha=0.0, absorptive=0.0, gyration=(0, 0, 0)):
    """A system of bodies without interactions at kT = 1."""
    species = body(INERTIA, response=response(alpha, absorptive, gyration))
    return system((species, count), temperature=1 / BOLTZMANN)


def optical(strength, ellipticity=np.pi / 4):
    """A pulse with |𝓔|² = strength at its peak."""
    return Pulse(OPTICAL, np.sqrt(strength), Gaussian(1.5), 2.5, ellipticity=ellipticity)


def travel(bodies, pulses, length, seed, friction=FRICTION, step=STEP, watch=None):
    """Orientations (N, T, 4) and angular momenta (N, T, 3), or what `watch(mover, state)` gives.

    Bodies and noise depend on the seed only: runs of one seed are twins.
    """
    state = thermal(bodies, seed)
    bath = make_thermostat(bodies, "langevin", friction=friction)
    mover = Mover(bodies, None, Light(bodies, pulses), step, bath)
    mover.begin(state)
    seen = []
    for n in range(round(length / step) + 1):
        if n % EVERY == 0:
            seen.append(watch(mover, state) if watch else
                        (state.orientation.copy(), state.angular_momentum.copy()))
        mover.advance(state, energies=False)
    if watch:
        return np.array(seen)
    return tuple(np.array(x).swapaxes(0, 1) for x in zip(*seen, strict=True))


def body_by_body(orientation, momentum, inertia=INERTIA):
    """R (N, T, 1, 3, 3) and ω: sums over one body each."""
    inverse = np.divide(1.0, inertia, out=np.zeros(3), where=np.asarray(inertia) > 0)
    return kubo.rotation_and_spin(orientation[:, :, None], momentum[:, :, None], inverse)


def fields(pulses, length, step=STEP):
    """The FieldBlock of averaged pulses at the frames."""
    times = step * EVERY * np.arange(round(length / step) // EVERY + 1)
    return make_block(times, [(p,) for p in pulses], [], None)


def mean_and_error(values):
    """Over bodies, (N, ...)."""
    return values.mean(axis=0), values.std(axis=0, ddof=1) / np.sqrt(len(values))


def along(tensor, quantity):
    """Per body z components of R v, or zz of R a Rᵀ without its trace: function of R."""
    if tensor:
        return lambda turn: kubo.tensor_sum(turn, quantity)[..., 2, 2]
    return lambda turn: kubo.vector_sum(turn, quantity)[..., 2]
