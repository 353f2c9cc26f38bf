"""The statistics of one presynaptic spike train: its spectrum over its rate.

With p(ω) the characteristic function of the interval, a stationary renewal train of rate r has the spectrum
r(1 - |p|²)/|1 - p|² (Bartlett 1963, J R Stat Soc B 25:264; Cox & Lewis 1966; from memory).
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from cable.theory.membrane import check_positive
from cable.theory.units import PER_MS_PER_HZ

LARGEST_SHARE = 0.996  # of the mean interval that a dead time may take up: e^{hazard·dead time} must not overflow


@dataclass(frozen=True)
class SpikeTrain:
    """A stationary spike train: Poisson, gamma renewal of an order, or Poisson with a dead time.

    Attributes:
        process: "poisson", "gamma" or "dead time".
        order: shape of the gamma interval, >= 1 (1 is Poisson).
        dead_time_ms: time after each spike without another, ms.
    """

    process: str = "poisson"
    order: float = 1.0
    dead_time_ms: float = 0.0

    @classmethod
    def poisson(cls) -> SpikeTrain:
        """Independent spikes: a flat spectrum."""
        return cls()

    @classmethod
    def gamma(cls, order: float) -> SpikeTrain:
        """Gamma-distributed intervals.

        Raises:
            ValueError: order below 1.
        """
        check_positive(order, "order")
        if order < 1:
            raise ValueError(f"order: expected 1 (Poisson) or more (regular), found {order:g}")
        return cls("gamma", order=order)

    @classmethod
    def dead_time(cls, dead_time_ms: float) -> SpikeTrain:
        """Intervals of a dead time and an exponential rest.

        Raises:
            ValueError: dead_time_ms is not a finite number above zero.
        """
        check_positive(dead_time_ms, "dead_time_ms")
        return cls("dead time", dead_time_ms=dead_time_ms)

    def check_rate(self, rate_Hz: float) -> None:
        """Raise ValueError where the dead time leaves no room for the rate."""
        share = rate_Hz * PER_MS_PER_HZ * self.dead_time_ms
        if LARGEST_SHARE < share < 1:
            raise ValueError(
                f"dead_time_ms = {self.dead_time_ms:g} leaves almost no chance at {rate_Hz:g} Hz, expected at most "
                f"{100 * LARGEST_SHARE:g} % of the mean interval; use a shorter dead time"
            )
        if share >= 1:
            raise ValueError(
                f"dead_time_ms = {self.dead_time_ms:g} allows rates below {1e3 / self.dead_time_ms:g} Hz, "
                f"found {rate_Hz:g} Hz"
            )

    def poles_per_ms(self, rate_Hz: float) -> tuple[complex, ...]:
        """The p > 0 or complex for which the train's spectrum has a pole at iω = -p; those nearest to ω = 0.

        They solve φ(-p) = 1 with φ the Laplace transform of the interval, p ≠ 0: for gamma intervals of order k
        p = kr(1 - e^{2πij/k}), and the branch point kr; with a dead time D and hazard h, h e^{pD} = h - p, solved by
        Lambert's W.
        """
        rate = rate_Hz * PER_MS_PER_HZ
        if self.process == "poisson" or rate == 0:
            return ()
        if self.process == "gamma":
            turns = np.arange(1, max(2, int(self.order // 2) + 1))
            cut = self.order * rate
            return (cut, *(cut * (1 - np.exp(2j * np.pi * turns / self.order))).tolist()) if self.order >= 2 else (cut,)
        from scipy.special import lambertw

        step = rate * self.dead_time_ms / (1 - rate * self.dead_time_ms)
        branches = np.arange(1, 8)
        return tuple(((step - lambertw(step * np.exp(step), branches)) / self.dead_time_ms).tolist())

    def spectrum_over_rate(self, omega_per_ms: NDArray[np.float64], rate_Hz: float) -> NDArray[np.float64]:
        """Two-sided spectrum over the rate at ω (...), rad/ms; 1 for a Poisson train, CV² at ω = 0."""
        omega = np.asarray(omega_per_ms, dtype=float)
        rate = rate_Hz * PER_MS_PER_HZ
        if self.process == "poisson" or rate == 0:
            return np.ones_like(omega)
        if self.process == "gamma":
            return self._gamma(omega, rate)
        hazard = rate / (1 - rate * self.dead_time_ms)
        half = 0.5 * omega * self.dead_time_ms
        # over ω²: 1 + 2hD·sinc(ωD) + h²D²·sinc²(ωD/2)
        step = hazard * self.dead_time_ms
        return 1 / (1 + 2 * step * np.sinc(2 * half / np.pi) + step**2 * np.sinc(half / np.pi) ** 2)

    def one_sided_over_rate(self, s_per_ms: NDArray[np.complex128], rate_Hz: float) -> NDArray[np.complex128]:
        """1 + 2∫₀^∞ (R(t) - r) e^{-st} dt at s (...) with Re s > 0, R(t) the rate of spikes at t after a spike.

        For a renewal train the integral is φ/(1 - φ) - r/s. On the imaginary axis the real part is the spectrum over
        the rate; to the right of it nothing oscillates, however regular the train.
        """
        s, rate = np.asarray(s_per_ms, dtype=complex), rate_Hz * PER_MS_PER_HZ
        if self.process == "poisson" or rate == 0:
            return np.ones(s.shape, dtype=np.complex128)
        if self.process == "gamma":
            order = complex(self.order)
            after = -1 - 1 / np.expm1(-order * _log1p(s / (order * rate)))
        else:
            hazard, dead = rate / (1 - rate * self.dead_time_ms), self.dead_time_ms
            after = hazard * np.exp(-s * dead) / (s - hazard * np.expm1(-s * dead))
        return np.asarray(1 + 2 * (after - rate / s))

    def spectrum_over_rate_at(self, s_per_ms: NDArray[np.complex128], rate_Hz: float) -> NDArray[np.complex128]:
        """The same continued to complex s = iω (...), 1/ms: (1 - φ(s)φ(-s))/((1 - φ(s))(1 - φ(-s))).

        Each of the three differences is computed as one, so that nothing cancels at low frequency.
        """
        s = np.asarray(s_per_ms, dtype=complex)
        rate = rate_Hz * PER_MS_PER_HZ
        if self.process == "poisson" or rate == 0:
            return np.ones_like(s)
        small = np.abs(s) < 1e-9 * rate
        t = np.where(small, rate + 0j, s)
        if self.process == "gamma":
            order = complex(self.order)
            x = t / (order * rate)
            ahead, back = _log1p(x), _log1p(-x)
            both = np.where(np.abs(x) < 0.5, _log1p(-x * x), ahead + back)
            value = -np.expm1(-order * both) / np.expm1(-order * ahead) / np.expm1(-order * back)
        else:
            hazard, dead = rate / (1 - rate * self.dead_time_ms), self.dead_time_ms
            value = t / (t - hazard * np.expm1(-t * dead)) * (t / (t + hazard * np.expm1(t * dead)))
        return np.where(small, self.spectrum_over_rate(np.zeros(s.shape), rate_Hz), value)

    def _gamma(self, omega: NDArray[np.float64], rate: float) -> NDArray[np.float64]:
        x = omega / (self.order * rate)
        log_p = -self.order * _log1p(1j * x)
        with np.errstate(divide="ignore", invalid="ignore"):
            value = -np.expm1(2 * log_p.real) / np.abs(np.expm1(log_p)) ** 2
        return np.where(x < 1e-7, 1 / self.order, value)


def _log1p(z: NDArray[np.complexfloating]) -> NDArray[np.complex128]:
    """ln(1 + z) whose real part keeps its digits for small z, which numpy's does not for complex numbers."""
    with np.errstate(divide="ignore"):
        return 0.5 * np.log1p(2 * z.real + z.real**2 + z.imag**2) + 1j * np.angle(1 + z)
