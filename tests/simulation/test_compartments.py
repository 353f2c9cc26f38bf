"""Compartments: totals are kept, the mean state is that of a dense solve, and errors fall with the square."""

from __future__ import annotations

import numpy as np
import pytest
from numpy.testing import assert_allclose

from simulation.simulated_cells import EXCITATION, INHIBITION, divided, stick
from tolerances import ALGEBRA, ROUND_OFF


def test_totals_are_those_of_the_cell() -> None:
    model = stick()
    point, cells = divided(model, 3)
    area = model.tree.shape.area_um2.sum() + model.tree.shape.sphere_area_um2.sum()
    assert_allclose(cells.capacitance_pF.sum(), 0.01 * area, rtol=ROUND_OFF)
    tonic = [
        one.mean_conductance_nS * numbers.total for one, numbers in zip(model.inputs, cells.populations, strict=True)
    ]
    assert_allclose(cells.conductance_nS.sum(), 10 / 20000 * area + sum(tonic), rtol=ROUND_OFF)
    assert_allclose(cells.populations[1].total, INHIBITION.density_per_um2 * area, rtol=ROUND_OFF)
    assert_allclose(cells.populations[0].total, EXCITATION.density_per_um * 810.0, rtol=ROUND_OFF)
    assert len(cells.parent) == len(point.layout.parent)


def test_mean_state_is_that_of_a_dense_solve() -> None:
    model = stick()
    _, cells = divided(model, 4)
    n = len(cells.parent)
    matrix = np.diag(cells.conductance_nS)
    for child in range(1, n):
        parent, g = cells.parent[child], cells.axial_nS[child - 1]
        matrix[child, child] += g
        matrix[parent, parent] += g
        matrix[child, parent] -= g
        matrix[parent, child] -= g
    assert_allclose(cells.matrix_nS.toarray(), matrix, atol=1e-12)
    tonic = [one.mean_conductance_nS * p.number for one, p in zip(model.inputs, cells.populations, strict=True)]
    leak = cells.conductance_nS - sum(tonic)
    drive = leak * -70.0 + tonic[0] * 0.0 + tonic[1] * -75.0
    assert_allclose(cells.mean_mV, np.linalg.solve(matrix, drive), rtol=ALGEBRA)
    assert_allclose(cells.force(model.inputs[1]), 0.8 * (-75.0 - cells.mean_mV), rtol=ROUND_OFF)


def test_mean_errs_by_the_square_of_the_size() -> None:
    model = stick()
    exact = model.fluctuations().at("tip").mean_mV
    apart = []
    for pieces in (24, 48):
        point, cells = divided(model, pieces)
        apart.append(abs(cells.mean_mV[point.layout.row_node[2]] - exact))
    assert apart[0] / apart[1] == pytest.approx(4.0, rel=0.1)
