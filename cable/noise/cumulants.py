"""Higher cumulants of the voltage at a site: Campbell's theorem, κ_n = Σ rate ∫ hⁿ dt over all synapses.

Here h is what one event at a place does to the voltage at the site (Campbell 1909, Proc Camb Phil Soc 15; Rice
1944, Bell Syst Tech J 23:282; from memory), for a conductance with its driving force frozen at the mean state. In
frequency it is the site's column of transfer impedances times the kernel. Back in time it is an integral over the
bent path ω = ω₀ sinh(v + ia/2), as for covariances (`cable.noise.covariance`): one set of nodes serves every t > 0.
With t = e^w the trapezoidal rule in w then converges exponentially, and h's cusp at t = 0 lies infinitely far away.
Along a cylinder the synapses are summed by Gauss's rule, with the impedance between the ends in closed form.

Of the second cumulant the variance is known by another way, certified; of the third and fourth, rules with fewer
points in space, and in time, tell the error.

Pairwise correlations do not fix higher cumulants. Those of a correlated population are given for synapses that copy
each spike of one common Poisson train with the probability c, the correlation: then spikes come in volleys, and with
X the size of a synapse's event in a volley (0 where it does not copy) the sum over synapses has the cumulants
K_n(X) Σ hⁿ, of which the moments, integrated over t, times the common train's rate are the κ_n (derived here).
"""

from __future__ import annotations

import math
from collections.abc import Iterator
from concurrent.futures import ThreadPoolExecutor
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from cable.noise.cross import BLOCK
from cable.noise.integral import analytic_strip, slowest_rate_per_ms
from cable.noise.operating_point import OperatingPoint
from cable.noise.steepness import falls_as
from cable.theory.kernel import Kernel
from cable.theory.synapse import SynapticInput

Floats = NDArray[np.float64]
Complexes = NDArray[np.complex128]
Kernels = dict[Kernel, Complexes]
Block = tuple[NDArray[np.int64], Floats, Floats]
ORDERS = (2, 3, 4)
DIGITS = math.log(1e16)  # what every rule aims at
GAUSS = ((0.1, 2), (0.4, 3), (1.0, 5))  # points (and one more) on a cylinder up to this length at the fastest rate
FINITE_ABOVE = 1.5  # the power of 1/ω above which the third cumulant, too, is finite
USUAL_POWER = 3.0  # of a spectrum that falls faster than any power
CHUNK = 400_000  # numbers in one block of work
SHORT = 1e-4  # electrotonic length below which a cylinder is followed by a series


@dataclass(frozen=True, eq=False)
class Cumulants:
    """Cumulants 2, 3 and 4 of the voltage at one site.

    Attributes:
        by_input: (inputs, 3) what each input makes of them, mV², mV³, mV⁴.
        relative_error: (3,) estimate of the error of the sums, relative to the sums of sizes.
    """

    by_input: Floats
    relative_error: Floats


@dataclass(frozen=True, eq=False)
class _Rule:
    """Nodes of the path in frequency and of the trapezoidal rule in w = ln t."""

    s_per_ms: Complexes
    weight: Complexes
    t_ms: Floats
    step: float

    def inverse(self, kernel: Kernel) -> Complexes:
        """(F, T) the matrix whose product with transfer impedances has the responses as real part."""
        wave = np.exp(self.s_per_ms[:, None] * self.t_ms)
        return (self.weight * kernel.laplace(self.s_per_ms))[:, None] * wave


def cumulants(point: OperatingPoint, node: int) -> Cumulants:
    """Cumulants at `node` as Poisson trains make them, alone or copied from one train a population."""
    rule = _rule(point, node)
    inputs = point.model.inputs
    kernels = {one.kernel: rule.inverse(one.kernel) for one in inputs}
    z = _column(point, node, rule.s_per_ms)
    sums = []
    with ThreadPoolExecutor(2) as pool:
        for extra in (1, 0):
            blocks = _gauss(point, extra, len(rule.s_per_ms))
            parts = pool.map(lambda block: _spread(point, kernels, rule, z, block), blocks)
            sums.append(sum(parts, _lumped(point, kernels, rule, z)))
    fine, coarse, half = (
        rule.step
        * thin
        * np.array([_joined(one, h[:, ::thin], rule.t_ms[::thin]) for one, h in zip(inputs, s, strict=True)])
        for s, thin in ((sums[0], 1), (sums[1], 1), (sums[0], 2))
    )
    size = np.abs(fine).sum(axis=0)
    size = np.where(size > 0, size, 1.0)
    # halving the step of the trapezoidal rule squares what is left of its error
    left = np.abs(fine - coarse).sum(axis=0) / size + (np.abs(fine - half).sum(axis=0) / size) ** 2
    return Cumulants(fine, left)


def _lumped(point: OperatingPoint, kernels: Kernels, rule: _Rule, z: Complexes) -> Floats:
    """(inputs, n, T) Σ hⁿ over the synapses at nodes."""
    busy = np.flatnonzero(np.any([at_nodes for _, at_nodes in point.numbers], axis=0))
    numbers = [at_nodes[busy] for _, at_nodes in point.numbers]
    return _sums(point, kernels, z[busy], numbers, point.deviation_mV[busy])


def _spread(point: OperatingPoint, kernels: Kernels, rule: _Rule, z: Complexes, block: Block) -> Floats:
    """(inputs, n, T) Σ hⁿ over the synapses along some pieces, by Gauss's rule."""
    pieces, where, share = block
    x = np.sqrt(point.network.resistance_GOhm[pieces, None] * _membrane(point, pieces, rule.s_per_ms))
    impedance = _between(x, where, z[point.network.parent[1:][pieces]], z[1:][pieces])
    numbers = []
    for one, (on_pieces, _) in zip(point.model.inputs, point.numbers, strict=True):
        lean = (point.layout.lean_of_area if one.by_area else point.layout.lean_of_length)[pieces, None]
        numbers.append((on_pieces[pieces, None] * share * (1 + 12 * lean * (where - 0.5))).ravel())
    return _sums(
        point, kernels, impedance.reshape(-1, impedance.shape[-1]), numbers, _mean_mV(point, pieces, where).ravel()
    )


def _sums(
    point: OperatingPoint, kernels: Kernels, impedance: Complexes, numbers: list[Floats], mean_mV: Floats
) -> Floats:
    """(inputs, n, T) Σ number·hⁿ, n from 1, over some places with transfer `impedance` (places, F)."""
    total = np.zeros((len(numbers), ORDERS[-1], next(iter(kernels.values())).shape[1]))
    for kernel, inverse in kernels.items():
        response = (impedance @ inverse).real
        for k, one in enumerate(point.model.inputs):
            if one.kernel == kernel:
                event, power = _event(point, k, mean_mV), np.ones_like(response)
                for n in range(ORDERS[-1]):
                    power = power * response
                    total[k, n] = (numbers[k] * event ** (n + 1)) @ power
    return total


def _joined(one: SynapticInput, sums: Floats, t_ms: Floats) -> Floats:
    """(3,) κ_n over the time step, from a population's sums Σ hⁿ (4, T)."""
    m2, m3, m4 = (one.size_moment(n) for n in ORDERS)
    c = one.correlation
    if c == 0:
        return one.rate_per_ms * np.array([m2, m3, m4]) * (sums[1:] @ t_ms)
    first = c * sums[0]
    second = (c * m2 - c**2) * sums[1]
    third = (c * m3 - 3 * c**2 * m2 + 2 * c**3) * sums[2]
    fourth = (c * m4 - 4 * c**2 * m3 - 3 * c**2 * m2**2 + 12 * c**3 * m2 - 6 * c**4) * sums[3]
    moments = np.array(
        [
            second + first**2,
            third + 3 * second * first + first**3,
            fourth + 4 * third * first + 3 * second**2 + 6 * second * first**2 + first**4,
        ]
    )
    return one.rate_per_ms / c * (moments @ t_ms)


def _rule(point: OperatingPoint, node: int) -> _Rule:
    omega0 = slowest_rate_per_ms(point)
    strip = analytic_strip(point, omega0)
    fastest = max([_fastest(point), point.network.slowest_rate_per_ms])
    power = min(float(falls_as(point)[node]), USUAL_POWER)
    step = 2 * math.pi * strip / DIGITS
    low = -math.log(fastest) - DIGITS / (power - 1)
    high = math.log(0.75 * DIGITS / omega0)
    t = np.exp(np.arange(low, high + step, step))
    tilt, stride = strip / 2, math.pi * strip / DIGITS
    reach = math.asinh(DIGITS / (omega0 * t[0] * math.sin(tilt)))
    v = np.arange(0.0, reach, stride) + 1j * tilt
    weight = omega0 * np.cosh(v) * stride / np.pi
    weight[0] /= 2
    return _Rule(1j * omega0 * np.sinh(v), weight, t, step)


def _fastest(point: OperatingPoint) -> float:
    """The fastest rate of the kernels, 1/ms; of the membrane where all charge comes at once."""
    rates = [abs(p) for one in point.model.inputs for p in one.kernel.poles_per_ms]
    return max(rates, default=point.network.slowest_rate_per_ms)


def _column(point: OperatingPoint, node: int, s_per_ms: Complexes) -> Complexes:
    """(E + 1, F) transfer impedances to `node`, GΩ."""

    def block(start: int) -> Complexes:
        return point.network.columns_at(s_per_ms[start : start + BLOCK], [node]).impedance_GOhm[0]

    with ThreadPoolExecutor(2) as pool:
        return np.concatenate(list(pool.map(block, range(0, len(s_per_ms), BLOCK))), axis=-1)


def _gauss(point: OperatingPoint, extra: int, frequencies: int) -> Iterator[Block]:
    """Blocks of pieces (P,) with Gauss points (P, G) along each, from 0 to 1, and each point's share of the piece."""
    busy = np.flatnonzero(np.any([numbers for numbers, _ in point.numbers], axis=0))
    fastest = _membrane(point, busy, 1j * np.array([_fastest(point)]))[:, 0]
    x = np.abs(np.sqrt(point.network.resistance_GOhm[busy] * fastest))
    panels = np.maximum(1, np.ceil(x / GAUSS[-1][0])).astype(np.int64)
    piece, width = np.repeat(busy, panels), 1 / np.repeat(panels, panels)
    first = (np.arange(len(piece)) - np.repeat(np.cumsum(panels) - panels, panels)) * width
    length = np.repeat(x, panels) * width
    kind = np.searchsorted([limit for limit, _ in GAUSS[:-1]], length)
    for k, (_, points) in enumerate(GAUSS):
        chosen = np.flatnonzero(kind == k)
        at, weight = np.polynomial.legendre.leggauss(points + extra)
        most = max(1, CHUNK // (frequencies * len(at)))
        for start in range(0, len(chosen), most):
            rows = chosen[start : start + most]
            yield piece[rows], first[rows, None] + width[rows, None] * (at + 1) / 2, width[rows, None] * weight / 2


def _membrane(point: OperatingPoint, pieces: NDArray[np.int64], s_per_ms: Complexes) -> Complexes:
    network = point.network
    return network.conductance_nS[pieces, None] + s_per_ms * network.capacitance_pF[pieces, None]


def _between(x: NDArray, where: Floats, near: NDArray, far: NDArray) -> NDArray:
    """(P, G, F) a solution of the cable equation without source along pieces, from its values at their ends (P, F).

    The weights of the ends are sinh x(1 - w)/sinh x and sinh xw/sinh x, w from 0 to 1 (P, G); by exponentials that
    decay, nothing overflows.
    """
    x, w = x[:, None, :], where[:, :, None]
    short = np.abs(x) < SHORT
    safe = np.where(short, 1.0, x)
    from_near, from_far = np.exp(-safe * w), np.exp(-safe * (1 - w))
    below = 1 / (1 - np.exp(-2 * safe))
    at_near, at_far = from_near * (1 - from_far**2) * below, from_far * (1 - from_near**2) * below
    if short.any():
        straight = x * x * w * (1 - w) / 6
        at_near = np.where(short, (1 - w) - straight * (2 - w), at_near)
        at_far = np.where(short, w - straight * (1 + w), at_far)
    return at_near * near[:, None, :] + at_far * far[:, None, :]


def _mean_mV(point: OperatingPoint, pieces: NDArray[np.int64], where: Floats) -> Floats:
    """(P, G) mean voltage along pieces, from the reference."""
    network, still = point.network, point.far_mV[pieces, None]
    x = np.sqrt(network.resistance_GOhm[pieces] * network.conductance_nS[pieces])[:, None]
    near, far = point.deviation_mV[network.parent[1:]][pieces, None], point.deviation_mV[1:][pieces, None]
    return still + _between(x, where, near - still, far - still)[..., 0]


def _event(point: OperatingPoint, index: int, deviation_mV: Floats) -> Floats:
    """Peak current of one event (charge, where it comes at once) where the mean voltage is this."""
    one = point.model.inputs[index]
    if one.conductance_nS is None or one.reversal_mV is None:
        return np.full(len(deviation_mV), one.event_current_pA)
    return one.conductance_nS * (one.reversal_mV - point.reference_mV - deviation_mV)
