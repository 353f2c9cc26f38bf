"""The sweeps over a tree network in Π form: impedances, noise and columns at all points, in O(n) per frequency.

Eliminating a point m with the coupling c_p to its parent, c_q to its only child and the admittance s_m to
ground: with T = s_m + c_p + c_q, a_p = c_p/T, a_q = c_q/T its voltage is V_m = a_p V_p + a_q V_q + I_m/T, the
neighbours gain the shunts a_p s_m and a_q s_m and the coupling a_p c_q (star-mesh transformation), and the
currents I_p += a_p I_m, I_q += a_q I_m. Only sums and products occur, so that a coupling of 1e8 nS beside a
leak of 1e-4 nS loses nothing: it is, at zero frequency, the subtraction-free elimination of Grassmann,
Taksar & Heyman (1985, Oper Res 33:1107; from memory). The same recursions, run backwards, give
Z = A⁻¹ and the covariance P = Z W Zᴴ on the diagonal and on every edge, because A, W and P keep the tree's pattern.

Arrays are (points or edges, F) in the plan's numbers. Noise of an edge is E[I_child I_parent*].
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from cable.network.plan import Plan, Round

Complexes = NDArray[np.complex128]
Floats = NDArray[np.float64]


def _hand_up(step: Round, target: NDArray, parts: NDArray) -> None:
    """Add to each parent's row of `target` what the points of the round hand to it."""
    flat = np.ascontiguousarray(parts).view(np.float64)
    target[step.parents] += (step.gather @ flat).view(parts.dtype)


def _dot_re(a: Complexes, b: Complexes) -> Floats:
    """Re(a·b)."""
    return a.real * b.real - a.imag * b.imag


@dataclass(frozen=True, eq=False)
class Factors:
    """A network eliminated at one block of F frequencies; what every later sweep needs.

    Attributes:
        to_parent: (n - 1, F) a_p of each point but the root.
        to_child: per round (chain, F) a_q of the points that have a child.
        inverse: (n, F) 1/T of each point; for the root its input impedance, GΩ.
    """

    plan: Plan
    to_parent: Complexes
    to_child: tuple[Complexes, ...]
    inverse: Complexes


def eliminate(plan: Plan, shunt: Complexes, coupling: Complexes) -> Factors:
    """Factors of the network with admittances to ground `shunt` (n, F) and couplings `coupling` (n - 1, F), nS.

    Rows stand in the network's own order; row i of `coupling` is the edge between node i + 1 and its parent.
    """
    width = shunt.shape[1]
    s = np.empty_like(shunt)
    s[plan.node] = shunt
    c = np.empty((plan.edges, width), dtype=shunt.dtype)
    c[plan.edge] = coupling
    inverse = np.empty_like(s)
    to_parent = np.empty_like(s[:-1])
    to_child = []
    for step in plan.rounds:
        up, down = c[step.to_parent], c[step.to_child]
        chain = len(down)
        ground = s[step.nodes]
        total = ground + up
        total[:chain] += down
        inverse[step.nodes] = 1 / total
        a_p = np.multiply(up, inverse[step.nodes], out=to_parent[step.nodes])
        _hand_up(step, s, a_p * ground)
        if chain:
            a_q = down * inverse[step.nodes][:chain]
            s[step.child] += a_q * ground[:chain]
            c[step.bridge] = a_p[:chain] * down
        else:
            a_q = down
        to_child.append(a_q)
    inverse[-1] = 1 / s[-1]
    return Factors(plan, to_parent, tuple(to_child), inverse)


@dataclass(frozen=True, eq=False)
class Impedances:
    """Input impedances (n, F) and transfer impedances along edges, bridges included (edges, F), GΩ, plan's order."""

    point: Complexes
    edge: Complexes


def impedances(factors: Factors) -> Impedances:
    """Diagonal and tree entries of Z = A⁻¹."""
    plan = factors.plan
    z = np.empty_like(factors.inverse)
    edge = np.empty((plan.edges, z.shape[1]), dtype=z.dtype)
    z[-1] = factors.inverse[-1]
    for step, a_q in zip(reversed(plan.rounds), reversed(factors.to_child), strict=True):
        a_p = factors.to_parent[step.nodes]
        chain = len(a_q)
        with_parent = np.multiply(a_p, z[step.parent], out=edge[step.to_parent])
        if chain:
            across = edge[step.bridge]
            with_parent[:chain] += a_q * across
            with_child = np.multiply(a_p[:chain], across, out=edge[step.to_child])
            with_child += a_q * z[step.child]
        own = np.multiply(a_p, with_parent, out=z[step.nodes])
        own += factors.inverse[step.nodes]
        if chain:
            own[:chain] += a_q * with_child
    return Impedances(z, edge)


def variances(factors: Factors, z: Impedances, self_noise: Floats, cross_noise: Floats) -> Floats:
    """Diagonal of P = Z W Zᴴ: the spectrum of the voltage at each point, (n, F), the network's own order.

    Args:
        self_noise: (n, F) spectrum of the noise current at each node.
        cross_noise: (n - 1, F) E[I_child I_parent*] of each edge, real.
    """
    plan = factors.plan
    width = self_noise.shape[1]
    w = np.empty_like(self_noise)
    w[plan.node] = self_noise
    cross = np.empty((plan.edges, width), dtype=np.complex128)
    cross[plan.edge] = cross_noise
    folded = [
        _fold_noise(step, factors.to_parent[step.nodes], a_q, w, cross)
        for step, a_q in zip(plan.rounds, factors.to_child, strict=True)
    ]
    p = w
    root = factors.inverse[-1]
    p[-1] *= root.real**2 + root.imag**2
    for step, a_q, (with_p, with_q) in zip(
        reversed(plan.rounds), reversed(factors.to_child), reversed(folded), strict=True
    ):
        _unfold_noise(step, factors, a_q, z, with_p, with_q, p, cross)
    return p[plan.node]


def _fold_noise(
    step: Round, a_p: Complexes, a_q: Complexes, w: Floats, cross: Complexes
) -> tuple[Complexes, Complexes]:
    """Fold the noise of a round's points into their neighbours; returns E[I'_p I_m*] and E[I'_q I_m*]."""
    own, up, down = w[step.nodes], cross[step.to_parent], cross[step.to_child]
    chain = len(a_q)
    with_p = a_p * own
    with_p += up.conj()
    _hand_up(step, w, _dot_re(a_p, up + with_p.conj()))
    if not chain:
        return with_p, down
    with_q = a_q * own[:chain]
    with_q += down
    w[step.child] += _dot_re(a_q.conj(), down + with_q)
    cross[step.bridge] = a_p[:chain].conj() * with_q + a_q * up[:chain]
    return with_p, with_q


def _unfold_noise(
    step: Round,
    factors: Factors,
    a_q: Complexes,
    z: Impedances,
    with_p: Complexes,
    with_q: Complexes,
    p: Floats,
    cross: Complexes,
) -> None:
    """Covariances of a round's points from those of their neighbours.

    `p` holds noise before and variances after; `cross` likewise, E[V_child V_parent*] afterwards.
    """
    chain = len(a_q)
    a_p, inverse = factors.to_parent[step.nodes], factors.inverse[step.nodes]
    u_p = z.point[step.parent] * with_p  # E[V_p I_m*]
    m_p = a_p * p[step.parent]  # becomes E[V_m V_p*]
    u_m = inverse * p[step.nodes]  # becomes E[V_m I_m*]
    if chain:
        z_across, p_across = z.edge[step.bridge], cross[step.bridge]
        u_p[:chain] += z_across * with_q
        u_q = z_across * with_p[:chain] + z.point[step.child] * with_q
        m_p[:chain] += a_q * p_across
        u_m[:chain] += a_q * u_q
        q_m = (a_p[:chain] * p_across.conj() + a_q * p[step.child] + inverse[:chain] * u_q.conj()).conj()  # E[V_q V_m*]
        cross[step.to_child] = q_m
    u_m += a_p * u_p
    m_p += inverse * u_p.conj()
    cross[step.to_parent] = m_p
    own = _dot_re(a_p, m_p.conj())
    own += _dot_re(inverse, u_m.conj())
    if chain:
        own[:chain] += _dot_re(a_q, q_m)
    p[step.nodes] = own


def solve(factors: Factors, current: Complexes) -> Complexes:
    """Voltages (n, F), mV, that the currents `current` (n, F), pA, cause; the network's own order."""
    plan = factors.plan
    v = np.empty_like(current)
    v[plan.node] = current
    for step, a_q in zip(plan.rounds, factors.to_child, strict=True):
        here = v[step.nodes]
        _hand_up(step, v, factors.to_parent[step.nodes] * here)
        if len(a_q):
            v[step.child] += a_q * here[: len(a_q)]
    v *= factors.inverse
    for step, a_q in zip(reversed(plan.rounds), reversed(factors.to_child), strict=True):
        here = v[step.nodes]
        here += factors.to_parent[step.nodes] * v[step.parent]
        if len(a_q):
            here[: len(a_q)] += a_q * v[step.child]
    return v[plan.node]
