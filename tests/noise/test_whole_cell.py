"""A whole small cell against finite volumes with a Lyapunov equation, and impedances against finite elements."""

from __future__ import annotations

import numpy as np
import pytest
from numpy.testing import assert_allclose

from cable import CableModel, Kernel, Membrane, Placed, SynapticInput
from morphology import CellTree, Site, Zone
from oracles.compartments import convergence_order, mean_and_covariance, richardson
from oracles.finite_elements import impedance_GOhm
from oracles.plain import Cell, Cylinder, Input, Sphere, event_area
from tolerances import COMPARTMENTS, ELEMENTS

MEMBRANE = Membrane(axial_resistivity_ohm_cm=150, capacitance_uF_cm2=1, resistance_ohm_cm2=20000, rest_mV=-70)
SWC = """1 1 0 0 0 8 -1
2 3 8 0 0 0.9 1
3 3 158 0 0 0.9 2
4 3 158 0 0 0.5 3
5 3 158 110 0 0.5 4
6 4 158 0 0 0.6 3
7 4 158 0 -190 0.6 6
"""
PLAIN = Cell(
    (Cylinder(0, 1, 150.0, 1.8), Cylinder(1, 2, 110.0, 1.0), Cylinder(1, 3, 190.0, 1.2)),
    (Sphere(0, 4 * np.pi * 64.0),),
)
ROWS = [0, 2, 4, 6]


def test_conductances_points_and_currents_together() -> None:
    inputs = (
        SynapticInput(
            name="excitation",
            where=Zone(kinds=("basal", "apical")),
            density_per_um=0.6,
            rate_Hz=3.0,
            conductance_nS=0.5,
            reversal_mV=0.0,
            kernel=Kernel.two_exponential(0.6, 3.0),
        ),
        SynapticInput(
            name="inhibition",
            at=(Placed(Site("", swc_id=1), 40.0), Placed(Site("", swc_id=5), 6.0)),
            rate_Hz=5.0,
            conductance_nS=0.7,
            reversal_mV=-78.0,
            kernel=Kernel.alpha(2.5),
        ),
        SynapticInput(
            name="current",
            where=Zone(kinds=("apical",)),
            density_per_um=0.3,
            rate_Hz=2.0,
            current_pA=-6.0,
            kernel=Kernel.exponential(4.0),
        ),
    )
    plain = [
        Input(3e-3, event_area(0.5, (0.6, 3.0)), (0.6, 3.0), (0.6, 0.6, 0.6), reversal_mV=70.0),
        Input(5e-3, event_area(0.7, (2.5, 2.5)), (2.5, 2.5), number_at=((0, 40.0), (2, 6.0)), reversal_mV=-8.0),
        Input(2e-3, event_area(-6.0, (4.0,)), (4.0,), (0.0, 0.0, 0.3)),
    ]
    field = CableModel(CellTree.from_text(SWC), MEMBRANE, inputs).fluctuations()
    runs = [mean_and_covariance(PLAIN, plain, n) for n in (6, 12, 24)]
    means = [run[0][:4] for run in runs]
    variances = [np.array([np.diag(part)[:4] for part in run[1]]) for run in runs]
    assert convergence_order([v.sum() for v in variances]) == pytest.approx(2.0, abs=0.15)
    assert_allclose(field.mean_mV[ROWS], -70 + richardson(means), rtol=COMPARTMENTS)
    want = richardson(variances)
    for k, name in enumerate(("excitation", "inhibition", "current")):
        # a point synapse seen at its own site has a kink that finite volumes resolve slowly
        tolerance = 100 * COMPARTMENTS if name == "inhibition" else 3 * COMPARTMENTS
        assert_allclose(field.variance_by_input_mV2[name][ROWS], want[k], rtol=tolerance, err_msg=name)


@pytest.mark.parametrize("frequency_Hz", [0.0, 10.0, 200.0])
def test_impedance_of_a_branched_cell(frequency_Hz: float) -> None:
    point = CableModel(CellTree.from_text(SWC), MEMBRANE).refined.point
    response = point.network.at(np.array([2e-3 * np.pi * frequency_Hz]))
    nodes = point.layout.row_node[ROWS]
    want = impedance_GOhm(PLAIN, frequency_Hz, n=60)
    for k, node in enumerate(nodes):
        assert_allclose(response.column(int(node))[nodes, 0], want[:4, k], rtol=ELEMENTS)
