"""Kernels: torques, absorbed power and energies of rigid bodies in given fields.

Averaged light, per body, with S = Re 𝓔𝓔† and G = i 𝓔×𝓔* turned into the body frame:

    torque  τ_k = ½ ε_kij (α_S S)_ij  +  ¼ g×G  +  ¼ (Tr α_D − α_D) G
    energy  −¼ α_S:S − ¼ g·G          absorbed power  ½ ω α_D:S

which is τ = ½ Re[(α e)×e*], P = ½ ω Im[e*·α e] for α_jl = α_S + iα_D − iε_jlm g_m.
Rectification: a dipole p0 = κG (body frame) that feels the static field only.

Carrier-resolved light, with D = Ė/ω of each colour (narrow-band form of absorption and
gyration): p = μ + Σ_c (α_S E_c − α_D D_c − g×D_c), τ = p×E, absorbed power Σ_c ω_c D_c·α_D D_c
(∫ of it is ∫ E·ṗ of the α_D part).

All arrays are float64 and C-contiguous, in internal units; nothing is checked here. Bodies of
species k are rows first[k]:first[k+1]. `optics` rows are those of `response.optics_table`.
`free` is 0 for body axes about which no torque acts. Loops run over one species at a time
without branches, so they vectorise; sums run in a fixed order on one thread. Reassociation
(`fast`) makes the torques 15 % cheaper.
"""

from swirlight.compiled import kernel
from swirlight.rotation_kernels import matrix_entries


@kernel
def _rotation(q):
    """The nine entries of R (body to laboratory), row by row, of one unit quaternion."""
    return matrix_entries(q[0], q[1], q[2], q[3])


@kernel(fast=True)
def averaged_torque(orientation, first, free, optics, omega, rows, torque):
    """Add the torque of averaged light to `torque` (N, 3); return Σ absorbed power.

    optics : (groups, species, 24). omega : (groups,) carriers. rows : (groups, 9) S and G.
    """
    power = 0.0
    for c in range(rows.shape[0]):
        sxx, syy, szz, sxy, sxz, syz = (
            rows[c, 0], rows[c, 1], rows[c, 2], rows[c, 3], rows[c, 4], rows[c, 5])
        gx, gy, gz = rows[c, 6], rows[c, 7], rows[c, 8]
        for k in range(first.shape[0] - 1):
            o = optics[c, k]
            axy, axz, ayz = 0.5 * o[3], 0.5 * o[4], 0.5 * o[5]
            dyz, dzx, dxy = 0.5 * (o[1] - o[2]), 0.5 * (o[2] - o[0]), 0.5 * (o[0] - o[1])
            # odd part: one matrix, ¼ (g× + Tr α_D − α_D)
            mxx, myy, mzz = (
                0.25 * (o[10] + o[11]), 0.25 * (o[9] + o[11]), 0.25 * (o[9] + o[10]))
            mxy, mxz, myz = 0.25 * (-o[8] - o[12]), 0.25 * (o[7] - o[13]), 0.25 * (-o[6] - o[14])
            myx, mzx, mzy = 0.25 * (o[8] - o[12]), 0.25 * (-o[7] - o[13]), 0.25 * (o[6] - o[14])
            pxx, pyy, pzz, pxy, pxz, pyz = o[9], o[10], o[11], 2.0 * o[12], 2.0 * o[13], 2.0 * o[14]
            fx, fy, fz = free[k, 0], free[k, 1], free[k, 2]
            absorbed = 0.0
            for i in range(first[k], first[k + 1]):
                r00, r01, r02, r10, r11, r12, r20, r21, r22 = _rotation(orientation[i])
                # columns of S R, then Rᵀ S R
                ax, ay, az = (sxx * r00 + sxy * r10 + sxz * r20, sxy * r00 + syy * r10 + syz * r20,
                              sxz * r00 + syz * r10 + szz * r20)
                bx, by, bz = (sxx * r01 + sxy * r11 + sxz * r21, sxy * r01 + syy * r11 + syz * r21,
                              sxz * r01 + syz * r11 + szz * r21)
                cx, cy, cz = (sxx * r02 + sxy * r12 + sxz * r22, sxy * r02 + syy * r12 + syz * r22,
                              sxz * r02 + syz * r12 + szz * r22)
                xx = r00 * ax + r10 * ay + r20 * az
                yy = r01 * bx + r11 * by + r21 * bz
                zz = r02 * cx + r12 * cy + r22 * cz
                xy = r00 * bx + r10 * by + r20 * bz
                xz = r00 * cx + r10 * cy + r20 * cz
                yz = r01 * cx + r11 * cy + r21 * cz
                hx = r00 * gx + r10 * gy + r20 * gz
                hy = r01 * gx + r11 * gy + r21 * gz
                hz = r02 * gx + r12 * gy + r22 * gz
                tx = axy * xz - axz * xy + dyz * yz + ayz * (zz - yy)
                ty = ayz * xy - axy * yz + dzx * xz + axz * (xx - zz)
                tz = axz * yz - ayz * xz + dxy * xy + axy * (yy - xx)
                tx = fx * (tx + (mxx * hx + mxy * hy + mxz * hz))
                ty = fy * (ty + (myx * hx + myy * hy + myz * hz))
                tz = fz * (tz + (mzx * hx + mzy * hy + mzz * hz))
                torque[i, 0] += r00 * tx + r01 * ty + r02 * tz
                torque[i, 1] += r10 * tx + r11 * ty + r12 * tz
                torque[i, 2] += r20 * tx + r21 * ty + r22 * tz
                absorbed += pxx * xx + pyy * yy + pzz * zz + pxy * xy + pxz * xz + pyz * yz
            power += 0.5 * omega[c] * absorbed
    return power


@kernel(fast=True)
def resolved_torque(orientation, first, free, optics, omega, dipole, rows, torque):
    """Add the torque of carrier-resolved light to `torque` (N, 3); return Σ absorbed power.

    dipole : (species, 3) body frame. rows : (colours, 6) E and Ė/ω of each colour.
    """
    ex, ey, ez = 0.0, 0.0, 0.0
    for c in range(rows.shape[0]):
        ex, ey, ez = ex + rows[c, 0], ey + rows[c, 1], ez + rows[c, 2]
    power = 0.0
    for c in range(rows.shape[0]):
        lx, ly, lz, dx, dy, dz = (
            rows[c, 0], rows[c, 1], rows[c, 2], rows[c, 3], rows[c, 4], rows[c, 5])
        permanent = 1.0 if c == 0 else 0.0  # the dipole meets the whole field once
        for k in range(first.shape[0] - 1):
            o = optics[c, k]
            axx, ayy, azz, axy, axz, ayz = o[0], o[1], o[2], o[3], o[4], o[5]
            gx, gy, gz = o[6], o[7], o[8]
            bxx, byy, bzz, bxy, bxz, byz = o[9], o[10], o[11], o[12], o[13], o[14]
            mx, my, mz = (
                permanent * dipole[k, 0], permanent * dipole[k, 1], permanent * dipole[k, 2])
            fx, fy, fz = free[k, 0], free[k, 1], free[k, 2]
            absorbed = 0.0
            for i in range(first[k], first[k + 1]):
                r00, r01, r02, r10, r11, r12, r20, r21, r22 = _rotation(orientation[i])
                ux, uy, uz = (r00 * ex + r10 * ey + r20 * ez, r01 * ex + r11 * ey + r21 * ez,
                              r02 * ex + r12 * ey + r22 * ez)
                vx, vy, vz = (r00 * lx + r10 * ly + r20 * lz, r01 * lx + r11 * ly + r21 * lz,
                              r02 * lx + r12 * ly + r22 * lz)
                wx, wy, wz = (r00 * dx + r10 * dy + r20 * dz, r01 * dx + r11 * dy + r21 * dz,
                              r02 * dx + r12 * dy + r22 * dz)
                hx = bxx * wx + bxy * wy + bxz * wz
                hy = bxy * wx + byy * wy + byz * wz
                hz = bxz * wx + byz * wy + bzz * wz
                px = mx + axx * vx + axy * vy + axz * vz - hx - (gy * wz - gz * wy)
                py = my + axy * vx + ayy * vy + ayz * vz - hy - (gz * wx - gx * wz)
                pz = mz + axz * vx + ayz * vy + azz * vz - hz - (gx * wy - gy * wx)
                tx = fx * (py * uz - pz * uy)
                ty = fy * (pz * ux - px * uz)
                tz = fz * (px * uy - py * ux)
                torque[i, 0] += r00 * tx + r01 * ty + r02 * tz
                torque[i, 1] += r10 * tx + r11 * ty + r12 * tz
                torque[i, 2] += r20 * tx + r21 * ty + r22 * tz
                absorbed += wx * hx + wy * hy + wz * hz
            power += omega[c] * absorbed
    return power


@kernel(fast=True)
def dipole_torque(orientation, first, free, dipole, field, torque):
    """Add μ×F of a static field (3,) to `torque` (N, 3). dipole : (species, 3)."""
    ex, ey, ez = field[0], field[1], field[2]
    for k in range(first.shape[0] - 1):
        mx, my, mz = dipole[k, 0], dipole[k, 1], dipole[k, 2]
        fx, fy, fz = free[k, 0], free[k, 1], free[k, 2]
        for i in range(first[k], first[k + 1]):
            r00, r01, r02, r10, r11, r12, r20, r21, r22 = _rotation(orientation[i])
            ux, uy, uz = (r00 * ex + r10 * ey + r20 * ez, r01 * ex + r11 * ey + r21 * ez,
                          r02 * ex + r12 * ey + r22 * ez)
            tx = fx * (my * uz - mz * uy)
            ty = fy * (mz * ux - mx * uz)
            tz = fz * (mx * uy - my * ux)
            torque[i, 0] += r00 * tx + r01 * ty + r02 * tz
            torque[i, 1] += r10 * tx + r11 * ty + r12 * tz
            torque[i, 2] += r20 * tx + r21 * ty + r22 * tz


@kernel(fast=True)
def rectified(orientation, first, free, optics, rows, field, torque, total):
    """Add p0×F to `torque` (N, 3) and Σ p0, laboratory frame, to `total` (3,); p0 = Σ_c κ_c G_c.

    rows : (groups, 9) as in `averaged_torque`. field : (3,) static.
    """
    ex, ey, ez = field[0], field[1], field[2]
    for c in range(rows.shape[0]):
        gx, gy, gz = rows[c, 6], rows[c, 7], rows[c, 8]
        for k in range(first.shape[0] - 1):
            kxx, kxy, kxz, kyx, kyy, kyz, kzx, kzy, kzz = (
                optics[c, k, 15], optics[c, k, 16], optics[c, k, 17], optics[c, k, 18],
                optics[c, k, 19], optics[c, k, 20], optics[c, k, 21], optics[c, k, 22],
                optics[c, k, 23])
            fx, fy, fz = free[k, 0], free[k, 1], free[k, 2]
            for i in range(first[k], first[k + 1]):
                r00, r01, r02, r10, r11, r12, r20, r21, r22 = _rotation(orientation[i])
                hx, hy, hz = (r00 * gx + r10 * gy + r20 * gz, r01 * gx + r11 * gy + r21 * gz,
                              r02 * gx + r12 * gy + r22 * gz)
                ux, uy, uz = (r00 * ex + r10 * ey + r20 * ez, r01 * ex + r11 * ey + r21 * ez,
                              r02 * ex + r12 * ey + r22 * ez)
                px = kxx * hx + kxy * hy + kxz * hz
                py = kyx * hx + kyy * hy + kyz * hz
                pz = kzx * hx + kzy * hy + kzz * hz
                tx = fx * (py * uz - pz * uy)
                ty = fy * (pz * ux - px * uz)
                tz = fz * (px * uy - py * ux)
                torque[i, 0] += r00 * tx + r01 * ty + r02 * tz
                torque[i, 1] += r10 * tx + r11 * ty + r12 * tz
                torque[i, 2] += r20 * tx + r21 * ty + r22 * tz
                total[0] += r00 * px + r01 * py + r02 * pz
                total[1] += r10 * px + r11 * py + r12 * pz
                total[2] += r20 * px + r21 * py + r22 * pz


@kernel
def collective(orientation, first, optics, out):
    """Sums over bodies in the laboratory frame: Σ RαSRᵀ as xx yy zz xy xz yz, then Σ Rg.

    optics : (species, 24) of one colour. out : (9,), overwritten. Both energies of the light
    are contractions of these.
    """
    out[:] = 0.0
    for k in range(first.shape[0] - 1):
        a0, a1, a2, a3, a4, a5 = (optics[k, 0], optics[k, 1], optics[k, 2], optics[k, 3],
                                  optics[k, 4], optics[k, 5])
        gx, gy, gz = optics[k, 6], optics[k, 7], optics[k, 8]
        for i in range(first[k], first[k + 1]):
            r00, r01, r02, r10, r11, r12, r20, r21, r22 = _rotation(orientation[i])
            # rows of R α
            ax, ay, az = (r00 * a0 + r01 * a3 + r02 * a4, r00 * a3 + r01 * a1 + r02 * a5,
                          r00 * a4 + r01 * a5 + r02 * a2)
            bx, by, bz = (r10 * a0 + r11 * a3 + r12 * a4, r10 * a3 + r11 * a1 + r12 * a5,
                          r10 * a4 + r11 * a5 + r12 * a2)
            cx, cy, cz = (r20 * a0 + r21 * a3 + r22 * a4, r20 * a3 + r21 * a1 + r22 * a5,
                          r20 * a4 + r21 * a5 + r22 * a2)
            out[0] += ax * r00 + ay * r01 + az * r02
            out[1] += bx * r10 + by * r11 + bz * r12
            out[2] += cx * r20 + cy * r21 + cz * r22
            out[3] += ax * r10 + ay * r11 + az * r12
            out[4] += ax * r20 + ay * r21 + az * r22
            out[5] += bx * r20 + by * r21 + bz * r22
            out[6] += r00 * gx + r01 * gy + r02 * gz
            out[7] += r10 * gx + r11 * gy + r12 * gz
            out[8] += r20 * gx + r21 * gy + r22 * gz


@kernel
def turned_sum(orientation, first, vector, out):
    """Σ over bodies of R v, laboratory frame, to `out` (3,), overwritten. vector : (species, 3)."""
    out[:] = 0.0
    for k in range(first.shape[0] - 1):
        vx, vy, vz = vector[k, 0], vector[k, 1], vector[k, 2]
        for i in range(first[k], first[k + 1]):
            r00, r01, r02, r10, r11, r12, r20, r21, r22 = _rotation(orientation[i])
            out[0] += r00 * vx + r01 * vy + r02 * vz
            out[1] += r10 * vx + r11 * vy + r12 * vz
            out[2] += r20 * vx + r21 * vy + r22 * vz
