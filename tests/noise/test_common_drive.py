"""Synapses that share their spikes: what correlation adds, and what it cannot exceed."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
from numpy.testing import assert_allclose

from cable import CableModel, Kernel, Membrane, SynapticInput
from morphology import Zone
from noise.cells import MEMBRANE, arbor, model
from tolerances import EXACT

TREE = arbor(seed=12, points=90)
ONE = SynapticInput(
    name="a",
    where=Zone(kinds=("basal", "apical")),
    density_per_um=0.3,
    rate_Hz=2.0,
    current_pA=5.0,
    kernel=Kernel.two_exponential(0.5, 4.0),
)


def sd(one: SynapticInput, correlation: float) -> np.ndarray:
    return model(TREE, replace(one, correlation=correlation)).fluctuations().sd_mV


def test_variance_grows_in_proportion_to_the_correlation() -> None:
    alone, together = sd(ONE, 0.0) ** 2, sd(ONE, 1.0) ** 2
    assert (together > 10 * alone).all()
    for c in (0.03, 0.4):
        assert_allclose(sd(ONE, c) ** 2, (1 - c) * alone + c * together, rtol=EXACT)


def test_two_zones_in_step_obey_cauchy_and_schwarz() -> None:
    """SD(A + B) lies between |SD(A) - SD(B)| and SD(A) + SD(B), near the second as both zones are heard alike."""
    basal, apical = (sd(replace(ONE, where=Zone(kinds=(kind,))), 1.0) for kind in ("basal", "apical"))
    both = sd(ONE, 1.0)
    assert (both < basal + apical).all() and (both > np.abs(basal - apical)).all()
    assert both[0] > 0.99 * (basal[0] + apical[0])
    # apart, variances add instead
    parts = (sd(replace(ONE, where=Zone(kinds=(kind,))), 0.0) for kind in ("basal", "apical"))
    assert_allclose(sum(part**2 for part in parts), sd(ONE, 0.0) ** 2, rtol=EXACT)


def test_common_drive_in_proportion_to_membrane_moves_the_whole_cell_as_one() -> None:
    """ν(ρQR_m)²/(2(τ_m + τ_s)) everywhere on any tree of even membrane; derived, verified by two computations."""
    membrane = Membrane(axial_resistivity_ohm_cm=150, capacitance_uF_cm2=1, resistance_ohm_cm2=20000, rest_mV=-70)
    even = SynapticInput(
        name="a",
        where=Zone(),
        density_per_um2=0.08,
        rate_Hz=1.0,
        current_pA=10.0,
        kernel=Kernel.exponential(2.0),
        correlation=1.0,
    )
    for seed in (13, 14):
        field = CableModel(arbor(seed, 70), membrane, (even,)).fluctuations()
        assert_allclose(field.variance_mV2, 232.727272727, rtol=EXACT)


def test_slow_common_drive_is_the_mean_that_wavers() -> None:
    """In step, all synapses are one train of rate ν, so that at zero frequency S = (mean depolarisation)²/ν."""
    point = model(TREE, replace(ONE, correlation=1.0)).refined.point
    still = point.sources[0].spectrum(point.network.at(np.zeros(1)))[:, 0]
    assert_allclose(still, (point.mean_mV - MEMBRANE.rest_mV) ** 2 / 2e-3, rtol=EXACT)
