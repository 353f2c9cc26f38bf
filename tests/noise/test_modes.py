"""Modes against a dense eigen-decomposition of the covariance, which comes from real Laplace frequencies."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from numpy.testing import assert_allclose

from cable import CableModel, Kernel, Membrane, SynapticInput
from morphology import CellTree, Zone
from noise.cells import EXCITATION, INHIBITION, arbor, model
from oracles.laplace_identity import covariance_mV2
from oracles.plain import Cell, Cylinder, Sphere
from tolerances import IDENTITY

PLAIN = Membrane(axial_resistivity_ohm_cm=150, capacitance_uF_cm2=1, resistance_ohm_cm2=20000, rest_mV=-70)
EVEN = SynapticInput(
    name="even", where=Zone(), density_per_um2=0.05, rate_Hz=1.0, current_pA=8.0, kernel=Kernel.exponential(2.0)
)


def test_against_a_dense_decomposition() -> None:
    """300 points; cylinders of one radius from one row to the next, so that both sides hold the same cell."""
    tree = arbor(41, 300, untapered=True)
    distance = [float(np.linalg.norm(tree.xyz_um[k] - tree.xyz_um[tree.parent[k]])) for k in range(1, 300)]
    length = [d - 7.0 * (tree.parent[k] == 0) for k, d in enumerate(distance, start=1)]
    cylinders = tuple(Cylinder(int(tree.parent[k]), k, length[k - 1], 1.0) for k in range(1, 300))
    plain = Cell(cylinders, (Sphere(0, 4 * np.pi * 49.0),))
    covariance = covariance_mV2(plain, list(range(300)), (2.0,), 16.0, 1e-3 * 0.05 / 0.01)
    area = np.zeros(300)
    area[0] = 4 * np.pi * 49.0
    for c in cylinders:
        area[[c.parent, c.child]] += np.pi * c.length_um / 2
    root = np.sqrt(area / area.sum())
    values, vectors = np.linalg.eigh(root[:, None] * covariance * root)
    got = CableModel(tree, PLAIN, (EVEN,)).modes(6, tolerance=1e-10)
    assert_allclose(got.share, values[::-1][:6] / values.sum(), rtol=IDENTITY)
    for k in range(6):
        want = np.sqrt(values[-1 - k]) * vectors[:, -1 - k] / root
        want *= np.sign(want[np.abs(want).argmax()])
        assert_allclose(got.pattern_mV[k], want, atol=1e-7 * np.abs(want).max())
    exact = values.sum() ** 2 / (values**2).sum()
    assert got.participation[0] <= exact * (1 + 1e-9) and exact <= got.participation[1] * (1 + 1e-9)
    assert got.participation[1] / got.participation[0] < 1.05


def test_a_sphere_has_one_voltage_and_common_drive_makes_one_mode() -> None:
    ball = CellTree.from_text("1 1 0 0 0 8 -1\n2 3 8.5 0 0 1 1\n")
    share = CableModel(ball, PLAIN, (EVEN,)).modes(1).share
    assert share[0] == pytest.approx(1.0, abs=1e-3)
    tree = arbor(42, 60)
    alone = model(tree, EXCITATION, INHIBITION).modes(2).share[0]
    common = model(tree, replace(EXCITATION, correlation=0.5), INHIBITION).modes(2).share[0]
    assert alone < common and common > 0.9


def test_modes_explain_the_variance_at_every_point() -> None:
    tree = arbor(43, 12)
    cell = model(tree)
    size = len(cell.refined.point.layout.parent)
    found = cell.modes(size - 1, tolerance=1e-9)
    assert_allclose((found.pattern_mV**2).sum(axis=0), cell.fluctuations().variance_mV2, rtol=0.02)
    assert found.share.sum() == pytest.approx(1.0, abs=1e-3)
    assert (np.diff(found.share) <= 1e-12).all()


def test_messages() -> None:
    with pytest.raises(ValueError, match="count: expected 1 to"):
        model(arbor(44, 10)).modes(0)
