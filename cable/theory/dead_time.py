"""Spike trains with a dead time, seen in lag: what they make of a covariance that Poisson trains would have.

A train of rate r has spikes at the rate R(u) at time u after one of them; the covariance of what it drives is
that of a Poisson train convolved with δ(u) + R(|u|) - r (Cox & Lewis 1966; from memory). With a dead time D and
a hazard h beyond it, R(u) = Σ_n h (h(u - nD))^{n-1} e^{-h(u - nD)}/(n-1)! over nD < u (the sum of n intervals),
which has a jump at D and kinks at its multiples. So no path in the frequency plane serves all lags, but where the
covariance is a sum of waves e^{iω|t|} each wave can be convolved in closed form (derived here, checked against
adaptive Fourier integrals). From `switch` on R is written as its poles, of which a few dozen then suffice.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from functools import cached_property

import numpy as np
from numpy.typing import NDArray

from cable.theory.units import PER_MS_PER_HZ

Floats = NDArray[np.float64]
Complexes = NDArray[np.complex128]
FEWEST_POLES, DIGITS = 32, 35.0  # poles kept, at least; natural logarithm of the accuracy of their sum
MOST_REGULAR = 300.0  # hazard times dead time, beyond which the poles' equation overflows
NEARLY = 0.5  # |zT| below which (e^{zT} - 1)/z is computed as such


@dataclass(frozen=True)
class DeadTime:
    """A Poisson train with a dead time.

    Attributes:
        rate_Hz: its rate.
        dead_time_ms: time after each spike without another.

    Raises:
        ValueError: a dead time that takes up more than 99.6 % of the mean interval.
    """

    rate_Hz: float
    dead_time_ms: float

    def __post_init__(self) -> None:
        if self.hazard * self.dead_time_ms > MOST_REGULAR or self.hazard < 0:
            raise ValueError(
                f"dead_time_ms = {self.dead_time_ms:g} leaves almost no chance at {self.rate_Hz:g} Hz, "
                "expected at most 99.6 % of the mean interval; use a shorter dead time"
            )

    @property
    def rate(self) -> float:
        """Spikes per ms."""
        return self.rate_Hz * PER_MS_PER_HZ

    @property
    def hazard(self) -> float:
        """Spikes per ms once the dead time is over."""
        free = 1 - self.rate * self.dead_time_ms
        return self.rate / free if free > 0 else math.inf

    @cached_property
    def poles(self) -> tuple[Complexes, Complexes]:
        """p and c of R(u) - r = Σ c e^{-pu}, both members of each conjugate pair, 1/ms."""
        from scipy.special import lambertw

        step, dead = self.hazard * self.dead_time_ms, self.dead_time_ms
        branches = np.arange(1, max(FEWEST_POLES, math.ceil(step)) + 1)
        p = np.empty((2, len(branches)), dtype=np.complex128)
        p[0] = (step - lambertw(step * np.exp(step), branches)) / dead
        p[1] = p[0].conj()
        return p.ravel(), np.reciprocal(dead + np.reciprocal(complex(self.hazard) - p.ravel()))

    @cached_property
    def switch(self) -> int:
        """The number of dead times from which on the poles kept give R to all digits."""
        last = len(self.poles[0]) / 2
        return math.ceil(DIGITS / math.log(2 * math.pi * last / (self.hazard * self.dead_time_ms)))

    def waves(self, lag_ms: Floats, omega_per_ms: Complexes) -> tuple[Complexes, Complexes]:
        """What is left of a wave, ahead and behind: two (L, F) with ω (F,) in the upper half plane, lags (L,) >= 0.

        Where Poisson trains give Σ a e^{iωt} for t > 0 and Σ b e^{-iωt} for t < 0, these give Σ a·ahead + b·behind.
        """
        lag, omega = np.asarray(lag_ms, dtype=float)[:, None], np.asarray(omega_per_ms)[None, :]
        s, rate, hazard, dead = -1j * omega, self.rate, self.hazard, self.dead_time_ms
        wave = np.exp(1j * omega * lag)
        beyond = hazard * np.exp(-s * dead) / (s - hazard * np.expm1(-s * dead)) - rate / s
        ahead = wave * (1 + beyond)
        end = self.switch * dead
        # the mean rate, taken off from lag 0 to `end`
        left = np.maximum(lag - end, 0.0)
        ahead -= rate * (wave - np.exp(1j * omega * left)) / (1j * omega)
        behind = -rate * (np.exp(1j * omega * np.maximum(end - lag, 0.0)) - 1) / (1j * omega)
        for n in range(1, self.switch):
            ahead += self._past(n, lag, omega, np.minimum(lag, end) - n * dead)
            behind += self._coming(n, lag, omega, np.maximum(lag, n * dead) - n * dead)
            behind -= self._coming(n, lag, omega, np.maximum(lag, end) - n * dead)
        start = np.maximum(lag, end)
        for p, c in zip(*self.poles, strict=True):
            faded = np.exp(-p * start)
            behind += c * faded * np.exp(1j * omega * (start - lag)) / (p - 1j * omega)
            z = p + 1j * omega
            near = np.abs(z * left) < NEARLY
            apart = np.where(near, 1.0, z)
            far = (np.exp(-p * end + 1j * omega * left) - faded) / apart
            close = faded * np.expm1(np.where(near, z * left, 0.0)) / np.where(z == 0, 1.0, z)
            ahead += c * np.where(near, np.where(z == 0, faded * left, close), far)
        return ahead, behind

    def _past(self, n: int, lag: Floats, omega: Complexes, since: Floats) -> Complexes:
        """∫₀^since e^{iω(lag - nD - y)} of the density of the sum of n free times y; 0 for since < 0."""
        ratio = self.hazard / (self.hazard + 1j * omega)
        y = np.maximum(since, 0.0)
        start = np.maximum(lag - n * self.dead_time_ms, 0.0)
        value = np.exp(1j * omega * start)
        tail = np.exp(1j * omega * (start - y) - self.hazard * y)
        for k in range(n):
            value = ratio * (value - tail * ((self.hazard * y) ** k / math.factorial(k)))
        return np.where(since > 0, value, 0.0)

    def _coming(self, n: int, lag: Floats, omega: Complexes, since: Floats) -> Complexes:
        """∫_since^∞ e^{iω(nD + y - lag)} of the density of the sum of n free times y."""
        ratio = self.hazard / (self.hazard - 1j * omega)
        tail = np.exp(1j * omega * (n * self.dead_time_ms + since - lag) - self.hazard * since)
        value = np.zeros_like(tail)
        for k in range(n):
            value = ratio * (value + tail * ((self.hazard * since) ** k / math.factorial(k)))
        return value
