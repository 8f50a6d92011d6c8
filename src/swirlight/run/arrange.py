"""A first arrangement of the bodies: a lattice, drawn orientations, overlaps removed.

The lattice is face-centred and fills the box; where it has more sites than there are bodies
the vacancies are drawn, and so is which species sits where. Orientations are uniform. Bodies
that then overlap are moved apart by steepest descent whose moves are capped, because forces
at overlap are large beyond all meaning.
"""

import numpy as np

from swirlight.errors import RunError
from swirlight.rotation import from_vector, multiply, normalised
from swirlight.units import BOLTZMANN

_FACE_CENTRED = np.array([[0, 0, 0], [0, 0.5, 0.5], [0.5, 0, 0.5], [0.5, 0.5, 0]]) + 0.25
LARGEST_MOVE = 0.01  # nm, of any site in one descent step
DESCENT_STEPS = 400
ENOUGH = 0.1  # kT a body: a descent that gains less than this in `PATIENCE` steps is over
PATIENCE = 20


def lattice_positions(counts, box, random):
    """Sites of a face-centred lattice that fills the box, for species after species. [nm]

    The bodies of a species are numbered along the lattice: neighbours in space are near each
    other in memory, which large systems are faster for.

    counts : bodies of each species, or one number. box : (3,) edges. [nm]
    random : numpy Generator; draws the vacancies, and which species sits where.
    Returns (sum of the counts, 3).
    """
    counts = np.atleast_1d(counts)
    cells = _cells(counts.sum(), box)
    corners = np.stack(np.meshgrid(*map(np.arange, cells), indexing="ij"), axis=-1).reshape(-1, 3)
    sites = (corners[:, None, :] + _FACE_CENTRED).reshape(-1, 3) / cells * box
    chosen = random.permutation(len(sites))[: counts.sum()]
    of_species = np.split(chosen, np.cumsum(counts)[:-1])
    return sites[np.concatenate([np.sort(part) for part in of_species])]


def _cells(count, box):
    """Cells along each edge: few, nearly cubic, and enough for `count` bodies."""
    ideal = box * (count / 4.0 / np.prod(box)) ** (1 / 3)
    near = [range(max(1, int(np.floor(x)) - 1), int(np.ceil(x)) + 2) for x in ideal]
    enough = [
        (a, b, c) for a in near[0] for b in near[1] for c in near[2] if 4 * a * b * c >= count
    ]
    skew = [np.ptp(np.log(np.array(n) / ideal)) for n in enough]
    waste = [4 * np.prod(n) / count - 1 for n in enough]
    return np.array(enough[int(np.argmin(np.add(waste, skew)))])


def remove_overlaps(system, state, field):
    """Descend in energy, moving `state` in place, until little is gained; return the energy.

    field : a ForceField of the system.
    Raises RunError when the energy stays meaningless: the density is too high for the bodies.
    """
    reach = np.array([max(s.radius, 0.05) for s in system.species])[system.species_of, None]
    scale, history = 1e-6, []
    forces = field.evaluate(state.position, state.orientation, state.box, energies=True)
    # Sites on top of each other have forces without a value: their bodies wait for the others.
    energy = forces.energy if np.isfinite(forces.energy) else np.inf
    force, torque = np.nan_to_num(forces.force), np.nan_to_num(forces.torque)
    for _ in range(DESCENT_STEPS):
        move = _capped(scale * force)
        # a rotation moves the outermost site by angle times reach
        turn = _capped(scale * torque / reach) / reach
        position = state.position + move
        orientation = normalised(multiply(from_vector(turn), state.orientation))
        forces = field.evaluate(position, orientation, state.box, energies=True)
        if np.isfinite(forces.energy) and forces.energy < energy:
            state.position[:], state.orientation[:] = position, orientation
            energy = forces.energy
            force, torque = np.nan_to_num(forces.force), np.nan_to_num(forces.torque)
            scale *= 1.3
            history.append(energy)
            if len(history) > PATIENCE and _gained_little(history, system):
                break
        else:
            scale *= 0.4
            if scale < 1e-14:
                break
    if not np.isfinite(energy) or np.abs(force).max() > 1e6:
        raise RunError(
            "the bodies cannot be packed at this density without overlap: the largest force"
            f" left is {np.abs(force).max():.1e} kJ/mol/nm; lower the density"
        )
    return energy


def _gained_little(history, system):
    enough = ENOUGH * BOLTZMANN * system.temperature * system.bodies
    return history[-1 - PATIENCE] - history[-1] < enough


def _capped(step):
    length = np.linalg.norm(step, axis=1, keepdims=True)
    return step * np.minimum(1.0, LARGEST_MOVE / np.maximum(length, 1e-300))
