"""A cable so long that it has no ends: closed forms for spread and for single synapses."""

from __future__ import annotations

import math

import numpy as np
import pytest
from numpy.testing import assert_allclose

from cable import CableModel, Fluctuations, Kernel, Membrane, Placed, SynapticInput
from morphology import CellTree, Site, Zone
from oracles import infinite_cable
from tolerances import EXACT, TYPED

CABLE = infinite_cable.Cable()
MEMBRANE = Membrane(axial_resistivity_ohm_cm=150, capacitance_uF_cm2=1, resistance_ohm_cm2=20000, rest_mV=-70)
LONG_UM = 48 * CABLE.lambda_um
CHARGE_FC = 20.0
MIDDLE = Site("middle", path_um=LONG_UM / 2)


def answer(kernel: Kernel, *, at_middle: bool, rate_Hz: float, **more) -> Fluctuations:
    place = {"at": (Placed(Site("", path_um=LONG_UM / 2)),)} if at_middle else {"where": Zone(), "density_per_um": 0.5}
    one = SynapticInput(name="a", rate_Hz=rate_Hz, kernel=kernel, current_pA=CHARGE_FC / kernel.area_ms, **place)
    tree = CellTree.from_text(f"1 3 0 0 0 1 -1\n2 3 {LONG_UM!r} 0 0 1 1\n")
    away = Site("one away", path_um=LONG_UM / 2 + CABLE.lambda_um)
    return CableModel(tree, MEMBRANE, (one,), (MIDDLE, away), **more).fluctuations()


@pytest.mark.parametrize("tau_s_ms", [0.02, 2.0, 5.0, 20.0])
def test_synapses_everywhere(tau_s_ms: float) -> None:
    field = answer(Kernel.exponential(tau_s_ms), at_middle=False, rate_Hz=1.0)
    want = infinite_cable.distributed_covariance_mV2(CABLE, 0.5, 1e-3, CHARGE_FC, tau_s_ms)
    assert field.at("middle").variance_mV2 == pytest.approx(want, rel=EXACT)
    assert field.at("one away").variance_mV2 == pytest.approx(want, rel=EXACT)
    # a sealed end mirrors the cable, and with it its noise
    mirror = infinite_cable.distributed_covariance_mV2(CABLE, 0.5, 1e-3, CHARGE_FC, tau_s_ms, 0.0)
    assert_allclose(field.variance_mV2, want + mirror, rtol=EXACT)


def test_published_values_of_synapses_everywhere() -> None:
    """Mean and variance at 0.5/µm, 1 Hz, 10 pA, 2 ms; and crossings of the mean: derived, verified twice."""
    field = answer(Kernel.exponential(2.0), at_middle=False, rate_Hz=1.0, threshold_mV=-70 + 3.18309886183791)
    middle = field.at("middle")
    assert middle.mean_mV + 70 == pytest.approx(3.18309886184, rel=TYPED)
    assert middle.variance_mV2 == pytest.approx(0.216693183356, rel=EXACT)
    assert middle.upcrossing_Hz == pytest.approx(52.2832151064, rel=EXACT)


@pytest.mark.parametrize("tau_s_ms", [2.0, 20.0, 40.0])
def test_one_synapse_at_its_own_site(tau_s_ms: float) -> None:
    field = answer(Kernel.exponential(tau_s_ms), at_middle=True, rate_Hz=100.0)
    want = infinite_cable.point_variance_at_site_mV2(CABLE, 0.1, CHARGE_FC, tau_s_ms)
    assert field.at("middle").variance_mV2 == pytest.approx(want, rel=EXACT)


def test_published_values_of_one_synapse() -> None:
    """100 Hz, 20 fC, 2 ms, at the site and one length constant away: derived, verified by two computations."""
    field = answer(Kernel.exponential(2.0), at_middle=True, rate_Hz=100.0)
    assert field.at("middle").variance_mV2 == pytest.approx(0.0727667702786, rel=EXACT)
    assert field.at("one away").variance_mV2 == pytest.approx(0.00522562735939, rel=EXACT)


def test_short_events_approach_instantaneous_charges_at_a_distance() -> None:
    want = infinite_cable.point_variance_delta_mV2(CABLE, 0.1, CHARGE_FC, CABLE.lambda_um)
    assert want == pytest.approx(0.00550987823807, rel=TYPED)
    loss = [
        1 - answer(Kernel.exponential(t), at_middle=True, rate_Hz=100.0).at("one away").variance_mV2 / want
        for t in (0.02, 0.01)
    ]
    assert 0 < loss[1] < loss[0] < 1e-4
    assert np.log2(loss[0] / loss[1]) == pytest.approx(2.0, abs=0.01)  # the square of the time constant


def test_end_to_end_variance_of_finite_cables() -> None:
    """White noise on a sealed cable: ½coth L at the ends, ½cosh²(L/2)/sinh L in the middle, over 1/4 for no ends.

    Reached here with events that are short beside every time constant of the cable.
    """
    fast = Kernel.exponential(1e-5)

    def variances(lengths: float) -> tuple[float, float]:
        um = lengths * CABLE.lambda_um
        tree = CellTree.from_text(f"1 3 0 0 0 1 -1\n2 3 {um / 2!r} 0 0 1 1\n3 3 {um!r} 0 0 1 2\n")
        one = SynapticInput(
            name="a", where=Zone(), density_per_um=0.5, rate_Hz=1, kernel=fast, current_pA=CHARGE_FC / fast.area_ms
        )
        found = CableModel(tree, MEMBRANE, (one,)).fluctuations(1e-7).variance_mV2
        return float(found[0]), float(found[1])

    unit = infinite_cable.distributed_covariance_mV2(CABLE, 0.5, 1e-3, CHARGE_FC, 0.0) / 0.25
    rounding = 2 * math.sqrt(1e-5 / 20)
    for length, end, middle in ((1.0, 0.65651764275, 0.540988353435), (2.0, 0.518657360364, 0.328258821375)):
        got = np.array(variances(length)) / unit
        assert_allclose(got, [end, middle], rtol=rounding)
