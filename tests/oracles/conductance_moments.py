"""Exact mean and covariance of the voltage under Poisson conductances at a few places, by moments.

Every place and input has one conductance g with g' = -p g and jumps h at the rate ν; the compartments obey
C V' = -G (V - rest) - Σ g (V_y - E). The pair is a Markov process whose generator maps polynomials to polynomials, of
the same degree in V and of at most one degree more in g. With x = (g - mean)/mean the moments E[x^k], E[x^k V] and
E[x^k V V'] up to a total degree K of k form a linear system; what lies beyond K is left out. No expansion in event
density, no linearisation: the answer converges in K, asymptotically.
"""

from dataclasses import dataclass
from itertools import product
from math import comb

import numpy as np


@dataclass(frozen=True)
class Place:
    """Conductance events of one input at one compartment; the reversal potential counts from rest."""

    compartment: int
    rate_per_ms: float
    jump_nS: float
    decay_per_ms: float
    reversal_mV: float

    @property
    def mean_nS(self) -> float:
        return self.rate_per_ms * self.jump_nS / self.decay_per_ms


def mean_and_covariance(capacitance_pF, conductance_nS, places: list[Place], degree: int, sweeps: int = 200):
    """Mean above rest (M,) and covariance (M, M) of compartments with capacitances (M,) and conductances (M, M)."""
    C = np.asarray(capacitance_pF, dtype=float)
    G = np.asarray(conductance_nS, dtype=float).copy()
    drive = np.zeros(len(C))
    for one in places:
        G[one.compartment, one.compartment] += one.mean_nS
        drive[one.compartment] += one.mean_nS * one.reversal_mV
    still = np.linalg.solve(G, drive)
    root = np.sqrt(C)
    rates, vectors = np.linalg.eigh(G / np.outer(root, root))
    shapes = vectors / root[:, None]
    at = np.array([shapes[one.compartment] for one in places])
    mean = np.array([one.mean_nS for one in places])
    force = mean * np.array([one.reversal_mV - still[one.compartment] for one in places])
    decay = np.array([one.decay_per_ms for one in places])
    keys = sorted((k for k in product(range(degree + 1), repeat=len(places)) if sum(k) <= degree), key=sum)
    row = {k: i for i, k in enumerate(keys)}
    below = []  # per key, what jumps bring from lower powers
    above = []  # per key, the rows of one power more of each x
    for k in keys:
        terms = []
        for a, one in enumerate(places):
            jump = one.jump_nS / one.mean_nS
            for q in range(k[a] - 1):
                terms.append((row[(*k[:a], q, *k[a + 1 :])], one.rate_per_ms * comb(k[a], q) * jump ** (k[a] - q)))
        below.append(terms)
        above.append([row.get((*k[:a], k[a] + 1, *k[a + 1 :]), -1) for a in range(len(places))])
    loss = np.array(keys) @ decay
    zeroth = np.zeros(len(keys))
    zeroth[0] = 1.0
    for i in range(1, len(keys)):
        zeroth[i] = sum(w * zeroth[j] for j, w in below[i]) / loss[i]
    first = np.zeros((len(keys), len(C)))
    second = np.zeros((len(keys), len(C), len(C)))
    twice = rates[:, None] + rates
    for moments in (first, second):
        for _ in range(sweeps):
            before = moments.copy()
            for i in range(len(keys)):
                total = sum((w * moments[j] for j, w in below[i]), np.zeros_like(moments[0]))
                for a, j in enumerate(above[i]):
                    if j < 0:
                        continue
                    if moments is first:
                        total += at[a] * (force[a] * zeroth[j] - mean[a] * (at[a] @ first[j]))
                    else:
                        one_side = np.outer(at[a], force[a] * first[j] - mean[a] * (at[a] @ second[j]))
                        total += one_side + one_side.T
                moments[i] = total / (loss[i] + (rates if moments is first else twice))
            if np.abs(moments - before).max() <= 1e-12 * np.abs(moments).max():
                break
        else:
            raise ArithmeticError("the sweeps do not converge")
    shift = shapes @ first[0]
    return still + shift, shapes @ second[0] @ shapes.T - np.outer(shift, shift)
