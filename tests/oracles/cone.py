"""The impedance two-port of a tapering cone in closed form, by modified Bessel functions.

With r = r_near + m s the cable equation of a cone is
    d/ds( (pi r^2/Ri) dV/ds ) = 2 pi r sqrt(1 + m^2) y V,      y = 1/Rm + (Laplace s) Cm per area.
Taking r as the variable, (r^2 V')' = beta r V with beta = 2 Ri y sqrt(1 + m^2)/m^2, that is r V'' + 2 V' =
beta V. Put V = r^(-1/2) u(z), z = 2 sqrt(beta r): u obeys z^2 u'' + z u' = (z^2 + 1) u, the modified Bessel
equation of order 1. So V = r^(-1/2) [A I_1(z) + B K_1(z)], and by d/dz [I_1/z] = I_2/z, d/dz [K_1/z] =
-K_2/z,
    dV/dr = (sqrt(beta)/r) [A I_2(z) - B K_2(z)].
Derived here; the Bessel relations are DLMF 10.29.4. The axial current towards larger s is -(pi r^2/Ri) m
dV/dr.
"""

import mpmath as mp
import numpy as np


def frustum_two_port_nS(
    length_um: float,
    near_diameter_um: float,
    far_diameter_um: float,
    Rm_ohm_cm2: float,
    Ri_ohm_cm: float,
    Cm_uF_cm2: float,
    s_per_ms: complex,
    digits: int = 40,
) -> np.ndarray:
    """Port admittances (2, 2) of a frustum at Laplace frequency s (i omega for a spectrum); near port first.

    Currents flow into the frustum. The two diameters must differ; a cylinder has no taper to divide by.
    """
    if near_diameter_um == far_diameter_um:
        raise ValueError("a cone needs two different diameters")
    with mp.workdps(digits):
        near, far = mp.mpf(near_diameter_um) / 2, mp.mpf(far_diameter_um) / 2
        m = (far - near) / mp.mpf(length_um)
        y = mp.mpf(10) / Rm_ohm_cm2 + mp.mpmathify(s_per_ms) * mp.mpf(Cm_uF_cm2) / 100
        conductivity = mp.mpf(10) ** 5 / Ri_ohm_cm
        beta = 2 * y * mp.sqrt(1 + m**2) / (conductivity * m**2)
        V, slope = [], []
        for r in (near, far):
            z = 2 * mp.sqrt(beta * r)
            V.append([mp.besseli(1, z) / mp.sqrt(r), mp.besselk(1, z) / mp.sqrt(r)])
            slope.append([mp.sqrt(beta) / r * mp.besseli(2, z), -mp.sqrt(beta) / r * mp.besselk(2, z)])
        # Currents into the ports of the two solutions, times the inverse of V by hand: the two solutions
        # may differ by more powers of ten than a library inverse accepts.
        scale = conductivity * mp.pi * m
        into = [[-scale * near**2 * v for v in slope[0]], [scale * far**2 * v for v in slope[1]]]
        determinant = V[0][0] * V[1][1] - V[0][1] * V[1][0]
        Y = [(p * V[1][1] - q * V[1][0], q * V[0][0] - p * V[0][1]) for p, q in into]
        return np.array([[complex(value / determinant) for value in row] for row in Y])


def frusta_impedance_GOhm(
    pieces: list[tuple[int, int, float, float, float]],
    Rm_ohm_cm2: float,
    Ri_ohm_cm: float,
    Cm_uF_cm2: float,
    s_per_ms: complex,
    sphere_area_um2: dict[int, float] | None = None,
) -> np.ndarray:
    """Impedance matrix (N, N) of a tree of frusta (parent, child, length, near and far diameter in um)."""
    N = 1 + max(max(a, b) for a, b, *_ in pieces)
    A = np.zeros((N, N), dtype=complex)
    for node, area in (sphere_area_um2 or {}).items():
        A[node, node] += area * (10.0 / Rm_ohm_cm2 + s_per_ms * 0.01 * Cm_uF_cm2)
    for a, b, length, near, far in pieces:
        Y = frustum_two_port_nS(length, near, far, Rm_ohm_cm2, Ri_ohm_cm, Cm_uF_cm2, s_per_ms)
        A[np.ix_([a, b], [a, b])] += Y
    return np.linalg.inv(A)
