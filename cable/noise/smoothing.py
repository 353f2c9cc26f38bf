"""Spectra of regular spike trains, smoothed to the nodes of the frequency integral.

The spectrum of a train with a dead time rings at all multiples of 1/dead time, and that of a regular gamma train at
its rate; a rule that follows the ringing needs thousands of frequencies. But the integral is that of a product Φ·F
in which only Φ rings: the rest, F, is known from its values at nodes u = jh, as sinc interpolation between them errs
by no more than e^{-πa/h} (Stenger 1993, Numerical Methods Based on Sinc and Analytic Functions; from memory). So

  ∫ Φ F du = h Σ_j F(jh) Φ̃(jh),   Φ̃(u) = (1/h) ∫ Φ(u') sinc((u' - u)/h) du',

and Φ̃ is computed from the one-sided transform of the train's correlation, whose real part Φ is, on a path bent a
little into the right half plane where it does not ring. The cell is solved at the nodes only (derived here).
"""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from cable.theory.spiketrain import SpikeTrain
from cable.theory.units import PER_MS_PER_HZ

Floats = NDArray[np.float64]
DIGITS = 32.0  # natural logarithm of the accuracy of Φ̃
GROWTH = 2.0  # by how many powers of e sinc may grow on the bent path, which costs as many digits


@dataclass(frozen=True)
class Smoothing:
    """To the nodes u = asinh(ω/ω₀) = jh.

    Attributes:
        omega0_per_ms: ω₀.
        step: h.
    """

    omega0_per_ms: float
    step: float

    def spectrum_over_rate(self, train: SpikeTrain, omega_per_ms: Floats, rate_Hz: float) -> Floats:
        """Φ̃ (F,) of a train at ω (F,), which need not be nodes."""
        tilt = GROWTH * self.step / math.pi
        fine = 2 * math.pi * tilt / DIGITS
        # beyond, the train is a Poisson train to all digits
        reach = DIGITS + math.log1p(rate_Hz * PER_MS_PER_HZ / self.omega0_per_ms)
        path = np.arange(-math.ceil(reach / fine), math.ceil(reach / fine) + 1) * fine + 1j * tilt
        apart = train.one_sided_over_rate(-1j * self.omega0_per_ms * np.sinh(path), rate_Hz) - 1
        u = np.arcsinh(np.asarray(omega_per_ms, dtype=float) / self.omega0_per_ms)
        kernel = np.sinc((path - u[:, None]) / self.step)
        return 1 + fine / self.step * (kernel @ apart).real
