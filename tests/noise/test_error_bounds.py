"""Both certificates against the truth: frequency integrals by Gauss's rule, divisions by eight times as many."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from numpy.testing import assert_allclose

from cable import CableModel, Kernel, SpikeTrain, SynapticInput
from cable.noise.operating_point import OperatingPoint, operating_point
from cable.noise.refinement import TARGET, refine
from morphology import Zone
from noise.cells import EXCITATION, INHIBITION, MEMBRANE, arbor, model
from tolerances import ALGEBRA

KERNELS = {
    "two exponentials": (Kernel.two_exponential(0.3, 2.5), SpikeTrain.poisson()),
    "cosine": (Kernel.expression("exp(-t/4)*(1 + 0.5*cos(1.5*t))"), SpikeTrain.poisson()),
    "jump, gamma": (Kernel.exponential(2.0), SpikeTrain.gamma(5)),
    "dead time": (Kernel.alpha(1.0), SpikeTrain.dead_time(6.0)),
}
CORNER, END = 40.0, 1e6  # rad/ms: even panels up to the first, growing ones up to the second; what is left is < 1e-13
# beyond the last node the spectrum is continued by a geometric series; sums of several powers fall more slowly than
# that, so that the error that is reported can be too small by a few per cent (seen: 8)
CONTINUED = 1.1


def frequencies() -> tuple[np.ndarray, np.ndarray]:
    """Nodes and weights of (1/π)∫₀^∞ dω by Gauss's rule on panels; no substitution, no trapezoids."""
    x, w = np.polynomial.legendre.leggauss(10)
    ends = np.r_[0.0, np.geomspace(1e-3, 0.2, 12), np.arange(0.4, CORNER, 0.2), np.geomspace(CORNER, END, 80)]
    low, high = ends[:-1, None], ends[1:, None]
    return (low + (high - low) * (x + 1) / 2).ravel(), ((high - low) * w / 2 / np.pi).ravel()


def spectrum(point: OperatingPoint, omega: np.ndarray) -> np.ndarray:
    """(nodes, F) of all inputs together."""
    response = point.network.at(omega)
    return sum(source.spectrum(response) for source in point.sources)


def integrated(point: OperatingPoint, derivative: bool) -> tuple[np.ndarray, np.ndarray]:
    """Variance at every row of the tree, and that of dV/dt if wanted."""
    omega, weights = frequencies()
    total = np.zeros((2, len(point.model.tree)))
    for block in np.array_split(np.arange(len(omega)), len(omega) // 40):
        here = spectrum(point, omega[block])[point.layout.row_node]
        total += [here @ weights[block], here @ (weights[block] * omega[block] ** 2 * derivative)]
    return total[0], total[1]


@pytest.mark.parametrize("seed", [21, 22, 23])
@pytest.mark.parametrize("name", KERNELS)
def test_quadrature_error_is_below_the_reported_one(name: str, seed: int) -> None:
    kernel, train = KERNELS[name]
    one = SynapticInput(
        name="a",
        where=Zone(kinds=("basal",)),
        density_per_um=0.4,
        rate_Hz=50.0,
        conductance_nS=0.05,
        reversal_mV=0.0,
        kernel=kernel,
        spike_train=train,
        correlation=0.05 * (seed == 22),
    )
    smooth = kernel.falls_as > 1 and train.dead_time_ms == 0
    cell = model(arbor(seed, 40), one, INHIBITION, threshold_mV=-60.0 if smooth else None)
    exact, slope = integrated(cell.refined.point, smooth)
    for tolerance in (1e-4, 1e-8):
        rough = cell.fluctuations(tolerance)
        bound = rough.certificate.quadrature_relative_error
        assert bound <= tolerance
        assert np.abs(rough.variance_mV2 / exact - 1).max() <= CONTINUED * bound
        if rough.upcrossing_Hz is not None:
            apart = (-60 - rough.mean_mV) ** 2 / 2
            ratio = (2e-3 * np.pi * rough.upcrossing_Hz * np.exp(apart / rough.variance_mV2)) ** 2
            assert np.abs(ratio * rough.variance_mV2 / slope - 1).max() <= CONTINUED * bound


@pytest.mark.parametrize("seed", range(31, 37))
def test_division_error_is_below_the_reported_one(seed: int) -> None:
    driven = model(arbor(seed, 50), replace(EXCITATION, correlation=0.02 * (seed % 2)), INHIBITION)
    refined = refine(driven)
    assert 0 < refined.relative_error <= TARGET
    divide = np.bincount(refined.point.layout.segment, minlength=refined.point.layout.segments)
    fine = operating_point(driven, 8 * divide)
    nodes = (refined.point.layout.row_node, fine.layout.row_node)
    u = np.linspace(0, 14, 141)
    omega, weights = refined.point.network.slowest_rate_per_ms * np.sinh(u), np.cosh(u) * np.where(u > 0, 1, 0.5)
    coarse, exact = np.zeros((2, len(driven.tree)))
    for block in np.array_split(np.arange(len(u)), 8):
        for total, point, rows in zip((coarse, exact), (refined.point, fine), nodes, strict=True):
            total += spectrum(point, omega[block])[rows] @ weights[block]
    assert np.abs(coarse / exact - 1).max() <= refined.relative_error
    size = np.abs(fine.deviation_mV).max()
    assert np.abs(refined.point.deviation_mV[nodes[0]] - fine.deviation_mV[nodes[1]]).max() <= (
        refined.relative_error * size
    )


def test_even_cylinders_with_currents_need_no_division() -> None:
    one = SynapticInput(
        name="a", where=Zone(), density_per_um=0.4, rate_Hz=5.0, current_pA=3.0, kernel=Kernel.alpha(2.0)
    )
    refined = CableModel(arbor(41, 50, untapered=True), MEMBRANE, (one,)).refined
    assert refined.relative_error == 0.0
    fine = operating_point(refined.point.model, np.full(refined.point.layout.segments, 3))
    omega = np.array([0.0, 0.1, 2.0])
    got, want = (p.sources[0].spectrum(p.network.at(omega))[p.layout.row_node] for p in (refined.point, fine))
    assert_allclose(got, want, rtol=ALGEBRA)
