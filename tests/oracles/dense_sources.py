"""What every cylinder of a plain cell contributes to every voltage, from dense matrices and closed forms.

Noise currents are white in space on each cylinder: E|J_a|^2 and E[J_a J_b*] over their total are the two
closed forms below (derived, verified by two computations; see `dense.cylinder_noise_mp`). In double
precision they lose |x|^-2 of their digits, which cylinders of some 10 um can afford.
"""

import numpy as np

from .dense import nodal_matrices
from .plain import Cell


def frequencies(omega0_per_ms: float, step: float, count: int):
    """Nodes and weights of (1/pi) int_0^inf d omega after omega = omega0 sinh u: plain trapezoid."""
    u = step * np.arange(count)
    weights = omega0_per_ms * np.cosh(u) * step / np.pi
    weights[0] /= 2
    return omega0_per_ms * np.sinh(u), weights


def impedance_GOhm(cell: Cell, omega: float):
    """Z (N, N) at one frequency, and per cylinder (E|J_a|^2, E[J_a J_b*], tanh(x/2)/x)."""
    shunt = np.zeros(cell.node_count, dtype=complex)
    for sphere in cell.spheres:
        shunt[sphere.node] += sphere.leak_nS + 1j * omega * sphere.capacitance_pF
    edges, ports, noise = [], [], []
    for c in cell.cylinders:
        x = np.sqrt(c.axial_GOhm * (c.leak_nS + 1j * omega * c.capacitance_pF))
        own, mutual = x / np.tanh(x) / c.axial_GOhm, -x / np.sinh(x) / c.axial_GOhm
        edges.append((c.parent, c.child))
        ports.append([[own, mutual], [mutual, own]])
        al, be = x.real, x.imag
        size = abs(np.sinh(x)) ** 2
        self_noise = (np.sinh(2 * al) / (4 * al) - np.sinc(2 * be / np.pi) / 2) / size
        cross_noise = 0.5 * (np.cosh(al) * np.sinc(be / np.pi) - np.sinh(al) * np.cos(be) / al) / size
        noise.append((self_noise, cross_noise, np.tanh(x / 2) / x))
    none = np.zeros((1, len(edges), 2, 2))
    A, _ = nodal_matrices([shunt], edges, [ports], none, np.zeros((1, cell.node_count)))
    return np.linalg.inv(A[0]), noise


def contributions(cell: Cell, omega: float, site: int, events: list, correlation: float):
    """Per cylinder, its share of the two-sided spectrum at node `site`: one loop, one cylinder at a time.

    events: per cylinder, sqrt(rate) times the number of synapses times the charge's transform, and the same with the
    square root of the number (so that its square is the spectrum of the independent currents).
    """
    Z, noise = impedance_GOhm(cell, omega)
    together = [
        amplitude * share * (Z[site, c.parent] + Z[site, c.child])
        for c, (amplitude, _), (_, _, share) in zip(cell.cylinders, events, noise, strict=True)
    ]
    whole = sum(together)
    found = []
    for c, (_, strength), (own, cross, _), mine in zip(cell.cylinders, events, noise, together, strict=True):
        row = np.array([Z[site, c.parent], Z[site, c.child]])
        alone = abs(strength) ** 2 * (row @ np.array([[own, cross], [cross, own]]) @ row.conj()).real
        found.append((1 - correlation) * alone + correlation * (mine * whole.conjugate()).real)
    return np.array(found)


def covariance_spectrum(cell: Cell, omega: float, events: list, correlation: float):
    """(N, N) real part of the two-sided cross-spectra of all nodes."""
    Z, noise = impedance_GOhm(cell, omega)
    W = np.zeros_like(Z)
    J = np.zeros(len(Z), dtype=complex)
    for c, (amplitude, strength), (own, cross, share) in zip(cell.cylinders, events, noise, strict=True):
        for i, j, part in (
            (c.parent, c.parent, own),
            (c.child, c.child, own),
            (c.parent, c.child, cross),
            (c.child, c.parent, cross),
        ):
            W[i, j] += (1 - correlation) * abs(strength) ** 2 * part
        for i in (c.parent, c.child):
            J[i] += amplitude * share
    W += correlation * np.outer(J, J.conj())
    return (Z @ W @ Z.conj().T).real
