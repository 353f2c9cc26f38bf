"""What the slow modes leave of the crossing terms: places so near each other that their surroundings are alike.

Fast relaxations reach no far, so the two places of a crossing term (`crossing`) lie in one neighbourhood.
Where synapses are spread like membrane there, the sum over the second place is the composition of two propagators,
Σ_y' z_yy'(t) C_y' z_y'y(t') = z_yy(t + t'), and the term is a local source of strength F_a N_a F_b N_b/C times
    (a) 2 Re h(ω) Ĉ_b(ω),   h = ∫∫ C_a(u + u') z(u + u') e^{-iωu} du du',
    (b) ∫ e^{-iωτ} ∫∫ C_a(τ - u) C_b(-τ - u') z(u + u') du du' dτ,
which for exponentials are divided differences of Z. Here Z is the input impedance less that of the slow modes (derived
here; on a sphere nothing is left).
"""

from __future__ import annotations

from collections.abc import Callable

import numpy as np
from numpy.typing import NDArray

Floats = NDArray[np.float64]
Complexes = NDArray[np.complex128]
Covariance = tuple[Complexes, Complexes]
Impedance = Callable[[Complexes], Complexes]
APART = 1e-3  # relative distance kept between rates by which a difference is divided


def nearby(impedance: Impedance, one: Covariance, other: Covariance, omega_per_ms: Floats) -> Floats:
    """(nodes, F) the terms (a) and (b) for two inputs at ω (F,), over F_a N_a F_b N_b/C.

    Args:
        impedance: maps s (F,) to what is left of the input impedances (nodes, F).
        one, other: the b and p of Σ b e^{-p|τ|} of either input.
        omega_per_ms: (F,) frequencies.
    """
    (b_a, p_a), (b_c, p_c) = one, other
    slowest = min(np.abs(p_a).min(), np.abs(p_c).min())
    omega = np.maximum(np.asarray(omega_per_ms, dtype=float), APART * slowest)
    colour = (b_c * 2 * p_c / (p_c**2 + omega[:, None] ** 2)).sum(axis=1).real
    turned = sum(
        b * (impedance(np.array([p])) - impedance(p + 1j * omega)) / (1j * omega) for b, p in zip(b_a, p_a, strict=True)
    )
    agreed = _one_side(impedance, one, other, omega) + _one_side(impedance, other, one, omega).conj()
    return np.asarray(2 * (turned * colour).real + agreed.real)


def _one_side(impedance: Impedance, one: Covariance, other: Covariance, omega: Floats) -> Complexes:
    """(nodes, F) the part τ > 0 of the integral (b)."""
    total = np.zeros((1, len(omega)), dtype=np.complex128)
    for b, q in zip(*other, strict=True):
        s = q + 1j * omega
        at_q, at_s = impedance(np.array([q])), impedance(s)
        for c, p in zip(*one, strict=True):
            rate = p * (1 + APART) if abs(p - q) < APART * abs(q) else p
            far = 2 * rate / (rate**2 - s**2) * (at_s - at_q) / (q - s)
            near = (impedance(np.array([rate])) - at_q) / (q - rate) / (rate - s)
            total = total + b * c * (far - near)
    return total
