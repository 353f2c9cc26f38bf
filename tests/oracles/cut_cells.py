"""A whole cell cut into plain cylinders: means and voltage spectra at its nodes by dense matrices.

Every cylinder is cut at the limits of membrane zones and inputs and into `n` steps of equal length. A step is
the even cylinder with its frustum's axial resistance and lateral area. What its synapses inject at its ends is
integrated over it by Gauss's rule, with the mean voltage from the steady cable equation. Steps without taper
and without conductance synapses are exact, so that n = 1 is; otherwise the error is a series in 1/n^2.
"""

from __future__ import annotations

from dataclasses import dataclass
from itertools import pairwise

import numpy as np

from .dense import impedance_and_covariance, nodal_matrices

GAUSS, WEIGHT = np.polynomial.legendre.leggauss(48)
GAUSS, WEIGHT = (GAUSS + 1) / 2, WEIGHT / 2


@dataclass(frozen=True)
class Frustum:
    """From node `parent` to node `child`; specific constants in ohm cm2, ohm cm, uF/cm2 and mV."""

    parent: int
    child: int
    length_um: float
    near_um: float
    far_um: float
    Rm: float
    Ri: float
    Cm: float
    rest_mV: float


@dataclass(frozen=True)
class Ball:
    """A sphere at a node."""

    node: int
    radius_um: float
    Rm: float
    Cm: float
    rest_mV: float

    @property
    def area_um2(self) -> float:
        return 4 * np.pi * self.radius_um**2


@dataclass(frozen=True)
class Synapses:
    """One population; on frustum j between from_um[j] and to_um[j], measured from its near end.

    event_area is the charge of one event (fC) or its time integral of conductance (nS ms), poles_ms its unit
    kernel as in `plain`. by_area and by_length are synapses per um2 and per um; number_at are pairs (node,
    number).
    """

    rate_per_ms: float
    event_area: float
    poles_ms: tuple[float, ...]
    reversal_mV: float | None = None
    by_length: float = 0.0
    by_area: float = 0.0
    from_um: tuple[float, ...] = ()
    to_um: tuple[float, ...] = ()
    balls: tuple[int, ...] = ()
    number_at: tuple[tuple[int, float], ...] = ()
    correlation: float = 0.0

    def colour(self, omega: float) -> float:
        return float(np.prod([1 / (1 + (omega * tau) ** 2) for tau in self.poles_ms]))


@dataclass(frozen=True)
class Step:
    """One plain cylinder; `synapses` (inputs,) are numbers of synapses on it."""

    a: int
    b: int
    R: float
    leak: float
    C: float
    rest: float
    synapses: np.ndarray


def cut(frusta: list[Frustum], inputs: list[Synapses], n: int) -> tuple[list[Step], int]:
    """Steps and the number of points; nodes of the frusta keep their numbers."""
    points = 1 + max(f.child for f in frusta)
    steps = []
    for j, f in enumerate(frusta):
        spans = [(one.from_um[j], one.to_um[j]) for one in inputs if one.from_um and one.to_um[j] > one.from_um[j]]
        marks = sorted({0.0, f.length_um, *(mark for span in spans for mark in span)})
        places = [low + (high - low) * k / n for low, high in pairwise(marks) for k in range(n)] + [f.length_um]
        last = f.parent
        for k, (low, high) in enumerate(pairwise(places)):
            here = f.child if k == len(places) - 2 else points
            points += here == points
            first, end = (f.near_um + (f.far_um - f.near_um) * x / f.length_um for x in (low, high))
            area = np.pi * (first + end) * np.hypot(high - low, first - end)
            middle = (low + high) / 2
            number = np.zeros(len(inputs))
            for i, one in enumerate(inputs):
                if one.from_um and one.from_um[j] < middle < one.to_um[j]:
                    number[i] = one.by_length * (high - low) + one.by_area * area
            R = 1e-5 * f.Ri * (high - low) / (np.pi * first * end)
            steps.append(Step(last, here, R, 10 / f.Rm * area, 0.01 * f.Cm * area, f.rest_mV, number))
            last = here
    return steps, points


@dataclass(frozen=True)
class State:
    """The cut cell around its mean: steps, lumped values at points, mean voltage (points,) in mV."""

    steps: list[Step]
    node_conductance: np.ndarray
    node_capacitance: np.ndarray
    node_synapses: np.ndarray
    conductance: np.ndarray
    still_mV: np.ndarray
    mean_mV: np.ndarray


def _ports(x2: complex, R: float) -> np.ndarray:
    x = np.sqrt(complex(x2))
    own, across = x / np.tanh(x) / R, -x / np.sinh(x) / R
    return np.array([[own, across], [across, own]])


def _waves(x2: complex) -> tuple[np.ndarray, np.ndarray]:
    """What a current at each Gauss point gives to the two ends."""
    x = np.sqrt(complex(x2))
    return np.sinh(x * (1 - GAUSS)) / np.sinh(x), np.sinh(x * GAUSS) / np.sinh(x)


def state(frusta: list[Frustum], balls: list[Ball], inputs: list[Synapses], n: int) -> State:
    """Mean conductances and the mean voltage that they make."""
    steps, points = cut(frusta, inputs, n)
    node_g, node_c, node_drive = (np.zeros(points) for _ in range(3))
    node_synapses = np.zeros((len(inputs), points))
    for i, one in enumerate(inputs):
        for node, number in one.number_at:
            node_synapses[i, node] += number
        for k in one.balls:
            node_synapses[i, balls[k].node] += one.by_area * balls[k].area_um2
    for ball in balls:
        leak = 10 / ball.Rm * ball.area_um2
        node_g[ball.node] += leak
        node_c[ball.node] += 0.01 * ball.Cm * ball.area_um2
        node_drive[ball.node] += leak * ball.rest_mV
    g = np.array([step.leak for step in steps])
    drive = np.array([step.leak * step.rest for step in steps])
    on_steps = np.array([step.synapses for step in steps])
    for i, one in enumerate(inputs):
        mean = one.rate_per_ms * one.event_area
        if one.reversal_mV is None:
            drive += mean * on_steps[:, i]
            node_drive += mean * node_synapses[i]
        else:
            g += mean * on_steps[:, i]
            drive += mean * on_steps[:, i] * one.reversal_mV
            node_g += mean * node_synapses[i]
            node_drive += mean * node_synapses[i] * one.reversal_mV
    current = node_drive.astype(complex)
    for k, step in enumerate(steps):
        for end, wave in zip((step.a, step.b), _waves(step.R * g[k]), strict=True):
            current[end] += drive[k] * (WEIGHT @ wave)
    edges = [(step.a, step.b) for step in steps]
    ports = np.array([_ports(step.R * g[k], step.R) for k, step in enumerate(steps)])
    none = np.zeros((1, len(steps), 2, 2))
    A, W = nodal_matrices([node_g], edges, [ports], none, np.zeros((1, points)))
    Z = impedance_and_covariance(A, W)[0][0]
    mean_mV = (Z @ current).real
    return State(steps, node_g, node_c, node_synapses, g, drive / g, mean_mV)


def spectra(at: State, inputs: list[Synapses], omega: float) -> tuple[np.ndarray, np.ndarray]:
    """Two-sided spectra (inputs, points) in mV2 ms and the impedance matrix (points, points) in GOhm."""
    points, edges = len(at.mean_mV), [(step.a, step.b) for step in at.steps]
    squared = [step.R * (at.conductance[k] + 1j * omega * step.C) for k, step in enumerate(at.steps)]
    ports = np.array([_ports(x2, step.R) for x2, step in zip(squared, at.steps, strict=True)])
    waves = [_waves(x2) for x2 in squared]
    means = []
    for k, step in enumerate(at.steps):
        to_a, to_b = (wave.real for wave in _waves(step.R * at.conductance[k]))
        u = at.still_mV[k]
        means.append(u + (at.mean_mV[step.a] - u) * to_a + (at.mean_mV[step.b] - u) * to_b)
    found = []
    for i, one in enumerate(inputs):
        noise = np.zeros((1, len(at.steps), 2, 2), dtype=complex)
        in_step = np.zeros(points, dtype=complex)
        for k, step in enumerate(at.steps):
            if not step.synapses[i]:
                continue
            force = np.ones(len(GAUSS)) if one.reversal_mV is None else one.reversal_mV - means[k]
            for p, to_p in enumerate(waves[k]):
                in_step[edges[k][p]] += step.synapses[i] * (WEIGHT @ (force * to_p))
                for q, to_q in enumerate(waves[k]):
                    noise[0, k, p, q] = step.synapses[i] * (WEIGHT @ (force**2 * to_p * to_q.conj()))
        at_nodes = 1.0 if one.reversal_mV is None else one.reversal_mV - at.mean_mV
        in_step += at.node_synapses[i] * at_nodes
        A, W = nodal_matrices(
            [at.node_conductance + 1j * omega * at.node_capacitance],
            edges,
            [ports],
            noise,
            [at.node_synapses[i] * at_nodes**2],
        )
        Z, P = (matrix[0] for matrix in impedance_and_covariance(A, W))
        alone, together = np.diag(P).real, np.abs(Z @ in_step) ** 2
        size = one.rate_per_ms * one.event_area**2 * one.colour(omega)
        found.append(size * ((1 - one.correlation) * alone + one.correlation * together))
    return np.array(found), Z
