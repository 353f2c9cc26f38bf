"""The input impedance of every node in the whole right half plane, from one sweep along a bent path.

Z is analytic right of the slowest relaxation, so Cauchy's formula gives it at any s with Re s ≥ 0 from its values on
a path s = iω₀ sinh(v + iα) through the left half plane:  Z(s) g(s) = (1/2πi) ∫ Z(s') g(s')/(s - s') ds'. The
trapezoidal rule in v converges as e^{-2πα/h} for α = π/4, which is as far from the poles as from s. On a neurite Z
falls only as s^{-1/2}; with g = 1/(s + ρ), whose pole lies left of the path, the rule ends where s^{-3/2} is small
(derived here). So an event that decays as e^{-pt} costs no further sweep: it needs Z(s + p).
"""

from __future__ import annotations

import math
from collections.abc import Callable
from concurrent.futures import ThreadPoolExecutor
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from cable.network.network import Network

Complexes = NDArray[np.complex128]
TILT = math.pi / 4  # as far from the poles as from s
STEP = 0.3  # leaves e^{-2πd/STEP}, d the distance in v to the poles or to s
DIGITS = math.log(1e5)
BLOCK = 8
Added = Callable[[Complexes], tuple[Complexes, Complexes]]


@dataclass(frozen=True, eq=False)
class LocalImpedance:
    """Input impedances as functions of s.

    Attributes:
        s_per_ms: (J,) the path's nodes in the upper half plane.
        counted: (E + 1, J) what each node of the path counts: its weight, g, and the impedance there.
        rho_per_ms: ρ.
    """

    s_per_ms: Complexes
    counted: Complexes
    rho_per_ms: float

    def at(self, s_per_ms: Complexes) -> Complexes:
        """(E + 1, F) the input impedance of every node at s (F,), Re s ≥ 0, GΩ."""
        s = np.asarray(s_per_ms, dtype=complex)
        above = (s + self.rho_per_ms) / (s - self.s_per_ms[:, None])
        below = (s + self.rho_per_ms) / (s - self.s_per_ms.conj()[:, None])
        return self.counted @ above + self.counted.conj() @ below


def local_impedance(
    network: Network, fastest_per_ms: float, tilt: float = TILT, added: Added | None = None
) -> LocalImpedance:
    """The input impedances of `network`.

    Args:
        network: the network.
        fastest_per_ms: the fastest rate of what they are wanted for.
        tilt: α.
        added: maps s (F,) to admittances to add, as in `Network.at`.
    """
    omega0 = network.slowest_rate_per_ms
    rho = max(fastest_per_ms, omega0)
    reach = math.asinh(rho / omega0) + DIGITS / 1.5
    v = np.arange(0.0, reach + STEP, STEP) + 1j * tilt
    s = 1j * omega0 * np.sinh(v)
    weight = omega0 * STEP / (2 * math.pi) * np.cosh(v) / (s + rho)
    weight[0] /= 2
    with ThreadPoolExecutor(2) as pool:
        parts = [s[k : k + BLOCK] for k in range(0, len(s), BLOCK)]
        blocks = pool.map(lambda part: network.input_impedance_at(part, added(part) if added else None), parts)
        impedance = np.concatenate(list(blocks), axis=-1)
    return LocalImpedance(s, weight * impedance, rho)
