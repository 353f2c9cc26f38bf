"""What a conductance event does beyond linear order: it saturates, and it scatters the voltage that it meets.

One event of the time course h(t) at a place whose impedance is Z drives, per mV of driving force u(t), the current
    i(t) = h(t)·[u(t) - (z * i)(t)],
as its own voltage takes driving force away (a Volterra equation). Every kernel is a sum of exponentials c e^{-pt}, and
multiplying by one shifts a transform; so the equation is a difference equation,
    î(s) = ĥ(s) - Σ c Z(s + p) î(s + p)            for u = 1, and
    T(s) = ĥ(0) - Σ c Z(s + p) [ĥ(p) - Σ c' Z(s + p + p') ĥ(p + p') + ...]
for the mean response to u = e^{st} of events that come at any time: events of the rate r act on the voltage as the
admittance r T(s), of which r ĥ(0) is the mean conductance that the linear theory knows. The rest is the fluctuating
admittance, to lowest order -∫ C_g(τ) z(τ) e^{-sτ} dτ with C_g the covariance of the conductance. T(0) = î(0): what
saturation takes from the charge of an event is what it takes from the mean conductance.

The first two corrections b₁, b₂ are computed and continued as a geometric series, 1 - b₁/(1 + b₂/b₁) (derived here;
the series alternates, and b₁ is a few percent for synapses of usual size).
"""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from cable.noise.beyond.local_impedance import LocalImpedance
from cable.theory.kernel import Kernel
from cable.theory.synapse import SynapticInput

Complexes = NDArray[np.complex128]
Floats = NDArray[np.float64]
APART = 2e-3  # relative distance to which equal rates are moved; the kernel changes by about its square


@dataclass(frozen=True, eq=False)
class Exponentials:
    """A kernel as Σ c e^{-pt} with rates that differ.

    Attributes:
        factors: (K,) the c.
        rates_per_ms: (K,) the p.
    """

    factors: Complexes
    rates_per_ms: Complexes

    def laplace(self, s_per_ms: Complexes) -> Complexes:
        """Transform at s (...), ms."""
        s = np.asarray(s_per_ms, dtype=complex)[..., None]
        return (self.factors / (s + self.rates_per_ms)).sum(axis=-1)

    @property
    def covariance_factors(self) -> Complexes:
        """(K,) the b of ∫k(u)k(u + |τ|)du = Σ b e^{-p|τ|}."""
        return self.factors * self.laplace(self.rates_per_ms)


def exponentials(kernel: Kernel) -> Exponentials:
    """The kernel as a sum of exponentials. Equal rates (an alpha function) are moved apart a little.

    Raises:
        ValueError: an impulse, which has no rate.
    """
    if kernel.is_impulse:
        raise ValueError("an impulse is no sum of exponentials")
    rates = np.array(kernel.poles_per_ms, dtype=complex)
    for k in range(len(rates)):
        equal = np.flatnonzero(np.abs(rates - rates[k]) < 0.1 * APART * np.abs(rates[k]))
        if len(equal) > 1:
            rates[equal] = rates[k] * np.exp(APART * (np.arange(len(equal)) - (len(equal) - 1) / 2))
    numerator = np.polynomial.polynomial.polyval(-rates, kernel.numerator)
    with np.errstate(divide="ignore"):
        gaps = 1 - rates[:, None] / rates
    np.fill_diagonal(gaps, 1.0)
    return Exponentials(numerator * rates / gaps.prod(axis=1), rates)


@dataclass(frozen=True, eq=False)
class Scattering:
    """Events of one population at every node.

    Attributes:
        admittance_nS_ms: (E + 1, F) T(s) - ĥ(0): what a synapse's mean admittance changes by, over its rate.
        relative: (E + 1, F) î(s)/ĥ(s): what saturation leaves of an event's current.
    """

    admittance_nS_ms: Complexes
    relative: Complexes


def scattering(one: SynapticInput, local: LocalImpedance, s_per_ms: NDArray[np.complexfloating]) -> Scattering:
    """The events of a conductance input at every node, at s (F,), Re s ≥ 0."""
    assert one.conductance_nS is not None
    s, peak = np.asarray(s_per_ms, dtype=complex), one.conductance_nS
    parts = exponentials(one.kernel)
    c, p = peak * parts.factors, parts.rates_per_ms
    shifted = [local.at(s + rate) for rate in p]
    h = peak * one.kernel.laplace(s)
    first = second = event_first = event_second = np.zeros(shifted[0].shape, dtype=np.complex128)
    for j, (cj, pj) in enumerate(zip(c, p, strict=True)):
        first = first + cj * peak * parts.laplace(pj) * shifted[j]
        event_first = event_first + cj * peak * parts.laplace(s + pj) * shifted[j]
        for k in range(j, len(c)):
            pair = pj + p[k]
            either_order = shifted[j] if k == j else shifted[j] + shifted[k]
            both = cj * c[k] * local.at(s + pair) * either_order
            second = second + both * peak * parts.laplace(pair)
            event_second = event_second + both * peak * parts.laplace(s + pair)
    m2, m3, m4 = (one.size_moment(n) for n in (2, 3, 4))
    return Scattering(
        admittance_nS_ms=-_continued(m2 * first, m3 * second),
        relative=1 - _continued(m3 / m2 * event_first / h, m4 / m2 * event_second / h),
    )


def _continued(first: Complexes, second: Complexes) -> Complexes:
    """first - second + ..., continued as a geometric series."""
    ratio = np.divide(second, first, out=np.zeros_like(first), where=first != 0)
    return first / (1 + ratio)


def conductance_covariance(one: SynapticInput) -> tuple[Complexes, Complexes]:
    """The b (nS²/ms, of one synapse) and p (1/ms) of C_g(τ) = Σ b e^{-p|τ|} for Poisson events."""
    parts, peak = exponentials(one.kernel), one.conductance_nS or 0.0
    return one.rate_per_ms * peak**2 * one.size_moment(2) * parts.covariance_factors, parts.rates_per_ms


def fastest_rate_per_ms(inputs: tuple[SynapticInput, ...]) -> float:
    """The fastest rate of the kernels of all conductances, 1/ms; 0 where there is none."""
    rates = [abs(p) for one in inputs if one.conductance_nS is not None for p in one.kernel.poles_per_ms]
    return max(rates, default=0.0) if all(math.isfinite(rate) for rate in rates) else 0.0
