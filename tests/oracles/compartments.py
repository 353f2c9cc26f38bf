"""A whole small tree in node-centred finite volumes, its noise by a Lyapunov equation. Second order in 1/n.

Each cylinder is cut in n equal steps. Every node owns half of each adjoining step: its membrane, its
synapses. Events are filtered by extra state variables, one a pole of the kernel and compartment:
    s_1' = -s_1/tau_1 + (events)/tau_1,   s_2' = (s_1 - s_2)/tau_2,
which makes unit-area kernels (equal poles give the alpha function). Conductance events are linearised about
the mean voltage of the same compartments: current = event_area (E - Vbar) s.
"""

from dataclasses import dataclass
from itertools import pairwise

import numpy as np
from scipy.linalg import solve_continuous_lyapunov

from .plain import Cell, Input


@dataclass(frozen=True)
class Compartments:
    """Arrays over the M points; the cell's own nodes come first, then the inner points.

    capacitance_pF (M,); conductance_nS (M, M), leak and axial; share_um (C, M), length of each cylinder
    owned.
    """

    capacitance_pF: np.ndarray
    conductance_nS: np.ndarray
    share_um: np.ndarray


def discretise(cell: Cell, n: int) -> Compartments:
    """Cut each cylinder in n steps."""
    N, C = cell.node_count, len(cell.cylinders)
    M = N + C * (n - 1)
    c = np.zeros(M)
    G = np.zeros((M, M))
    share = np.zeros((C, M))
    for sphere in cell.spheres:
        c[sphere.node] += sphere.capacitance_pF
        G[sphere.node, sphere.node] += sphere.leak_nS
    for j, cylinder in enumerate(cell.cylinders):
        first = N + j * (n - 1)
        points = [cylinder.parent, *range(first, first + n - 1), cylinder.child]
        step_nS = n / cylinder.axial_GOhm
        for p, q in pairwise(points):
            G[p, p] += step_nS
            G[q, q] += step_nS
            G[p, q] -= step_nS
            G[q, p] -= step_nS
            for point in (p, q):
                c[point] += cylinder.capacitance_pF / (2 * n)
                G[point, point] += cylinder.leak_nS / (2 * n)
                share[j, point] += cylinder.length_um / (2 * n)
    return Compartments(c, G, share)


def synapses(compartments: Compartments, source: Input) -> np.ndarray:
    """Number of synapses of one input in each compartment, (M,)."""
    number = np.zeros(len(compartments.capacitance_pF))
    for j, density in enumerate(source.density_per_um):
        number += density * compartments.share_um[j]
    for node, count in source.number_at:
        number[node] += count
    return number


def operating_point(compartments: Compartments, inputs: list[Input]) -> tuple[np.ndarray, np.ndarray]:
    """Mean voltage (M,) above rest and conductance matrix (M, M), tonic synaptic part included."""
    G = compartments.conductance_nS.copy()
    current = np.zeros(len(G))
    for source in inputs:
        tonic = synapses(compartments, source) * source.rate_per_ms * source.event_area
        if source.reversal_mV is None:
            current += tonic
        else:
            G += np.diag(tonic)
            current += tonic * source.reversal_mV
    return np.linalg.solve(G, current), G


def stationary_covariance(capacitance_pF, G_nS, event_rate, amplitude, poles_ms) -> np.ndarray:
    """Voltage covariance (M, M) when compartment i gets event_rate[i] events/ms of amplitude[i] fC each."""
    M = len(capacitance_pF)
    if not poles_ms:
        jump = amplitude / capacitance_pF
        return solve_continuous_lyapunov(-G_nS / capacitance_pF[:, None], -np.diag(event_rate * jump**2))
    active = np.flatnonzero(event_rate)
    k, size = len(active), M + len(active) * len(poles_ms)
    drift = np.zeros((size, size))
    drift[:M, :M] = -G_nS / capacitance_pF[:, None]
    noise = np.zeros((size, size))
    for i, tau in enumerate(poles_ms):
        for j, point in enumerate(active):
            row = M + i * k + j
            drift[row, row] = -1.0 / tau
            if i == 0:
                noise[row, row] = event_rate[point] / tau**2
            else:
                drift[row, row - k] = 1.0 / tau
            if i == len(poles_ms) - 1:
                drift[point, row] = amplitude[point] / capacitance_pF[point]
    return solve_continuous_lyapunov(drift, -noise)[:M, :M]


def mean_and_covariance(cell: Cell, inputs: list[Input], n: int) -> tuple[np.ndarray, np.ndarray]:
    """Mean (N,) in mV above rest and covariance (I, N, N) in mV2, one an input, at the cell's nodes."""
    compartments = discretise(cell, n)
    mean, G = operating_point(compartments, inputs)
    N = cell.node_count
    parts = []
    for source in inputs:
        rate = synapses(compartments, source) * source.rate_per_ms
        drive = 1.0 if source.reversal_mV is None else source.reversal_mV - mean
        amplitude = source.event_area * drive * np.ones_like(mean)
        c = compartments.capacitance_pF
        parts.append(stationary_covariance(c, G, rate, amplitude, source.poles_ms)[:N, :N])
    return mean[:N], np.array(parts)


def sd_at_nodes(cell: Cell, inputs: list[Input], nodes: list[int], n: int) -> np.ndarray:
    """SD (mV) at the named nodes with n compartments a cylinder."""
    _, covariance = mean_and_covariance(cell, inputs, n)
    return np.sqrt(np.diagonal(covariance.sum(axis=0)))[list(nodes)]


def convergence_order(values: list[np.ndarray]) -> np.ndarray:
    """Observed order from three results at n, 2n and 4n: log2 of the ratio of successive differences."""
    coarse, middle, fine = (np.asarray(v) for v in values)
    return np.log2(np.abs(coarse - middle) / np.abs(middle - fine))


def richardson(values: list[np.ndarray]) -> np.ndarray:
    """Limit of results at n, 2n, 4n, ... whose error is a series in 1/n^2 (Romberg's table)."""
    row = [np.asarray(v, dtype=float) for v in values]
    factor = 4.0
    while len(row) > 1:
        row = [(factor * fine - coarse) / (factor - 1.0) for coarse, fine in pairwise(row)]
        factor *= 4.0
    return row[0]
