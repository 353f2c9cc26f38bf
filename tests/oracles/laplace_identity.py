"""Covariances without a frequency integral, for any tree whose events fall in proportion to capacitance.

Let Z(s) be the transfer impedance at real Laplace frequency s, and D = (events per pF and ms) charge^2.
Because Z(i omega) - Z(-i omega) = -2 i omega int c Z Z* over the membrane, the voltage spectrum between any
two points is -(D/omega) |k|^2 Im Z(i omega), and closing the contour in the right half plane leaves only
the kernel's poles:
    delta             (D/2) Z(0)
    exponential       (D/2) [Z(0) - Z(1/tau)]
    two exponentials  (D/2) [Z(0) - (b^2 Z(1/b) - a^2 Z(1/a))/(b^2 - a^2)]
    alpha             (D/2) [Z(0) - Z(1/a) + Z'(1/a)/(2a)]
Derived, verified by two computations. The leak may vary from cylinder to cylinder. A tonic conductance is
part of the leak, and a conductance event at a uniform mean voltage carries the charge (area) times (E -
Vbar).
"""

import numpy as np
from scipy.sparse import csc_array
from scipy.sparse.linalg import splu

from .plain import Cell


def _parts(cell: Cell, s: float):
    """Per cylinder its ends, x, capacitance, bridge = x csch x / R, ground = x tanh(x/2) / R; node shunts."""
    a = np.array([c.parent for c in cell.cylinders], dtype=int)
    b = np.array([c.child for c in cell.cylinders], dtype=int)
    R = np.array([c.axial_GOhm for c in cell.cylinders])
    C = np.array([c.capacitance_pF for c in cell.cylinders])
    x = np.sqrt(R * (np.array([c.leak_nS for c in cell.cylinders]) + s * C))
    shunt = np.zeros(cell.node_count)
    capacitance = np.zeros(cell.node_count)
    for sphere in cell.spheres:
        shunt[sphere.node] += sphere.leak_nS + s * sphere.capacitance_pF
        capacitance[sphere.node] += sphere.capacitance_pF
    with np.errstate(over="ignore"):
        bridge, ground = x / np.sinh(x) / R, x * np.tanh(x / 2) / R
    return a, b, x, C, bridge, ground, shunt, capacitance


def _apply(a, b, bridge, ground, shunt, V):
    """A V written in voltage differences, which rounding does not spoil on finely cut cylinders."""
    I = shunt[:, None] * V
    across = bridge[:, None] * (V[a] - V[b])
    np.add.at(I, a, across + ground[:, None] * V[a])
    np.add.at(I, b, -across + ground[:, None] * V[b])
    return I


def transfer_impedance_GOhm(cell: Cell, s_per_ms: float, nodes: list[int]) -> np.ndarray:
    """Columns (N, k) of the impedance matrix at real s >= 0 for k chosen nodes; sparse LU, then refined."""
    a, b, _, _, bridge, ground, shunt, _ = _parts(cell, s_per_ms)
    N = cell.node_count
    everyone = np.arange(N)
    rows = np.concatenate([everyone, a, b, a, b])
    columns = np.concatenate([everyone, a, b, b, a])
    values = np.concatenate([shunt, bridge + ground, bridge + ground, -bridge, -bridge])
    factors = splu(csc_array((values, (rows, columns)), shape=(N, N)))
    unit = np.zeros((N, len(nodes)))
    unit[list(nodes), np.arange(len(nodes))] = 1.0
    Z = factors.solve(unit)
    for _ in range(3):
        Z = Z + factors.solve(unit - _apply(a, b, bridge, ground, shunt, Z))
    return Z


def _odd_series(x: np.ndarray, coefficient) -> np.ndarray:
    """sum over k >= 1 of coefficient(k) x^(2k+1)/(2k+1)!, for moderate x."""
    total = np.zeros_like(x)
    term = x.copy()
    for k in range(1, 40):
        term = term * x * x / ((2 * k) * (2 * k + 1))
        total += coefficient(k) * term
    return total


def impedance_slope_GOhm_ms(cell: Cell, s_per_ms: float, nodes: list[int]) -> np.ndarray:
    """dZ/ds (k, k) between the chosen nodes, from dZ = -Z dA Z with the cylinder's derivatives by hand.

    d(x coth x / R)/dY = (sinh 2x - 2x)/(4 x sinh^2 x),
    d(-x csch x / R)/dY = (x cosh x - sinh x)/(2 x sinh^2 x).
    """
    a, b, x, C, *_, capacitance = _parts(cell, s_per_ms)
    Z = transfer_impedance_GOhm(cell, s_per_ms, nodes)
    small = np.minimum(x, 2.0)
    large = np.clip(x, 1.0, 300.0)
    near = _odd_series(2 * small, lambda k: 1.0) / (4 * small * np.sinh(small) ** 2)
    cross = _odd_series(small, lambda k: 2.0 * k) / (2 * small * np.sinh(small) ** 2)
    near = np.where(x < 2.0, near, (np.sinh(2 * large) - 2 * large) / (4 * large * np.sinh(large) ** 2))
    near = np.where(x > 300.0, 1.0 / (2.0 * x), near)
    big = (large * np.cosh(large) - np.sinh(large)) / (2 * large * np.sinh(large) ** 2)
    cross = np.where(x < 2.0, cross, np.where(x > 300.0, 0.0, big))
    slope = (capacitance[:, None] * Z).T @ Z
    slope += ((C * near)[:, None] * Z[a]).T @ Z[a] + ((C * near)[:, None] * Z[b]).T @ Z[b]
    slope += ((C * cross)[:, None] * Z[a]).T @ Z[b] + ((C * cross)[:, None] * Z[b]).T @ Z[a]
    return -slope


def covariance_mV2(
    cell: Cell, nodes: list[int], poles_ms: tuple[float, ...], charge_fC: float, events_per_pF_ms: float
) -> np.ndarray:
    """Covariance (k, k) of the voltages at the chosen nodes."""

    def Z(s: float) -> np.ndarray:
        return transfer_impedance_GOhm(cell, s, nodes)[list(nodes)]

    half_D = 0.5 * events_per_pF_ms * charge_fC**2
    if not poles_ms:
        return half_D * Z(0.0)
    if len(poles_ms) == 1:
        return half_D * (Z(0.0) - Z(1.0 / poles_ms[0]))
    a, b = poles_ms
    if a == b:
        return half_D * (Z(0.0) - Z(1.0 / a) + impedance_slope_GOhm_ms(cell, 1.0 / a, nodes) / (2.0 * a))
    return half_D * (Z(0.0) - (b**2 * Z(1.0 / b) - a**2 * Z(1.0 / a)) / (b**2 - a**2))


def derivative_covariance_mV2_per_ms2(
    cell: Cell, nodes: list[int], poles_ms: tuple[float, ...], charge_fC: float, events_per_pF_ms: float
) -> np.ndarray:
    """Covariance (k, k) of dV/dt; the kernel needs at least one pole, for after a delta it is infinite.

    omega^2 |k|^2 of one pole is (1 - |k|^2)/tau^2; of two, the difference of the one-pole
    |k|^2 over b^2 - a^2.
    """

    def Z(s: float) -> np.ndarray:
        return transfer_impedance_GOhm(cell, s, nodes)[list(nodes)]

    if not poles_ms:
        raise ValueError("dV/dt has infinite variance after delta-shaped events")
    half_D = 0.5 * events_per_pF_ms * charge_fC**2
    if len(poles_ms) == 1:
        return half_D * Z(1.0 / poles_ms[0]) / poles_ms[0] ** 2
    a, b = poles_ms
    if a == b:
        return -half_D * impedance_slope_GOhm_ms(cell, 1.0 / a, nodes) / (2.0 * a**3)
    return half_D * (Z(1.0 / b) - Z(1.0 / a)) / (b**2 - a**2)
