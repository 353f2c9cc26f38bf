"""Thermal noise of the cell (Johnson 1928, Nyquist 1928, Phys Rev 32:97, 110); numbers derived, verified twice.

The membrane's own part is white current noise in proportion to its leak, so charges that come at once serve for it.
"""

from __future__ import annotations

import math

import numpy as np
import pytest
from numpy.testing import assert_allclose

from cable import CableModel, Membrane, SynapticInput
from cable.theory.units import BOLTZMANN_J_PER_K, KELVIN_AT_0_C
from morphology import CellTree, Site, Zone
from tolerances import EXACT, TYPED

PLAIN = Membrane(axial_resistivity_ohm_cm=150.0, capacitance_uF_cm2=1.0, resistance_ohm_cm2=20000.0, rest_mV=-70.0)
BODY_C = 37.0
KT_FC_MV = BOLTZMANN_J_PER_K * (KELVIN_AT_0_C + BODY_C) * 1e18
SPHERE = f"1 1 0 0 0 {math.sqrt(1e4 / (4 * math.pi))!r} -1\n"  # 100 pF and 200 MΩ
LONG = "1 3 0 0 0 1 -1\n2 3 24000 0 0 1 1\n"


def of_membrane(cell: CellTree, **extra) -> CableModel:
    """A cell whose only noise is that of its membrane's leak: 2kT·g per area, two-sided."""
    charges = SynapticInput(
        name="leak", where=Zone(), density_per_um2=1.0, rate_Hz=1e3, charge_fC=math.sqrt(2 * KT_FC_MV * 10 / 20000.0)
    )
    return CableModel(cell, PLAIN, (charges,), **extra)


def test_isopotential_cell() -> None:
    found = CableModel(CellTree.from_text(SPHERE), PLAIN).spectrum("soma", np.array([0.0]))
    assert_allclose(found.thermal_mV2_per_Hz(BODY_C), 3.4256662988e-6, rtol=10 * TYPED)
    whole = of_membrane(CellTree.from_text(SPHERE)).fluctuations()
    assert_allclose(whole.sd_mV, 6.54376258241e-3, rtol=EXACT)  # √(kT/C) for 100 pF, whatever the resistance


def test_infinite_cable() -> None:
    """Total densities at 1, 10 and 100 Hz, and the membrane's share of them; the rest is made by the cytoplasm."""
    cell = of_membrane(CellTree.from_text(LONG), sites=(Site("middle", swc_id=2, fraction=0.5),))
    found = cell.spectrum("middle", np.array([1.0, 10.0, 100.0]))
    thermal = found.thermal_mV2_per_Hz(BODY_C)
    assert_allclose(thermal, [3.31917990424e-6, 2.37308487614e-6, 6.90799425725e-7], rtol=EXACT)
    assert_allclose(found.psd_mV2_per_Hz / thermal, [0.498041512433, 0.383734406326, 0.0734964650422], rtol=EXACT)
    at = cell.fluctuations().at("middle")
    assert at.sd_mV == pytest.approx(6.46019186933e-3, rel=EXACT)
    # for one membrane time constant everywhere, kT·R_in/τ
    assert at.variance_mV2 == pytest.approx(KT_FC_MV * 1e-3 * at.input_resistance_MOhm / 20.0, rel=EXACT)


def test_colder_than_absolute_zero() -> None:
    found = CableModel(CellTree.from_text(SPHERE), PLAIN).spectrum("soma", np.array([0.0]))
    with pytest.raises(ValueError, match="more than -273.15"):
        found.thermal_mV2_per_Hz(-300.0)
