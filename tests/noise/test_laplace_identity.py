"""Real reconstructions against covariances at real Laplace frequencies: no frequency integral, any morphology.

Both sides get the same cylinders: every edge has the far point's radius, which for the program is written as
a second row in the parent's place. Derived, verified by two computations (see the oracle).
"""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest
from numpy.testing import assert_allclose

from cable import CableModel, Kernel, Membrane, SynapticInput
from morphology import CellTree, Zone
from oracles.laplace_identity import (
    covariance_mV2,
    derivative_covariance_mV2_per_ms2,
    transfer_impedance_GOhm,
)
from oracles.plain import Cell, Cylinder, Sphere
from tolerances import IDENTITY

DATA = Path(__file__).parent.parent / "data"
DENSITY_PER_UM2, RATE_HZ, CHARGE_FC = 0.05, 1.2, 15.0
MEMBRANE = Membrane(axial_resistivity_ohm_cm=150, capacitance_uF_cm2=1, resistance_ohm_cm2=20000, rest_mV=-70)
KERNELS = {
    (2.0,): Kernel.exponential(2.0),
    (0.5, 5.0): Kernel.two_exponential(0.5, 5.0),
    (3.0, 3.0): Kernel.alpha(3.0),
}


def rows_of(name: str) -> np.ndarray:
    """The file's rows without axon and without the side points of a three-point soma, parents as row numbers."""
    table = np.loadtxt(DATA / f"{name}.swc")
    somata = np.flatnonzero(table[:, 1] == 1)
    table = table[(table[:, 1] != 2) & ~np.isin(np.arange(len(table)), somata[1:])]
    place = {int(swc_id): row for row, swc_id in enumerate(table[:, 0])}
    table[:, 6] = [place.get(int(parent), -1) for parent in table[:, 6]]
    assert (table[1:, 6] >= 0).all() and table[0, 1] == 1
    return table


def plain_cell(table: np.ndarray) -> Cell:
    cylinders = []
    for row in range(1, len(table)):
        parent = int(table[row, 6])
        length = np.linalg.norm(table[row, 2:5] - table[parent, 2:5]) - (table[0, 5] if parent == 0 else 0.0)
        cylinders.append(Cylinder(parent, row, float(length), 2 * float(table[row, 5])))
    return Cell(tuple(cylinders), (Sphere(0, 4 * np.pi * float(table[0, 5]) ** 2),))


def stepped_tree(table: np.ndarray) -> tuple[CellTree, np.ndarray]:
    """The tree with a second row at the parent's place before each edge, and the new row of each old one."""
    parent, kinds, xyz, radius, at = (
        [-1],
        [1],
        [table[0, 2:5]],
        [table[0, 5]],
        np.zeros(len(table), dtype=int),
    )
    for row in range(1, len(table)):
        above = int(table[row, 6])
        if above > 0:
            parent += [int(at[above])]
            kinds, xyz, radius = [*kinds, 3], [*xyz, table[above, 2:5]], [*radius, table[row, 5]]
        parent += [len(parent) - 1 if above > 0 else 0]
        kinds, xyz, radius = [*kinds, 3], [*xyz, table[row, 2:5]], [*radius, table[row, 5]]
        at[row] = len(parent) - 1
    tree = CellTree(np.arange(len(parent)), np.array(kinds), np.array(xyz), np.array(radius), np.array(parent))
    return tree, at


@pytest.mark.parametrize("name", ["ca1_pyramidal", "purkinje", "motoneuron"])
def test_variance_resistance_and_crossings(name: str) -> None:
    table = rows_of(name)
    cell = plain_cell(table)
    tree, at = stepped_tree(table)
    nodes = [0, *np.random.default_rng(6).choice(len(table), 5, replace=False).tolist()]
    per_pF_ms = RATE_HZ * 1e-3 * DENSITY_PER_UM2 / 0.01
    resistance = transfer_impedance_GOhm(cell, 0.0, nodes)
    for poles, kernel in KERNELS.items():
        one = SynapticInput(
            name="even",
            where=Zone(),
            density_per_um2=DENSITY_PER_UM2,
            rate_Hz=RATE_HZ,
            current_pA=CHARGE_FC / kernel.area_ms,
            kernel=kernel,
        )
        threshold = -60.0 if len(poles) == 2 else None
        field = CableModel(tree, MEMBRANE, (one,), threshold_mV=threshold).fluctuations()
        want = np.diag(covariance_mV2(cell, nodes, poles, CHARGE_FC, per_pF_ms))
        assert_allclose(field.variance_mV2[at[nodes]], want, rtol=IDENTITY)
        assert_allclose(
            field.input_resistance_MOhm[at[nodes]],
            [1e3 * resistance[n, k] for k, n in enumerate(nodes)],
            rtol=IDENTITY,
        )
        if field.upcrossing_Hz is not None:
            slope = np.diag(derivative_covariance_mV2_per_ms2(cell, nodes, poles, CHARGE_FC, per_pF_ms))
            rate = (
                1e3
                / (2 * np.pi)
                * np.sqrt(slope / want)
                * np.exp(-((-60 - field.mean_mV[at[nodes]]) ** 2) / (2 * want))
            )
            assert_allclose(field.upcrossing_Hz[at[nodes]], rate, rtol=10 * IDENTITY)
