"""What totals need of all orientations, in one pass over the bodies."""

from swirlight.compiled import kernel
from swirlight.rotation_kernels import matrix_entries


@kernel
def orientation_sums(orientation, freedom, dipole, beam):
    """Σ R μ in three numbers; Σ cos θ, Σ cos² θ and the number of bodies that can turn.

    orientation : (N, 4). freedom : (N,), 0 of atoms, which do not count. dipole : (N, 3), body
    frame. beam : (3,); θ lies between it and body z.
    """
    mx, my, mz = 0.0, 0.0, 0.0
    first, second, count = 0.0, 0.0, 0
    for i in range(orientation.shape[0]):
        r00, r01, r02, r10, r11, r12, r20, r21, r22 = matrix_entries(
            orientation[i, 0], orientation[i, 1], orientation[i, 2], orientation[i, 3])
        x, y, z = dipole[i, 0], dipole[i, 1], dipole[i, 2]
        mx += r00 * x + r01 * y + r02 * z
        my += r10 * x + r11 * y + r12 * z
        mz += r20 * x + r21 * y + r22 * z
        if freedom[i] > 0:
            cosine = r02 * beam[0] + r12 * beam[1] + r22 * beam[2]
            first += cosine
            second += cosine * cosine
            count += 1
    return mx, my, mz, first, second, count
