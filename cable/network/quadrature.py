"""The frequency nodes of ∫₀^∞ S dω and the certificate that comes with them.

With ω = ω₀ sinh u the spectrum of a passive tree is analytic in |Im u| < π/2 as soon as ω₀ is not above its
slowest relaxation rate, because all its poles lie on the imaginary ω axis beyond that rate. In a strip
|Im u| < a the trapezoidal rule with step h errs by A·e^{-2πa/h} (Trefethen & Weideman 2014, SIAM Rev 56:385,
theorem 5.1; from memory). The rules with h and 2h share nodes; their difference d measures A, and
`SAFETY`·d·e^{-πa/h} certifies the finer rule. It is an estimate with a margin, not a proof.
"""

from __future__ import annotations

import math
from collections.abc import Callable
from concurrent.futures import ThreadPoolExecutor
from dataclasses import dataclass
from itertools import pairwise

import numpy as np
from numpy.typing import NDArray

Floats = NDArray[np.float64]
Function = Callable[[Floats], Floats]

SAFETY = 10.0
USUAL = 100.0  # amplitude A for which the first step is chosen; seen: 4 for one pole, up to 60 on real cells
CONTINUED = 1.5  # on the geometric continuation of the tail
LEAST = 65.0  # amplitude that is assumed however well two rules agree; with it the report is near the tolerance
PLAUSIBLE = 1e3  # an amplitude A beyond this says that the strip is narrower than thought
BLOCK = 10  # frequencies handled at once
MAX_HALVINGS = 6
MAX_U = 120.0


class NotConverged(ArithmeticError):
    """The integral could not be brought to the stated tolerance."""


@dataclass(frozen=True, eq=False)
class Integral:
    """(1/π)∫₀^∞ f dω for a block of functions.

    Attributes:
        value: the integrals, of the shape that the functions have.
        relative_error: the certified error, at most, relative to `scale` where one was given.
        at_zero: the functions' values at ω = 0.
        omega_per_ms, weights: (M,) the nodes used and what each counts.
        step: the distance of the nodes in u.
    """

    value: Floats
    relative_error: float
    at_zero: Floats
    omega_per_ms: Floats
    weights: Floats
    step: float


def first_step(tolerance: float, strip: float) -> float:
    """The step h for which the certificate should come out below `tolerance` for usual amplitudes A."""
    return 2 * math.pi * strip / math.log(USUAL * SAFETY / tolerance)


def _trapezoid_error(difference: float, step: float, strip: float) -> float:
    """Bound on the error of the finer of two nested rules that differ by `difference`, relative.

    Two rules may agree by chance, when the terms of several poles cancel in their difference and not in the error;
    so no amplitude below `LEAST` is believed.
    """
    rate = math.exp(-math.pi * strip / step)
    return SAFETY * max(difference, LEAST * rate) * rate if difference <= PLAUSIBLE * rate else difference


def integrate(
    function: Function,
    scale: Callable[[Floats], Floats],
    slowest_rate_per_ms: float,
    tolerance: float,
    first_guess_u: float,
    strip: float = math.pi / 2,
    crowded: bool = False,
    threads: int = 2,
    adapted: Callable[[float], Function] | None = None,
    block: int = BLOCK,
) -> Integral:
    """Integrate `function` over all positive angular frequencies to `tolerance`, relative to `scale` of the result.

    Args:
        function: maps ω (F,) to values (..., F), even in ω.
        scale: maps the integrals (...) to the positive numbers that errors are measured by.
        slowest_rate_per_ms: no pole of the integrand lies nearer to ω = 0 than this.
        tolerance: wanted relative error.
        first_guess_u: where the range in u is expected to end; it is extended until the tail is negligible.
        strip: half width a of the strip in u where the integrand is analytic.
        crowded: poles come ever nearer to the real axis at high frequency, as with dead times; then only
            the plain difference of the two rules certifies.
        threads: how many blocks of frequencies are worked on at once.
        block: how many frequencies are handled at once.
        adapted: maps a step h to the function that rules of this step are to sum, where it depends on the step.

    Raises:
        NotConverged: the tolerance was not reached with the finest step or the longest range.
    """
    step = first_step(tolerance, strip)
    with ThreadPoolExecutor(threads) as pool:
        rule = _Rule(adapted or (lambda _: function), adapted is not None, slowest_rate_per_ms, pool, block)
        for _ in range(MAX_HALVINGS):
            last = _whole_blocks(first_guess_u / step, block, threads)
            while True:
                total, coarse, tail = rule.sums(step, last)
                size = scale(total)
                size = np.where(size > 0, size, 1.0)
                left_out = float(np.max(tail / size, initial=0.0))
                if left_out <= 0.3 * tolerance:
                    break
                last += block
                if last * step > MAX_U:
                    raise NotConverged("the spectrum falls too slowly for its integral to be certified")
            difference = float(np.max(np.abs(total - coarse) / size, initial=0.0))
            error = left_out + (SAFETY * difference if crowded else _trapezoid_error(difference, step, strip))
            if error <= tolerance:
                omega, weights = rule.nodes(step, last)
                return Integral(total, error, rule.at_zero, omega, weights, step)
            step, first_guess_u = step / 2, last * step
    raise NotConverged(f"the frequency integral reached a relative error of {error:.1e}, not {tolerance:.1e}")


def _whole_blocks(wanted: float, block: int, threads: int) -> int:
    """The last node's index for about `wanted` nodes, so that blocks are full or of one size for all threads."""
    nodes = max(4, math.ceil(wanted) + 1)
    blocks = math.ceil(nodes / block / threads) * threads
    return math.ceil(nodes / blocks) * blocks - 1


class _Rule:
    """Trapezoidal sums in u. Sums over blocks of nodes are kept, so that a longer range only adds to them."""

    def __init__(
        self, function: Callable[[float], Function], differs: bool, omega0: float, pool: ThreadPoolExecutor, block: int
    ) -> None:
        self.function_of, self.differs, self.omega0, self.pool, self.block = function, differs, omega0, pool, block
        self.step, self.ends, self.parts = 0.0, [0], list[tuple[Floats, Floats, Floats]]()
        self.at_zero: Floats = np.zeros(0)

    def nodes(self, step: float, last: int) -> tuple[Floats, Floats]:
        """ω and weights of the rule with this step and range."""
        u = np.arange(last + 1) * step
        weights = self.omega0 * np.cosh(u) * step / np.pi
        weights[0] /= 2
        return self.omega0 * np.sinh(u), weights

    def sums(self, step: float, last: int) -> tuple[Floats, Floats, Floats]:
        """The sum with `step`, the sum with twice `step`, and the size of the tail beyond the range."""
        if step != self.step:
            self.step, self.ends, self.parts = step, [0], []
            self.function, self.coarse = self.function_of(step), self.function_of(2 * step)
        first = self.ends[-1]
        pieces = math.ceil((last + 1 - first) / self.block)
        ends = np.linspace(first, last + 1, pieces + 1).astype(int).tolist()
        omega, weights = self.nodes(step, last)
        jobs = [(omega[a:b], weights[a:b], np.arange(a, b) % 2 == 0) for a, b in pairwise(ends)]
        self.parts += self.pool.map(self._block, jobs)
        self.ends += ends[1:]
        total = np.sum([part[0] for part in self.parts], axis=0)
        coarse = 2 * np.sum([part[1] for part in self.parts], axis=0)
        final = self.parts[-1][2]
        return total, coarse, _tail(final[..., -2], final[..., -1])

    def _block(self, job: tuple[Floats, Floats, NDArray[np.bool_]]) -> tuple[Floats, Floats, Floats]:
        omega, weights, even = job
        values = self.function(omega)
        if omega[0] == 0:
            self.at_zero = values[..., 0].copy()
        second = self.coarse(omega[even]) if self.differs else values[..., even]
        return values @ weights, second @ weights[even], values[..., -2:] * weights[-2:]


def _tail(before: Floats, last: Floats) -> Floats:
    """A bound on what the summands beyond the range add, from the ratio of the last two.

    A mixture of powers falls ever more slowly than its last ratio says; `CONTINUED` allows for that.
    """
    before, last = np.abs(before), np.abs(last)
    with np.errstate(divide="ignore", invalid="ignore"):
        ratio = np.clip(np.where(before > 0, last / before, 0.0), 0.0, 0.95)
    return CONTINUED * last * np.maximum(ratio / (1 - ratio), 0.5)
