"""The trapezoidal rule in u = asinh(ω/ω₀) on a few real frequencies, and transforms of spectra known only there.

Between nodes u = jh a spectrum that is analytic in a strip of half width a is known from its values by sinc
interpolation, to e^{-πa/h} (Stenger 1993, Numerical Methods Based on Sinc and Analytic Functions; from memory). An
integral of the spectrum times something that varies fast between the nodes is then the integral of that something
times sinc, which is taken on a path bent to the side where nothing oscillates and no pole is near (derived here).
Interpolated is G(u) = S(ω) cosh u, so that the wings, which count where the lag is short, are right too.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from functools import cached_property

import numpy as np
from numpy.typing import NDArray

Floats = NDArray[np.float64]
Complexes = NDArray[np.complex128]
GROWTH = 2.0  # by how many powers of e sinc may grow on the bent path
DIGITS = 20.0  # natural logarithm of the accuracy of the integrals on the bent path


@dataclass(frozen=True)
class SincRule:
    """Nodes u = jh, j from 0, of the frequencies ω = ω₀ sinh u.

    Attributes:
        omega0_per_ms: ω₀.
        step: h.
        count: how many nodes.

    Raises:
        ValueError: a number that is not above zero.
    """

    omega0_per_ms: float
    step: float
    count: int

    def __post_init__(self) -> None:
        if not (self.omega0_per_ms > 0 and self.step > 0 and self.count > 0):
            raise ValueError("a rule needs a frequency, a step and a count above zero")

    @cached_property
    def _u(self) -> Floats:
        return np.asarray(self.step * np.arange(self.count), dtype=np.float64)

    @cached_property
    def omega_per_ms(self) -> Floats:
        """(M,) the nodes."""
        return np.asarray(self.omega0_per_ms * np.sinh(self._u), dtype=np.float64)

    @cached_property
    def weights(self) -> Floats:
        """(M,) what each node counts in (1/π)∫₀^∞ S dω."""
        return self.omega0_per_ms * np.cosh(self._u) * self.step / np.pi * np.r_[0.5, np.ones(self.count - 1)]

    def half_line(self, s_per_ms: Complexes) -> Complexes:
        """(M, F) the matrix K with S @ K = ∫₀^∞ C(τ) e^{-sτ} dτ at s (F,), Re s > 0, C the covariance of spectrum S.

        The integral is (1/2π)∫ S(ω')/(s + iω') dω', whose pole lies in the upper half plane; the path goes below.
        """
        s = np.asarray(s_per_ms, dtype=complex)
        path, fine = self._path(-1.0, float(np.abs(s).max(initial=1.0)))
        value = self.omega0_per_ms / (s[:, None] + 1j * self.omega0_per_ms * np.sinh(path))
        sincs = self._sinc(path)
        both = sincs + self._sinc(-path)  # the spectrum is even
        both[:, 0] = sincs[:, 0]
        return np.cosh(self._u)[:, None] * (value @ both).T * (fine / (2 * np.pi))

    def at_lags(self, lag_ms: Floats) -> Complexes:
        """(M, L) the matrix W with Re(S @ W) = (1/2π)∫ S(ω) e^{iωτ} dω at lags τ (L,), where S(-ω) = S(ω)*."""
        lag = np.asarray(lag_ms, dtype=float)
        size, place = np.unique(np.abs(lag), return_inverse=True)
        path, fine = self._path(1.0, 1.0)
        wave = np.exp(1j * self.omega0_per_ms * size[:, None] * np.sinh(path))
        sincs, mirrored = self._sinc(path), self._sinc(-path)
        ahead, behind = ((wave @ part).T * fine for part in (sincs, mirrored))
        # what a node at -u counts falls on the conjugate of the value at u
        even = ahead + behind.conj()
        even[0] = ahead[0]
        even[:, size == 0] = (self.step * np.r_[1.0, np.full(self.count - 1, 2.0)])[:, None]
        weighted = np.cosh(self._u)[:, None] * even * (self.omega0_per_ms / (2 * np.pi))
        # for τ < 0 the conjugate kernel serves
        return np.where(lag < 0, weighted[:, place].conj(), weighted[:, place])

    def _path(self, side: float, largest: float) -> tuple[Complexes, float]:
        tilt = GROWTH * self.step / math.pi
        fine = 2 * math.pi * tilt / DIGITS
        reach = max(math.asinh(largest / self.omega0_per_ms), float(self._u[-1])) + DIGITS
        count = math.ceil(reach / fine)
        return np.asarray(np.arange(-count, count + 1) * fine + 1j * side * tilt, dtype=np.complex128), fine

    def _sinc(self, path: Complexes) -> Complexes:
        return np.sinc((path[:, None] - self._u) / self.step)
