"""What hangs on a node and is no membrane: a resistor and a capacitor in series, as a pipette is."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray


@dataclass(frozen=True)
class Load:
    """A branch from `node` to ground: resistance (0 allowed), then capacitance."""

    node: int
    resistance_GOhm: float
    capacitance_pF: float

    def admittance_nS(self, s_per_ms: NDArray[np.complex128]) -> NDArray[np.complex128]:
        """sC/(1 + sRC) at complex s (F,), 1/ms."""
        charge = s_per_ms * self.capacitance_pF
        return charge / (1 + charge * self.resistance_GOhm)
