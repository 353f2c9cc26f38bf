"""The program's units (µm, ms, mV, nS, pF, pA; rad/ms) and every conversion from the trade's units.

nS·mV = pA, pF·mV/ms = pA, 1/nS = GΩ.
"""

from __future__ import annotations

import math
from typing import TypeVar

import numpy as np
from numpy.typing import NDArray

Value = TypeVar("Value", float, NDArray[np.float64])

MOHM_PER_GOHM = 1e3
PER_MS_PER_HZ = 1e-3
OMEGA_PER_MS_PER_HZ = 2 * math.pi * PER_MS_PER_HZ


def conductance_nS_per_um2(resistance_ohm_cm2: Value) -> Value:
    """Specific membrane conductance (nS/µm²) of a specific membrane resistance (Ω·cm²)."""
    return 10.0 / resistance_ohm_cm2


def capacitance_pF_per_um2(capacitance_uF_cm2: Value) -> Value:
    """Specific membrane capacitance in pF/µm² from µF/cm²."""
    return 0.01 * capacitance_uF_cm2


def resistivity_GOhm_um(axial_resistivity_ohm_cm: Value) -> Value:
    """Axial resistivity in GΩ·µm from Ω·cm."""
    return 1e-5 * axial_resistivity_ohm_cm


def one_sided_per_Hz(two_sided_per_rad_ms: Value) -> Value:
    """One-sided density per Hz from a two-sided density per rad/ms.

    Both integrate to the variance, (1/π)∫₀^∞ S dω = ∫₀^∞ S₁ df with ω = 2πf/1000, hence the factor 2/1000.
    """
    return 2e-3 * two_sided_per_rad_ms
