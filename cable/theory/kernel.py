"""The time course of one synaptic event: peak 1, zero before t = 0, with its exact transform.

Every kernel is a finite sum of terms c·tⁿ·e^{-pt} with Re p > 0, so its transform is a ratio of polynomials in
s = iω and nothing about it is sampled. The transform is kept as one fraction, N(s)/Π(1 + s/p): summed term
by term it would lose its leading digits at high frequency, where the terms cancel. The impulse, an event whose
whole charge arrives at once, has no term and no pole: its area is 1, and so is its transform.
"""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import dataclass
from functools import cached_property
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from cable.theory.membrane import check_positive
from cable.theory.spelling import LATEX, PLAIN, Term, spelled

if TYPE_CHECKING:
    import sympy

Floats = NDArray[np.float64]
SAMPLES_A_CYCLE = 24  # of a kernel that rings, in search of its peak


@dataclass(frozen=True)
class Kernel:
    """Time course of one event, scaled to a peak of 1; for the impulse, to an area of 1.

    Attributes:
        terms: the sum that it is.
        numerator: coefficients of N(s), constant first.
        poles_per_ms: the p of Π(1 + s/p), repeated by multiplicity.
        formula: the kernel as a formula in t (ms), with all digits.
    """

    terms: tuple[Term, ...]
    numerator: tuple[float, ...]
    poles_per_ms: tuple[complex, ...]
    formula: str

    @classmethod
    def impulse(cls) -> Kernel:
        """An event that is over at once. Its area is 1, so that the size of an event is its charge."""
        return cls((), (1.0,), (), "DiracDelta(t)")

    @classmethod
    def exponential(cls, decay_ms: float) -> Kernel:
        """e^{-t/decay}: jumps to 1 at t = 0.

        Raises:
            ValueError: decay_ms is not a finite number above zero.
        """
        check_positive(decay_ms, "decay_ms")
        rate = 1 / decay_ms
        return cls((Term(1.0, 0, rate),), (decay_ms,), (rate,), f"exp(-t/{decay_ms!r})")

    @classmethod
    def alpha(cls, alpha_ms: float) -> Kernel:
        """(t/α)·e^{1-t/α}: the alpha function, with its peak at t = α (Rall 1967, J Neurophysiol 30:1138; from memory).

        Raises:
            ValueError: alpha_ms is not a finite number above zero.
        """
        check_positive(alpha_ms, "alpha_ms")
        rate = 1 / alpha_ms
        return cls(
            (Term(math.e * rate, 1, rate),),
            (math.e * alpha_ms,),
            (rate, rate),
            f"t/{alpha_ms!r}*exp(1 - t/{alpha_ms!r})",
        )

    @classmethod
    def two_exponential(cls, rise_ms: float, decay_ms: float) -> Kernel:
        """(e^{-t/decay} - e^{-t/rise}) over its peak.

        Raises:
            ValueError: a time is not positive and finite, or rise_ms is not below decay_ms.
        """
        check_positive(rise_ms, "rise_ms")
        check_positive(decay_ms, "decay_ms")
        if not rise_ms < decay_ms:
            raise ValueError(
                f"rise_ms ({rise_ms:g}) must be below decay_ms ({decay_ms:g}); for equal times use alpha_ms"
            )
        gap = 1 / rise_ms - 1 / decay_ms
        log_ratio = math.log1p((decay_ms - rise_ms) / rise_ms)
        scale = math.exp(log_ratio / gap / decay_ms) / -math.expm1(-log_ratio)
        # the peak is e^{-t*/decay}(1 - rise/decay) at t* = log(decay/rise)/gap
        terms = Term(scale, 0, 1 / decay_ms), Term(-scale, 0, 1 / rise_ms)
        text = f"{scale!r}*(exp(-t/{decay_ms!r}) - exp(-t/{rise_ms!r}))"
        return cls(terms, (scale * (decay_ms - rise_ms),), (1 / rise_ms, 1 / decay_ms), text)

    @classmethod
    def expression(cls, text: str) -> Kernel:
        """A kernel from arithmetic in t (ms): numbers, + - * / ** ( ), exp, sin, cos, pi; scaled to a peak of 1.

        Raises:
            ValueError: not arithmetic in t, not a sum of polynomials times exponentials, or it does not decay.
        """
        from cable.theory.expression import kernel_from_text

        return kernel_from_text(text)

    def value(self, t_ms: NDArray[np.float64] | float) -> NDArray[np.float64]:
        """The kernel at times t_ms (...), 0 before t = 0; an impulse is infinite at t = 0."""
        t = np.asarray(t_ms, dtype=float)
        if self.is_impulse:
            return np.where(t == 0, np.inf, 0.0)
        after = np.maximum(t, 0.0)
        total = sum((term.factor * after**term.power * np.exp(-term.rate_per_ms * after)).real for term in self.terms)
        return np.where(t >= 0, total, 0.0)

    def transform(self, omega_per_ms: NDArray[np.float64] | float) -> NDArray[np.complex128]:
        """∫k(t)e^{-iωt}dt at ω (...), rad/ms; in ms."""
        return self.laplace(1j * np.asarray(omega_per_ms, dtype=float))

    def laplace(self, s_per_ms: NDArray[np.complex128] | float) -> NDArray[np.complex128]:
        """∫k(t)e^{-st}dt at complex s (...), 1/ms; in ms."""
        s = np.asarray(s_per_ms, dtype=complex)
        value = np.polynomial.polynomial.polyval(s, self.numerator)
        for pole in self.poles_per_ms:
            value = value / (1 + s / pole)
        return value

    @property
    def is_impulse(self) -> bool:
        """Whether the event is over at once."""
        return not self.poles_per_ms

    @property
    def area_ms(self) -> float:
        """∫k dt, ms; for the impulse 1, without unit."""
        return float(self.numerator[0])

    @property
    def falls_as(self) -> int:
        """The n with k̂ ~ ω^{-n} at high frequency: 0 for an impulse, 1 for a jump at t = 0, 2 for a corner there."""
        return len(self.poles_per_ms) - (len(self.numerator) - 1)

    @property
    def slowest_rate_per_ms(self) -> float:
        """The slowest rate at which the kernel decays, 1/ms; infinite for an impulse."""
        return min((complex(p).real for p in self.poles_per_ms), default=math.inf)

    @cached_property
    def peak_ms(self) -> float:
        """The time of the peak, ms."""
        return 0.0 if self.is_impulse else peak_of(self.value, self.poles_per_ms)[0]

    @cached_property
    def text(self) -> str:
        """The kernel as arithmetic in t (ms), its numbers to 4 significant digits."""
        return spelled(self.terms, PLAIN)

    @cached_property
    def latex(self) -> str:
        """The kernel as LaTeX, its numbers to 4 significant digits."""
        return spelled(self.terms, LATEX)

    @property
    def symbolic(self) -> sympy.Expr:
        """The kernel as a sympy expression in t (ms), with all digits."""
        from cable.theory.expression import parse_expression

        if self.is_impulse:
            import sympy

            return sympy.DiracDelta(sympy.Symbol("t", real=True))
        return parse_expression(self.formula)


def peak_of(value: Callable[..., NDArray[np.float64]], poles_per_ms: tuple[complex, ...]) -> tuple[float, float]:
    """Time (ms) and height of the largest absolute value of a kernel with these poles."""
    from scipy.optimize import minimize_scalar

    slow = min(complex(p).real for p in poles_per_ms)
    fast = max(abs(p) for p in poles_per_ms)
    last = 60.0 / slow
    times = np.r_[0.0, np.geomspace(1e-3 / fast, last, 4001)]
    rings = max(abs(complex(p).imag) for p in poles_per_ms)
    if rings > 0:
        cycles = math.ceil(rings * last / (2 * math.pi))
        times = np.unique(np.r_[times, np.linspace(0.0, last, SAMPLES_A_CYCLE * cycles + 1)])
    heights = np.abs(value(times))
    best = int(np.argmax(heights))
    if rings > 0:
        best = _highest_cycle(value, times, heights)
    if best == 0:
        return 0.0, float(value(0.0))
    low, high = times[best - 1], times[min(best + 1, len(times) - 1)]
    found = minimize_scalar(
        lambda t: -abs(float(value(t))), bounds=(low, high), method="bounded", options={"xatol": 1e-12 * high}
    )
    return float(found.x), float(value(found.x))


def _highest_cycle(value: Callable[..., NDArray[np.float64]], times: Floats, heights: Floats) -> int:
    """The sample beside the highest peak, which need not be the highest sample: cycles are met at different phases."""
    near = np.flatnonzero(heights[1:-1] > 0.9 * heights.max()) + 1
    near = near[(heights[near] >= heights[near - 1]) & (heights[near] >= heights[near + 1])]
    if not near.size:
        return int(np.argmax(heights))
    inside = np.linspace(0.0, 1.0, 33)
    low, high = times[near - 1], times[near + 1]
    fine = np.abs(value(low[:, None] + (high - low)[:, None] * inside))
    top = np.clip(fine.argmax(axis=1), 1, len(inside) - 2)
    left, middle, right = (np.take_along_axis(fine, (top + k)[:, None], axis=1)[:, 0] for k in (-1, 0, 1))
    bend = 2 * middle - left - right
    peaks = middle + np.divide((right - left) ** 2, 8 * bend, out=np.zeros_like(bend), where=bend > 0)  # of a parabola
    best = int(np.argmax(peaks))
    return int(near[best]) if peaks[best] > heights[0] else 0
