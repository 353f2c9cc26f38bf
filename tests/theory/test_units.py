"""Conversions and cable constants against published parameter sets, and the one-sided spectrum's own integral."""

from __future__ import annotations

import math

import numpy as np
import pytest
from scipy.integrate import quad

from cable import Membrane
from cable.theory import units
from tolerances import EXACT, ROUND_OFF, TYPED


def membrane(resistance: float, resistivity: float) -> Membrane:
    return Membrane(
        axial_resistivity_ohm_cm=resistivity, capacitance_uF_cm2=1.0, resistance_ohm_cm2=resistance, rest_mV=-70.0
    )


# R_m, R_i, diameter, λ (µm), semi-infinite resistance (MΩ): Rall 1977; Dayan & Abbott 2001, ch. 6; Koch 1999, ch. 2
# (all from memory; derived, verified by two computations)
@pytest.mark.parametrize(
    ("resistance", "resistivity", "diameter_um", "lambda_um", "semi_infinite_MOhm"),
    [
        (20000.0, 150.0, 2.0, 816.496580928, 389.848400617),
        (10000.0, 100.0, 4.0, 1000.0, 79.5774715459),
        (20000.0, 200.0, 4.0, 1000.0, 159.154943092),
    ],
)
def test_cable_constants(
    resistance: float, resistivity: float, diameter_um: float, lambda_um: float, semi_infinite_MOhm: float
) -> None:
    one = membrane(resistance, resistivity)
    assert one.length_constant_um(diameter_um) == pytest.approx(lambda_um, rel=TYPED)
    assert one.time_constant_ms == pytest.approx(resistance * 1e-3, rel=ROUND_OFF)
    axial = units.resistivity_GOhm_um(resistivity) / (math.pi * diameter_um**2 / 4)  # GΩ/µm
    leak = units.conductance_nS_per_um2(resistance) * math.pi * diameter_um  # nS/µm
    assert math.sqrt(axial / leak) * units.MOHM_PER_GOHM == pytest.approx(semi_infinite_MOhm, rel=TYPED)
    assert 1 / math.sqrt(axial * leak) == pytest.approx(lambda_um, rel=TYPED)


def test_units_agree_with_each_other() -> None:
    """pF/nS is ms: capacitance over conductance of any area is the membrane's time constant."""
    ratio = units.capacitance_pF_per_um2(0.8) / units.conductance_nS_per_um2(15000.0)
    assert ratio == pytest.approx(0.8 * 15.0, rel=ROUND_OFF)
    assert units.OMEGA_PER_MS_PER_HZ == pytest.approx(2 * math.pi / 1000, rel=ROUND_OFF)
    assert units.PER_MS_PER_HZ * 1000 == 1


def test_one_sided_spectra_integrate_to_the_same_variance() -> None:
    """S(ω) = 2τ/(1 + ω²τ²), of variance 1, as it is and as shown to a person over f in Hz."""
    tau = 7.0

    def two_sided(omega: float) -> float:
        return 2 * tau / (1 + (omega * tau) ** 2)

    def shown(frequency_Hz: float) -> float:
        return units.one_sided_per_Hz(two_sided(units.OMEGA_PER_MS_PER_HZ * frequency_Hz))

    assert quad(two_sided, 0, np.inf, epsabs=0)[0] / math.pi == pytest.approx(1.0, rel=EXACT)
    scale = 1000 / (2 * math.pi * tau)
    assert quad(lambda v: scale * shown(scale * v), 0, np.inf, epsabs=0)[0] == pytest.approx(1.0, rel=EXACT)
