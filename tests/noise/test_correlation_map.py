"""The map of correlation and lag with one site, where it is easy to go wrong."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from numpy.testing import assert_allclose

from cable import CableModel, Kernel, Membrane, Placed, SpikeTrain, SynapticInput
from morphology import CellTree, Site, Zone
from noise.cells import EXCITATION, INHIBITION, arbor, model
from tolerances import EXACT

NO_HZ = np.ones(1)


def test_named_sites_between_points_are_in_the_map() -> None:
    tree = arbor(13, 40)
    sites = Site("a", swc_id=int(tree.ids[17])), Site("b", swc_id=int(tree.ids[39]), fraction=0.4)
    cell = model(tree, EXCITATION, INHIBITION, sites=sites)
    matrix, found = cell.correlation_matrix(), cell.correlation_map("b", 1e-9)
    assert list(found.correlation_at) == list(cell.site_names)
    assert_allclose(list(found.correlation_at.values()), matrix[2], rtol=10 * EXACT)
    assert found.lag_at_ms["b"] == pytest.approx(0.0, abs=1e-9)
    assert found.correlation[17] == pytest.approx(found.correlation_at["a"], rel=1e-12)
    assert found.lag_ms[17] == pytest.approx(found.lag_at_ms["a"], rel=1e-12)
    assert found.lag_at_ms["a"] == pytest.approx(-cell.correlation_map("a", 1e-9).lag_at_ms["b"], rel=1e-9)


def test_places_that_move_against_each_other_have_a_lag_too() -> None:
    """Events in step whose reversal potential lies between the mean voltages of the two ends."""
    membrane = Membrane(axial_resistivity_ohm_cm=150, capacitance_uF_cm2=1, resistance_ohm_cm2=20000, rest_mV=-70)
    steady = SynapticInput(
        name="steady",
        at=(Placed(Site("far", swc_id=2)),),
        rate_Hz=1e6,
        current_pA=0.03,
        kernel=Kernel.exponential(5.0),
    )
    shunt = SynapticInput(
        name="in step",
        where=Zone(),
        density_per_um=0.05,
        rate_Hz=1.0,
        conductance_nS=0.05,
        reversal_mV=-50.0,
        kernel=Kernel.exponential(3.0),
        correlation=1.0,
    )
    tree = CellTree.from_text("1 3 0 0 0 1 -1\n2 3 2500 0 0 1 1\n")
    cell = CableModel(tree, membrane, (steady, shunt), (Site("far", swc_id=2),))
    found = cell.correlation_map("soma")
    assert found.correlation[1] < -0.3
    lags = np.linspace(-400, 400, 16001)
    curve = cell.pair("soma", "far", lags, NO_HZ).covariance_mV2
    assert found.lag_ms[1] == pytest.approx(float((lags * curve).sum() / curve.sum()), rel=1e-2, abs=1e-2)
    assert abs(found.lag_ms[1]) < 100


def test_dead_times_reach_the_map() -> None:
    tree = arbor(13, 30)
    one = replace(EXCITATION, rate_Hz=40.0, conductance_nS=0.02, spike_train=SpikeTrain.dead_time(5.0))
    cell = model(tree, one, sites=(Site("a", swc_id=int(tree.ids[29])),))
    assert cell.correlation_map("a").correlation[0] == pytest.approx(cell.correlation_matrix()[0, 1], rel=1e-5)
