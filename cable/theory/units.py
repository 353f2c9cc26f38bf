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

BOLTZMANN_J_PER_K = 1.380649e-23  # exact by the definition of the kelvin (BIPM 2019, The International System of Units)
KELVIN_AT_0_C = 273.15


def conductance_nS_per_um2(resistance_ohm_cm2: Value) -> Value:
    """Specific membrane conductance (nS/µm²) of a specific membrane resistance (Ω·cm²)."""
    return 10.0 / resistance_ohm_cm2


def capacitance_pF_per_um2(capacitance_uF_cm2: Value) -> Value:
    """Specific membrane capacitance in pF/µm² from µF/cm²."""
    return 0.01 * capacitance_uF_cm2


def resistivity_GOhm_um(axial_resistivity_ohm_cm: Value) -> Value:
    """Axial resistivity in GΩ·µm from Ω·cm."""
    return 1e-5 * axial_resistivity_ohm_cm


def thermal_psd_mV2_per_Hz(resistance_MOhm: Value, temperature_C: float) -> Value:
    """One-sided density 4kT·Re Z of the thermal voltage of an impedance with this real part, mV²/Hz.

    Johnson 1928 and Nyquist 1928, Phys Rev 32:97 and 110.

    Raises:
        ValueError: a temperature at or below absolute zero.
    """
    kelvin = temperature_C + KELVIN_AT_0_C
    if not 0 < kelvin < math.inf:
        raise ValueError(f"temperature_C: expected more than -273.15 °C, found {temperature_C:g}")
    return 4 * BOLTZMANN_J_PER_K * kelvin * 1e12 * resistance_MOhm  # V²/Hz to mV²/Hz, Ω to MΩ


def one_sided_per_Hz(two_sided_per_rad_ms: Value) -> Value:
    """One-sided density per Hz from a two-sided density per rad/ms.

    Both integrate to the variance, (1/π)∫₀^∞ S dω = ∫₀^∞ S₁ df with ω = 2πf/1000, hence the factor 2/1000.
    """
    return 2e-3 * two_sided_per_rad_ms
