"""The tree as one dense nodal matrix, and one cylinder by 40-digit quadrature of its definition.

Sign convention: port currents flow from the node into the cylinder; Norton noise currents J flow into the
node. Then A V = J with A the sum of shunts and port admittances, Z = A^-1, and the voltage covariance is P
= Z W Z^H with W = E[J J^H].
"""

from collections.abc import Callable

import mpmath as mp
import numpy as np

from .plain import Cell


def nodal_matrices(shunt_nS, edges, port_admittance_nS, edge_noise, node_noise):
    """Add everything into dense matrices, one number after another.

    shunt_nS (F, N): admittance from node to rest.  edges (E, 2): nodes (a, b) of each two-port.
    port_admittance_nS (F, E, 2, 2).  edge_noise (F, E, 2, 2): E[J J^H] at the two ports.  node_noise (F, N).
    Returns A (F, N, N) and W (F, N, N).
    """
    F, N = np.shape(shunt_nS)
    A = np.zeros((F, N, N), dtype=complex)
    W = np.zeros((F, N, N), dtype=complex)
    for f in range(F):
        for i in range(N):
            A[f, i, i] += shunt_nS[f][i]
            W[f, i, i] += node_noise[f][i]
        for e, nodes in enumerate(edges):
            for p in range(2):
                for q in range(2):
                    A[f, nodes[p], nodes[q]] += port_admittance_nS[f][e][p][q]
                    W[f, nodes[p], nodes[q]] += edge_noise[f][e][p][q]
    return A, W


def impedance_and_covariance(A, W):
    """Z = A^-1 (F, N, N) in GOhm and P = Z W Z^H (F, N, N) in mV2 per unit of W."""
    Z = np.linalg.inv(A)
    return Z, Z @ W @ np.conj(np.swapaxes(Z, 1, 2))


def cylinder_two_port_mp(R_GOhm, Y_nS, digits: int = 40):
    """(Y11, Y12) of a uniform cylinder of total axial resistance R and total membrane admittance Y.

    Solves V'' = R Y V on 0 <= u <= 1 with the ports at (1, 0): the current into port a is -V'(0)/R, into b
    it is V'(1)/R. Rall 1959 Exp Neurol 1:491 (from memory). Returns two mpc; the cylinder is symmetric, Y22
    = Y11.
    """
    with mp.workdps(digits):
        x = mp.sqrt(mp.mpmathify(R_GOhm) * mp.mpmathify(Y_nS))
        return x * mp.coth(x) / R_GOhm, -x * mp.csch(x) / R_GOhm


def cell_impedance_GOhm(cell: Cell, s_per_ms: complex) -> np.ndarray:
    """Impedance matrix (N, N) of a plain cell at Laplace frequency s (i omega for a spectrum)."""
    edges, ports = [], []
    shunt = np.zeros(cell.node_count, dtype=complex)
    for sphere in cell.spheres:
        shunt[sphere.node] += sphere.leak_nS + s_per_ms * sphere.capacitance_pF
    for c in cell.cylinders:
        self_nS, mutual_nS = cylinder_two_port_mp(c.axial_GOhm, c.leak_nS + s_per_ms * c.capacitance_pF)
        edges.append((c.parent, c.child))
        ports.append([[complex(self_nS), complex(mutual_nS)], [complex(mutual_nS), complex(self_nS)]])
    none = np.zeros((1, len(edges), 2, 2))
    A, W = nodal_matrices([shunt], edges, [ports], none, np.zeros((1, cell.node_count)))
    return impedance_and_covariance(A, W)[0][0]


def _breaks(x) -> list:
    """Interval ends fine enough for sinh(x u): layers of 1/Re x at both ends, the phase Im x between."""
    alpha, beta = abs(mp.re(x)), abs(mp.im(x))
    points = {mp.mpf(k) / (int(beta) + 2) for k in range(int(beta) + 3)}
    if alpha > 1:
        layer = [k / alpha for k in (1, 2, 4, 7, 11, 16, 22, 29, 37, 46, 60, 80) if k / alpha < 1]
        points |= set(layer) | {1 - u for u in layer}
    return sorted(points)


def cylinder_noise_mp(x, profile: Callable = lambda u: mp.mpf(1), digits: int = 40):
    """E|J_a|^2, E|J_b|^2 and E[J_a J_b*], each divided by (spectrum per length) times length.

    J_a = int i(s) sinh gamma(l - s)/sinh gamma l ds and J_b = int i(s) sinh gamma s/sinh gamma l ds, with x
    = gamma l and i white in space, of spectrum q profile(s/l) per length. Returns mpf, mpf, mpc.
    """
    with mp.workdps(digits + 10):
        x = mp.mpmathify(x)

        def to_a(u):
            return mp.sinh(x * (1 - u)) / mp.sinh(x)

        def to_b(u):
            return mp.sinh(x * u) / mp.sinh(x)

        ends = _breaks(x)
        aa = mp.quad(lambda u: profile(u) * abs(to_a(u)) ** 2, ends)
        bb = mp.quad(lambda u: profile(u) * abs(to_b(u)) ** 2, ends)
        ab = mp.quad(lambda u: profile(u) * to_a(u) * mp.conj(to_b(u)), ends)
        return aa, bb, ab


def cylinder_coherent_mp(x, profile: Callable = lambda u: mp.mpf(1), digits: int = 40):
    """Port currents (J_a, J_b) of a density that is the same random function everywhere, per q l; two mpc.

    With a flat profile both are tanh(x/2)/x.
    """
    with mp.workdps(digits + 10):
        x = mp.mpmathify(x)
        ends = _breaks(x)
        a = mp.quad(lambda u: profile(u) * mp.sinh(x * (1 - u)) / mp.sinh(x), ends)
        b = mp.quad(lambda u: profile(u) * mp.sinh(x * u) / mp.sinh(x), ends)
        return a, b
