"""The equivalent point neuron against an RC cell, where it is exact, and a sealed cable's published delay."""

from __future__ import annotations

import numpy as np
import pytest

from cable import CableModel, Kernel, Membrane, SynapticInput
from morphology import CellTree, Site, Zone
from noise.cells import arbor, model
from tolerances import EXACT, IDENTITY

PLAIN = Membrane(axial_resistivity_ohm_cm=150, capacitance_uF_cm2=1, resistance_ohm_cm2=20000, rest_mV=-70)
BALL = "1 1 0 0 0 10 -1\n"


def test_an_rc_cell_is_its_own_point_neuron() -> None:
    one = SynapticInput(
        name="a", where=Zone(), count=200, spread="area", rate_Hz=5.0, current_pA=5.0, kernel=Kernel.exponential(2.0)
    )
    found = CableModel(CellTree.from_text(BALL), PLAIN, (one,)).point_neuron()
    assert found.time_constant_ms == pytest.approx(20.0, rel=EXACT)
    assert found.input_resistance_MOhm == pytest.approx(1591.54943092, rel=1e-11)
    assert found.capacitance_pF == pytest.approx(12.5663706144, rel=EXACT)
    # rho(t) = (20 e^{-t/20} - 2 e^{-t/2})/18 for exponential events (Campbell's theorem; derived, verified twice)
    assert (found.slow_ms, found.fast_ms) == (pytest.approx(20.0, rel=1e-4), pytest.approx(2.0, rel=1e-3))
    assert found.slow_weight == pytest.approx(20 / 18, rel=1e-4)
    assert found.fit_error < 1e-6


def test_centroid_delay_of_a_sealed_cable() -> None:
    """(τ/2)(1 + 2L/sinh 2L), 0.775720564772 τ at L = 1 (Agmon-Snir & Segev 1993, from memory; derived)."""
    length = PLAIN.length_constant_um(2.0)
    tree = CellTree.from_text(f"1 3 0 0 0 1 -1\n2 3 {length!r} 0 0 1 1\n")
    one = SynapticInput(name="a", where=Zone(), density_per_um=1, rate_Hz=1, current_pA=1, kernel=Kernel.alpha(2.0))
    assert CableModel(tree, PLAIN, (one,)).point_neuron().time_constant_ms == pytest.approx(
        15.51441129544, rel=IDENTITY
    )


def test_error_is_the_distance_between_fit_and_autocorrelation() -> None:
    tree = arbor(51, 40)
    cell = model(tree, sites=(Site("far", swc_id=int(tree.ids[39])),))
    found = cell.point_neuron("far")
    lag = np.linspace(0, 30, 31)
    rho = cell.pair("far", "far", lag, np.ones(1)).covariance_mV2 / found.sd_mV**2
    fit = found.slow_weight * np.exp(-lag / found.slow_ms) + (1 - found.slow_weight) * np.exp(-lag / found.fast_ms)
    assert 1e-6 < np.abs(fit - rho).max() <= 1.05 * found.fit_error < 0.05
    assert found.sd_mV == cell.fluctuations().at("far").sd_mV
