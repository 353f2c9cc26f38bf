"""Modes against dense eigen-decompositions of covariances that come from elsewhere."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from numpy.testing import assert_allclose

from cable import CableModel, Kernel, Membrane, SynapticInput
from morphology import CellTree, Zone
from noise.cells import EXCITATION, INHIBITION, arbor, model
from noise.plain_cells import untapered_pair
from oracles.dense_sources import covariance_spectrum, frequencies
from oracles.laplace_identity import covariance_mV2
from oracles.plain import Cell
from tolerances import EXACT, IDENTITY

PLAIN = Membrane(axial_resistivity_ohm_cm=150, capacitance_uF_cm2=1, resistance_ohm_cm2=20000, rest_mV=-70)
EVEN = SynapticInput(
    name="even", where=Zone(), density_per_um2=0.05, rate_Hz=1.0, current_pA=8.0, kernel=Kernel.exponential(2.0)
)


def weighted(covariance: np.ndarray, plain: Cell) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
    """Eigenvalues, falling, eigenvectors and root areas of a covariance (N, N), weighted by area."""
    area = np.zeros(plain.node_count)
    for sphere in plain.spheres:
        area[sphere.node] += sphere.area_um2
    for c in plain.cylinders:
        area[[c.parent, c.child]] += c.area_um2 / 2
    root = np.sqrt(area / area.sum())
    values, vectors = np.linalg.eigh(root[:, None] * covariance * root)
    return values[::-1], vectors[:, ::-1], root


def test_against_a_dense_decomposition() -> None:
    """300 points, events in proportion to capacitance: the covariance needs no frequency integral."""
    tree, plain = untapered_pair(41, 300)
    covariance = covariance_mV2(plain, list(range(300)), (2.0,), 16.0, 1e-3 * 0.05 / 0.01)
    values, vectors, root = weighted(covariance, plain)
    got = CableModel(tree, PLAIN, (EVEN,)).modes(6, tolerance=1e-10)
    assert_allclose(got.share, values[:6] / values.sum(), rtol=IDENTITY)
    for k in range(6):
        want = np.sqrt(values[k]) * vectors[:, k] / root
        want *= np.sign(want[np.abs(want).argmax()])
        assert_allclose(got.pattern_mV[k], want, atol=1e-7 * np.abs(want).max())


def test_uneven_correlated_drive_against_dense_matrices() -> None:
    """300 points, synapses on one kind only and partly in step; the covariance by loops over dense matrices."""
    tree, plain = untapered_pair(45, 300)
    one = SynapticInput(
        name="a",
        where=Zone(kinds=("apical",)),
        density_per_um=0.3,
        rate_Hz=2.0,
        current_pA=5.0,
        kernel=Kernel.alpha(2.0),
        correlation=0.002,
    )
    count = np.array([0.3 * c.length_um * (tree.kinds[c.child] == 4) for c in plain.cylinders])
    covariance = np.zeros((300, 300))
    for omega, weight in zip(*frequencies(0.05, 0.4, 23), strict=True):
        event = np.sqrt(2e-3) * 5.0 * np.e * 2.0 / (1 + 2j * omega) ** 2
        events = list(zip(event * count, event * np.sqrt(count), strict=True))
        covariance += weight * covariance_spectrum(plain, omega, events, 0.002)
    values, _, _ = weighted(covariance, plain)
    got = CableModel(tree, PLAIN, (one,)).modes(10, tolerance=1e-10)
    assert_allclose(got.share, values[:10] / values.sum(), rtol=IDENTITY)
    exact = values.sum() ** 2 / (values**2).sum()
    assert abs(got.participation - exact) <= 4 * got.participation_se + 1e-8 * exact


@pytest.mark.parametrize("seed", range(4))
def test_participation_number_by_probes(seed: int) -> None:
    """From 3 modes and random probes, against all 200 modes of a cell with many."""
    tree, plain = untapered_pair(46, 200)
    covariance = covariance_mV2(plain, list(range(200)), (2.0,), 16.0, 1e-3 * 0.05 / 0.01)
    values, _, _ = weighted(covariance, plain)
    exact = values.sum() ** 2 / (values**2).sum()
    got = CableModel(tree, PLAIN, (EVEN,)).modes(3, seed=seed, tolerance=1e-8)
    assert 0 < got.participation_se < 0.03 * exact
    assert abs(got.participation - exact) < 4 * got.participation_se


def test_seed_decides_the_probes_and_nothing_else() -> None:
    cell = model(arbor(47, 120))
    one, again, other = (cell.modes(2, seed=seed) for seed in (5, 5, 6))
    assert one.participation == again.participation != other.participation
    assert_allclose(one.share, other.share, rtol=1e-10)


def test_alike_branches_have_modes_of_one_strength() -> None:
    """Six like branches on a soma: of the six slowest patterns one is common, five are differences alike."""
    rows, number = ["1 1 0 0 0 8 -1"], 2
    for k in range(6):
        parent = 1
        for step in range(1, 21):
            reach = np.array([np.cos(k * np.pi / 3), np.sin(k * np.pi / 3)]) * (8 + 20 * step)
            rows.append(f"{number} 3 {reach[0]:.9f} {reach[1]:.9f} 0 0.5 {parent}")
            parent, number = number, number + 1
    share = CableModel(CellTree.from_text("\n".join(rows)), PLAIN, (EVEN,)).modes(7).share
    assert_allclose(share[2:6], share[1], rtol=IDENTITY)
    assert share[0] > 3 * share[1] and share[6] < 0.5 * share[5]


def test_a_sphere_has_one_voltage() -> None:
    found = (cell := CableModel(CellTree.from_text("1 1 0 0 0 8 -1\n"), PLAIN, (EVEN,))).modes(1)
    assert found.share[0] == pytest.approx(1.0, rel=1e-12)
    assert (found.participation, found.participation_se) == (pytest.approx(1.0, rel=1e-12), 0.0)
    assert found.pattern_mV[0, 0] == pytest.approx(cell.fluctuations().at("soma").sd_mV, rel=1e-6)
    with pytest.raises(ValueError, match="count: expected 1 to 1 modes"):
        cell.modes(2)


def test_common_drive_makes_one_mode() -> None:
    tree = arbor(42, 60)
    alone = model(tree, EXCITATION, INHIBITION).modes(2).share[0]
    common = model(tree, replace(EXCITATION, correlation=0.5), INHIBITION).modes(2).share[0]
    assert alone < common and common > 0.9


def test_modes_explain_the_variance_at_every_point() -> None:
    tree = arbor(43, 12)
    cell = model(tree)
    size = len(cell.refined.point.layout.parent)
    found = cell.modes(size, tolerance=1e-9)
    assert_allclose((found.pattern_mV**2).sum(axis=0), cell.fluctuations().variance_mV2, rtol=EXACT)
    assert found.share.sum() == pytest.approx(1.0, rel=EXACT)
    assert (np.diff(found.share) <= 1e-12).all()
    for one in (found, cell.modes(2, tolerance=1e-9)):  # of few points all modes are found, whatever is asked for
        assert one.participation == pytest.approx(1 / (found.share**2).sum(), rel=EXACT)
        assert one.participation_se == 0


@pytest.mark.parametrize("count", [-1, 0, 10_000])
def test_a_count_that_no_cell_has(count: int) -> None:
    with pytest.raises(ValueError, match=f"count: expected 1 to .* modes for this cell, found {count}"):
        model(arbor(44, 10)).modes(count)


def test_nothing_fluctuates() -> None:
    for inputs in ((), (replace(EXCITATION, rate_Hz=0.0),), (replace(EVEN, current_pA=0.0),)):
        with pytest.raises(ValueError, match="nothing fluctuates in this cell"):
            CableModel(arbor(44, 10), PLAIN, inputs).modes(2)
