"""The equivalent point neuron against an RC cell, where it is exact, and a sealed cable's published delay."""

from __future__ import annotations

import numpy as np
import pytest

from cable import CableModel, Kernel, Membrane, Placed, SpikeTrain, SynapticInput
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
    assert found.cell_time_constant_ms == pytest.approx(20.0, rel=1e-14)
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


def test_bombarded_point_cell_has_its_published_time_constant() -> None:
    """Means of Destexhe et al. 2001, Neuroscience 107:13 (from memory); time constant and resistance derived."""
    ball = CellTree.from_text(f"1 1 0 0 0 {(34636 / (4 * np.pi)) ** 0.5!r} -1\n")
    membrane = Membrane(axial_resistivity_ohm_cm=150, capacitance_uF_cm2=1, resistance_ohm_cm2=1e6 / 45, rest_mV=-80)
    inputs = [
        SynapticInput(
            name=name,
            where=Zone(),
            count=1.0,
            spread="area",
            rate_Hz=1e3 * mean_nS / (peak_nS * decay_ms),
            conductance_nS=peak_nS,
            reversal_mV=reversal_mV,
            kernel=Kernel.exponential(decay_ms),
        )
        for name, mean_nS, peak_nS, decay_ms, reversal_mV in (("e", 12.1, 1.2, 2.728, 0), ("i", 57.3, 0.6, 10.49, -75))
    ]
    found = CableModel(ball, membrane, tuple(inputs)).point_neuron()
    assert found.mean_mV == pytest.approx(-65.2387799431, rel=1e-11)
    assert found.sd_mV == pytest.approx(1.37066238059, rel=EXACT)
    assert found.time_constant_ms == pytest.approx(4.07548519642, rel=EXACT)
    assert found.cell_time_constant_ms == pytest.approx(4.07548519642, rel=1e-11)
    assert found.input_resistance_MOhm == pytest.approx(11.7666162271, rel=1e-11)
    assert found.capacitance_pF == pytest.approx(346.36, rel=EXACT)


def test_a_cable_is_faster_than_its_membrane() -> None:
    """Seen from one end charge also leaves along the cable; the membrane's own time constant stays R_m·C_m."""
    tree = CellTree.from_text("1 3 0 0 0 1 -1\n2 3 900 0 0 1 1\n")
    one = SynapticInput(name="a", where=Zone(), density_per_um=1, rate_Hz=1, current_pA=1, kernel=Kernel.alpha(2.0))
    found = CableModel(tree, PLAIN, (one,)).point_neuron()
    assert found.cell_time_constant_ms == pytest.approx(20.0, rel=1e-13)
    assert found.time_constant_ms < 18.0


def test_regular_trains_and_places_without_variance() -> None:
    one = SynapticInput(
        name="a",
        where=Zone(),
        count=200,
        spread="area",
        rate_Hz=40.0,
        current_pA=5.0,
        kernel=Kernel.exponential(2.0),
        spike_train=SpikeTrain.dead_time(15.0),
    )
    found = CableModel(CellTree.from_text(BALL), PLAIN, (one,)).point_neuron()
    assert found.sd_mV > 0 and 0.05 < found.fit_error < 0.2  # two exponentials cannot dip below 0 and return
    tree = CellTree.from_text("1 3 0 0 0 1 -1\n2 3 900 0 0 1 1\n")
    at_once = SynapticInput(name="a", at=(Placed(Site("", swc_id=2)),), rate_Hz=10, charge_fC=5.0)
    found = CableModel(tree, PLAIN, (at_once,), (Site("end", swc_id=2),)).point_neuron("end")
    assert np.isnan([found.sd_mV, found.correlation_time_ms, found.slow_ms, found.fit_error]).all()
    assert found.input_resistance_MOhm > 0 and found.time_constant_ms > 0
