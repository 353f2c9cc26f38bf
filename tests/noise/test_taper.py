"""Tapering cylinders against the exact cone (Bessel functions), and the truth of the refinement certificate."""

from __future__ import annotations

import numpy as np
import pytest
from numpy.testing import assert_allclose

from cable import CableModel, Kernel, Membrane, SynapticInput
from cable.noise.operating_point import operating_point
from cable.noise.refinement import TARGET, refine
from morphology import CellTree, Zone
from noise.cells import arbor, model
from oracles.cone import frusta_impedance_GOhm
from tolerances import REFINED

MEMBRANE = Membrane(axial_resistivity_ohm_cm=150, capacitance_uF_cm2=1, resistance_ohm_cm2=20000, rest_mV=-70)
SWC = "1 3 0 0 0 2 -1\n2 3 120 0 0 0.6 1\n3 3 200 90 0 0.25 2\n4 3 230 -60 0 0.9 2\n"
LENGTHS = (120.0, float(np.hypot(80, 90)), float(np.hypot(110, 60)))
FRUSTA = [(0, 1, LENGTHS[0], 4.0, 1.2), (1, 2, LENGTHS[1], 1.2, 0.5), (1, 3, LENGTHS[2], 1.2, 1.8)]


def cone_impedance(s: complex) -> np.ndarray:
    return np.array(frusta_impedance_GOhm(FRUSTA, 20000.0, 150.0, 1.0, s)).astype(complex)


def columns(divide: int, omega: float) -> np.ndarray:
    bare = CableModel(CellTree.from_text(SWC), MEMBRANE)
    point = operating_point(bare, np.full(3, divide))
    response = point.network.at(np.array([omega]))
    return np.array([response.column(int(n))[point.layout.row_node, 0] for n in point.layout.row_node]).T


def test_divisions_converge_with_the_fourth_power() -> None:
    omega = 0.3
    want = cone_impedance(1j * omega)
    errors = [np.abs(columns(n, omega) / want - 1).max() for n in (2, 4, 8, 16)]
    orders = np.log2(np.array(errors[:-1]) / errors[1:])
    assert orders[-1] == pytest.approx(4.0, abs=0.4), errors
    assert errors[-1] < REFINED


def test_variance_of_a_tapering_tree() -> None:
    """Even area density: variance from impedances at real Laplace frequencies, exact on cones too."""
    one = SynapticInput(
        name="even",
        where=Zone(),
        density_per_um2=0.1,
        rate_Hz=1.0,
        current_pA=10.0,
        kernel=Kernel.exponential(2.0),
    )
    field = CableModel(CellTree.from_text(SWC), MEMBRANE, (one,)).fluctuations()
    strength = 1e-3 * 0.1 * 20.0**2 / 0.01
    want = strength / 2 * np.diag(cone_impedance(0.0) - cone_impedance(0.5)).real
    assert_allclose(field.variance_mV2, want, rtol=REFINED)
    assert_allclose(field.input_resistance_MOhm, 1e3 * np.diag(cone_impedance(0.0)).real, rtol=REFINED)


@pytest.mark.parametrize("seed", [1, 2, 3])
def test_certificate_bounds_the_real_error(seed: int) -> None:
    driven = model(arbor(seed, 80))
    refined = refine(driven)
    assert 0 < refined.relative_error <= TARGET
    divide = np.bincount(refined.point.layout.segment, minlength=refined.point.layout.segments)
    fine = operating_point(driven, 8 * divide)
    u = np.linspace(0, 6, 13)
    omega = refined.point.network.slowest_rate_per_ms * np.sinh(u)
    weights = np.cosh(u)
    coarse, exact = (
        sum(s.spectrum(p.network.at(omega)) for s in p.sources)[p.layout.row_node] @ weights
        for p in (refined.point, fine)
    )
    assert np.abs(coarse / exact - 1).max() <= refined.relative_error
    size = np.abs(fine.deviation_mV).max()
    difference = refined.point.deviation_mV[refined.point.layout.row_node] - fine.deviation_mV[fine.layout.row_node]
    assert np.abs(difference).max() <= refined.relative_error * size


def test_driven_tapers_converge_with_the_fourth_power() -> None:
    """Conductances by length on a taper: synapses, membrane and driving force lean differently along a piece."""
    one = SynapticInput(
        name="e",
        where=Zone(),
        density_per_um=0.6,
        rate_Hz=4.0,
        conductance_nS=0.8,
        reversal_mV=0.0,
        kernel=Kernel.alpha(1.5),
    )
    cell = CableModel(CellTree.from_text(SWC), MEMBRANE, (one,))
    omega = np.array([0.0, 0.2, 1.0])

    def spectrum(divide: int) -> np.ndarray:
        point = operating_point(cell, np.full(3, divide))
        return np.concatenate(
            [
                point.sources[0].spectrum(point.network.at(omega))[point.layout.row_node].ravel(),
                point.deviation_mV[point.layout.row_node],
            ]
        )

    finest = spectrum(128)
    errors = [np.abs(spectrum(n) / finest - 1).max() for n in (4, 8, 16)]
    orders = np.log2(np.array(errors[:-1]) / errors[1:])
    assert orders[-1] == pytest.approx(4.0, abs=0.4), errors
