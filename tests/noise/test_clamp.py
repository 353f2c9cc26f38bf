"""Voltage clamp: what it sees of charge, noise and capacitance, by the closed forms of a sphere and a cable."""

from __future__ import annotations

import math
from dataclasses import replace

import numpy as np
import pytest

from cable import CableModel, Kernel, Placed, SynapticInput
from cable.theory.electrode import Electrode
from cable.theory.filters import LowPass
from morphology import CellTree, Site, Zone
from noise.cells import arbor, model
from noise.electrode_cells import (
    CABLE,
    CAPACITANCE_PF,
    CHARGE_FC,
    MEMBRANE,
    RATE_PER_MS,
    RESISTANCE_GOHM,
    sphere,
    spread,
)
from tolerances import EXACT, REFINED, TYPED


def clamp(site: str = "soma", holding_mV: float = 0.0, **values) -> Electrode:
    return Electrode(site=site, mode="voltage clamp", holding_mV=holding_mV, **values)


def through(resistance_MOhm: float, **values) -> CableModel:
    return sphere(clamp(series_resistance_MOhm=resistance_MOhm, **values))


def test_an_ideal_clamp_of_a_sphere_sees_the_synaptic_current_itself() -> None:
    found = through(0.0).recording("soma")
    want = RATE_PER_MS * CHARGE_FC**2 / (2 * 2.0)  # Campbell's theorem for exponentials of 2 ms; from memory
    for record in (found.true, found.loaded, found.recorded):
        assert record.variance == pytest.approx(want, rel=EXACT)
        assert record.mean == pytest.approx(-RATE_PER_MS * CHARGE_FC, rel=EXACT)
    assert found.input_resistance_MOhm == pytest.approx(1e3 * RESISTANCE_GOHM, rel=EXACT)


@pytest.mark.parametrize(("resistance_MOhm", "compensation"), [(30.0, 0.0), (300.0, 0.6), (1.0, 0.99)])
def test_a_sphere_through_a_resistance(resistance_MOhm: float, compensation: float) -> None:
    """The current is that of an RC circuit of the time constant RC/(1 + R/R_m), and a share 1/(1 + R/R_m) of it."""
    left = 1e-3 * resistance_MOhm * (1 - compensation)
    share = 1 / (1 + left / RESISTANCE_GOHM)
    slow = left * CAPACITANCE_PF * share
    cell = through(resistance_MOhm, compensation=compensation)
    found = cell.recording("soma")
    want = RATE_PER_MS * (CHARGE_FC * share) ** 2 / (2 * (2.0 + slow))
    assert found.recorded.variance == pytest.approx(want, rel=EXACT)
    assert found.recorded.mean == pytest.approx(-share * RATE_PER_MS * CHARGE_FC, rel=EXACT)
    assert found.true.variance == pytest.approx(RATE_PER_MS * CHARGE_FC**2 / 4, rel=EXACT)
    assert found.input_resistance_MOhm == pytest.approx(1e3 * (RESISTANCE_GOHM + left), rel=EXACT)
    seen = cell.clamp_shares("soma")
    assert seen.charge_share == pytest.approx([share], rel=EXACT)
    assert seen.charge_share_by_input["current"] == pytest.approx(share, rel=EXACT)
    assert seen.noise_share == pytest.approx(1.0, rel=EXACT)
    assert seen.capacitance_seen_pF == pytest.approx(CAPACITANCE_PF * share**2, rel=EXACT)


def test_filters_of_a_clamp() -> None:
    """A Butterworth filter of order 1 is one pole more."""
    found = through(0.0, low_pass=LowPass("butterworth", 1, 50.0)).recording("soma")
    tau = 1 / (2e-3 * math.pi * 50.0)
    assert found.recorded.variance == pytest.approx(RATE_PER_MS * CHARGE_FC**2 / (2 * (2.0 + tau)), rel=EXACT)
    assert found.loaded.variance == pytest.approx(RATE_PER_MS * CHARGE_FC**2 / 4, rel=EXACT)


def test_charge_from_a_sealed_cable() -> None:
    """By reciprocity the share of charge is the steady attenuation, cosh(L - X)/cosh L (Rall 1959, Exp Neurol
    1:491; from memory; values derived, verified by two computations)."""
    seen = spread(CABLE, clamp()).clamp_shares("soma")
    assert seen.charge_share == pytest.approx([1.0, 0.645599693246, 0.540960099062], rel=TYPED)
    length = math.sqrt(1.5)
    assert seen.charge_share_by_input["current"] == pytest.approx(math.tanh(length) / length, rel=EXACT)


def test_capacitance_that_a_step_shows() -> None:
    """(G_inf τ/2)(tanh L + L/cosh² L) of the sealed cable's 62.8318530718 pF (derived, verified by two
    computations)."""
    cell = spread(CABLE, clamp())
    seen = cell.clamp_shares("soma")
    assert seen.capacitance_seen_pF == pytest.approx(30.7672145234, rel=TYPED)
    assert seen.capacitance_pF == pytest.approx(62.8318530718, rel=TYPED)
    assert cell.recording("soma").input_resistance_MOhm == pytest.approx(463.526791954, rel=TYPED)


@pytest.mark.parametrize("resistance_MOhm", [0.0, 40.0])
def test_capacitance_is_the_slope_of_the_clamps_admittance(resistance_MOhm: float) -> None:
    """On a tapering, branched cell with a second pipette: Y(s) = 1/(R + Z(s)), differentiated at s = 0."""
    tree = arbor(3, 40)
    sites = (Site("d", swc_id=int(tree.ids[25])),)
    second = Electrode(site="d", series_resistance_MOhm=60.0, pipette_capacitance_pF=12.0)
    held = model(
        tree, sites=sites, electrodes=(clamp(holding_mV=-65.0, series_resistance_MOhm=resistance_MOhm), second)
    )
    network = held.refined.point.network
    free = replace(network, node_conductance_nS=network.node_conductance_nS.copy())
    node, h = held.node_of("soma"), 1e-4
    free.node_conductance_nS[node] -= held.electrodes[0].steady_load_nS
    if resistance_MOhm == 0.0:  # the difference has lost the soma's own leak; take it from the cell without a clamp
        free = model(tree, sites=sites, electrodes=(second,)).refined.point.network
    z = free.columns_at(np.array([-h, h], dtype=complex), [node]).impedance_GOhm[0, node].real
    slope = np.diff(1 / (1e-3 * resistance_MOhm + z))[0] / (2 * h)
    assert held.clamp_shares("soma").capacitance_seen_pF == pytest.approx(slope, rel=10 * REFINED)


def test_noise_from_the_far_end_of_a_cable() -> None:
    """Point synapses at the tip: |1/cosh γL|² under the noise, by quadrature; at the clamp itself they make σ²."""
    from scipy.integrate import quad

    one = SynapticInput(
        name="far", at=(Placed(Site("x", swc_id=3), 3.0),), rate_Hz=40.0, current_pA=20.0, kernel=Kernel.alpha(3.0)
    )
    cell = CableModel(CellTree.from_text(CABLE), MEMBRANE, (one,), electrodes=(clamp(),))

    def passed(omega: float) -> float:
        gamma = np.sqrt(1.5 * (1 + 20j * omega))
        return 1 / abs(np.cosh(gamma)) ** 2 / (1 + 9 * omega**2) ** 2

    there = quad(passed, 0, 0.1, epsrel=1e-12)[0] + quad(passed, 0.1, 8, epsrel=1e-12)[0]
    here = math.pi / 2 / 2 / 3  # ∫₀^∞ dω/(1 + 9ω²)²
    seen = cell.clamp_shares("soma")
    assert seen.noise_share == pytest.approx(there / here, rel=1e-8)
    assert seen.noise_share_by_input["far"] == pytest.approx(there / here, rel=1e-8)
    assert seen.charge_share_by_input["far"] == pytest.approx(0.540960099062, rel=TYPED)


def test_synapses_that_act_in_step_count_in_step() -> None:
    """With full correlation N synapses at the clamp make N² of one's noise."""
    cell = sphere(clamp(series_resistance_MOhm=20.0))
    in_step = replace(cell, inputs=(replace(cell.inputs[0], correlation=0.3),))
    assert in_step.clamp_shares("soma").noise_share == pytest.approx(1.0, rel=EXACT)


def test_conductances_act_from_the_potential_that_is_held() -> None:
    """At its reversal potential an input is silent: nothing there to compare with, and no current from the soma."""
    one = SynapticInput(
        name="inhibition",
        where=Zone(),
        count=100,
        spread="area",
        rate_Hz=10.0,
        conductance_nS=1.0,
        reversal_mV=-75.0,
        kernel=Kernel.exponential(5.0),
    )
    cell = CableModel(CellTree.from_text("1 1 0 0 0 10 -1\n"), MEMBRANE, (one,), electrodes=(clamp(holding_mV=-75.0),))
    found = cell.recording("soma").recorded
    assert found.sd == pytest.approx(0.0, abs=1e-9)
    assert found.mean == pytest.approx(-75.0 / RESISTANCE_GOHM, rel=EXACT)
    held = replace(cell, electrodes=(clamp(holding_mV=-50.0),)).recording("soma").recorded
    # 100 synapses, 10 per second each, 25 pA of outward current for 5 ms
    assert held.variance == pytest.approx(1.0 * 25.0**2 * 5.0 / 2, rel=EXACT)
    assert held.mean == pytest.approx(-50.0 / RESISTANCE_GOHM + 25.0 * 5.0, rel=EXACT)


def test_the_table_is_of_the_clamped_cell() -> None:
    field = spread(CABLE, clamp(holding_mV=-3.0, series_resistance_MOhm=2.0)).fluctuations()
    free = spread(CABLE).fluctuations()
    assert field.sd_mV[0] < 0.02 * free.sd_mV[0]
    assert field.mean_mV[0] == pytest.approx(-3.0, abs=0.1)
    assert field.sd_mV[2] < free.sd_mV[2]


def test_the_resistance_that_a_clamp_shows_is_the_cells_own() -> None:
    """With synaptic conductance, a seal and a second leaky pipette at the very node of an ideal clamp."""
    tree = arbor(5, 40)
    sites, second = (Site("again", swc_id=int(tree.ids[0])),), Electrode(site="again", seal_GOhm=0.7)
    held = model(tree, sites=sites, electrodes=(clamp(holding_mV=-70.0, seal_GOhm=0.5), second))
    free = model(tree, sites=sites, electrodes=(Electrode(site="soma", seal_GOhm=0.5), second))
    want = free.recording("soma").input_resistance_MOhm
    assert held.recording("soma").input_resistance_MOhm == pytest.approx(want, rel=10 * REFINED)


def test_current_falls_where_the_voltage_would_rise() -> None:
    held = spread(CABLE, clamp(series_resistance_MOhm=50.0))
    pair = held.recorded_pair("soma", "tip")
    voltages = held.pair("soma", "tip", np.zeros(1), np.ones(1))
    assert pair.recorded.value == pytest.approx(-voltages.correlation, rel=EXACT)
    assert voltages.correlation > 0.1


def test_two_clamps_each_record_their_own_current() -> None:
    """Both ends of a cable held: from either end, charge at the middle is halved, less what the membrane takes."""
    cell = spread(CABLE, clamp(holding_mV=-5.0), clamp("tip", holding_mV=4.0))
    length = math.sqrt(1.5)
    for site in ("soma", "tip"):
        seen = cell.clamp_shares(site).charge_share
        assert seen[1] == pytest.approx(math.sinh(length / 2) / math.sinh(length), rel=EXACT)
    r_inf = 0.389848400617
    quiet = [replace(cell, inputs=()).recording(site).recorded.mean for site in ("soma", "tip")]
    want = [
        (-5.0 / math.tanh(length) - 4.0 / math.sinh(length)) / r_inf,
        (4.0 / math.tanh(length) + 5.0 / math.sinh(length)) / r_inf,
    ]
    assert quiet == pytest.approx(want, rel=EXACT)
