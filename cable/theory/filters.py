"""What the amplifier and the analysis do to a record: low-pass filter, high-pass filter, removal of trends.

Filters are analog and exact: |H(ω)|² comes from their poles, nothing is sampled.
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property

import numpy as np
from numpy.typing import NDArray

from cable.theory.membrane import check_positive
from cable.theory.units import OMEGA_PER_MS_PER_HZ

Floats = NDArray[np.float64]
Complexes = NDArray[np.complex128]
FAMILIES = ("bessel", "butterworth")
TRENDS = {"mean": 0, "line": 1}  # degree of the polynomial that is taken off
MAX_ORDER = 12
MAX_CORNER_HZ = 1e6  # no amplifier for cells passes more
FAR = 1e24  # corners above its own, a filter of order 12 still has a finite product


@dataclass(frozen=True)
class LowPass:
    """An analog low-pass filter, of gain 1 at zero frequency.

    Attributes:
        family: "bessel" (Thomson 1949, Proc IEE 96:487; from memory) or "butterworth" (Butterworth 1930,
            Wireless Engineer 7:536; from memory).
        order: number of poles, 1 to 12.
        corner_Hz: where the power has fallen to one half (-3 dB), at most 1 MHz.

    Raises:
        ValueError: an unknown family, an order or a corner outside these limits.
    """

    family: str
    order: int
    corner_Hz: float

    def __post_init__(self) -> None:
        if self.family not in FAMILIES:
            raise ValueError(f'family: found {self.family!r}, expected "bessel" or "butterworth"')
        if isinstance(self.order, bool) or not isinstance(self.order, int) or not 1 <= self.order <= MAX_ORDER:
            raise ValueError(f"order: found {self.order!r}, expected a whole number of poles, 1 to {MAX_ORDER}")
        check_positive(self.corner_Hz, "corner_Hz")
        if self.corner_Hz > MAX_CORNER_HZ:
            raise ValueError(
                f"corner_Hz: found {self.corner_Hz:g}, expected Hz and at most {MAX_CORNER_HZ:g}, beyond what "
                "amplifiers pass; correct it, or leave the filter out for none"
            )

    @cached_property
    def _unit_poles(self) -> Complexes:
        from scipy import signal

        if self.family == "bessel":
            return signal.bessel(self.order, 1.0, analog=True, output="zpk", norm="mag")[1]
        return signal.butter(self.order, 1.0, analog=True, output="zpk")[1]

    @property
    def poles_per_ms(self) -> tuple[complex, ...]:
        """The p, of positive real part, with H ∝ Π 1/(1 + iω/p)."""
        return tuple((-self._unit_poles * self.corner_Hz * OMEGA_PER_MS_PER_HZ).tolist())

    def response(self, omega_per_ms: Floats) -> Complexes:
        """Complex gain at ω (...), rad/ms."""
        relative = np.minimum(np.asarray(omega_per_ms, dtype=float) / (self.corner_Hz * OMEGA_PER_MS_PER_HZ), FAR)
        product = np.ones(relative.shape, dtype=np.complex128)
        for pole in self._unit_poles:
            product = product * (1 - 1j * relative / pole)
        return 1 / product


def high_pass(omega_per_ms: Floats, corner_Hz: float) -> Complexes:
    """Complex gain iω/(iω + ω_c) of a resistor and a capacitor in series, at ω (...), rad/ms."""
    omega = np.asarray(omega_per_ms, dtype=float)
    return omega / (omega - 1j * corner_Hz * OMEGA_PER_MS_PER_HZ)


def removed_by_trend(half_turns: Floats, trend: str) -> Floats:
    """Share of the power at ω that goes with the trend of windows of W ms, at half_turns = ωW/2 (...).

    Each window loses its mean, or the straight line fitted to it by least squares: the projection on Legendre
    polynomials, whose transforms are spherical Bessel functions, so that the share is j₀² or j₀² + 3j₁² (derived
    here). It is exact for the mean square of what is left in a window.
    """
    from scipy.special import spherical_jn

    x = np.asarray(half_turns, dtype=float)
    return sum((2 * n + 1) * spherical_jn(n, x) ** 2 for n in range(TRENDS[trend] + 1))


def kept_of_trend(half_turns: Floats, trend: str) -> Floats:
    """1 - `removed_by_trend`, without cancellation at slow frequencies, since Σ(2n+1)jₙ² = 1."""
    from scipy.special import spherical_jn

    x = np.asarray(half_turns, dtype=float)
    slow = np.minimum(x, 1.0)
    series = sum((2 * n + 1) * spherical_jn(n, slow) ** 2 for n in range(TRENDS[trend] + 1, 14))
    return np.where(x < 1.0, series, 1 - removed_by_trend(x, trend))
