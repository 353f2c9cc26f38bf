"""Two electrodes against worked examples, closed forms in space and lag, and what lags and spectra must obey."""

from __future__ import annotations

from dataclasses import replace
from itertools import pairwise

import numpy as np
import pytest
from numpy.testing import assert_allclose
from scipy.integrate import quad

from cable import CableModel, Kernel, Membrane, SpikeTrain, SynapticInput
from morphology import CellTree, Site, Zone
from noise.cells import EXCITATION, INHIBITION, arbor, model
from oracles import worked, worked_distal
from oracles.infinite_cable import Cable, distributed_covariance_mV2
from oracles.laplace_identity import covariance_mV2
from oracles.plain import Cell, Cylinder, Sphere
from tolerances import EXACT, IDENTITY

PLAIN = Membrane(axial_resistivity_ohm_cm=150, capacitance_uF_cm2=1, resistance_ohm_cm2=20000, rest_mV=0)
EXPONENTIAL = Kernel.exponential(2.0)
NO_HZ = np.ones(1)
STICK = "1 1 0 0 0 10 -1\n2 3 10 0 0 1 1\n3 3 1010 0 0 1 2\n"
EVEN = SynapticInput(name="a", rate_Hz=1, kernel=EXPONENTIAL, where=Zone(), density_per_um2=0.08, current_pA=10)


def stick() -> CableModel:
    return CableModel(CellTree.from_text(STICK), PLAIN, (EVEN,), (Site("tip", swc_id=3),))


def uneven() -> CableModel:
    tree = arbor(11, 70)
    return model(tree, sites=(Site("a", swc_id=int(tree.ids[50])), Site("b", swc_id=int(tree.ids[69]), fraction=0.3)))


def test_distal_cable() -> None:
    """Asymmetric: the driven distal end leads (derived, verified by two computations)."""
    kernel = Kernel.two_exponential(0.5, 5.0)
    one = SynapticInput(
        name="a",
        rate_Hz=1,
        kernel=kernel,
        where=Zone(path_um=(500, 1000)),
        density_per_um=1,
        current_pA=20 / kernel.area_ms,
    )
    cell = CableModel(CellTree.from_text("1 3 0 0 0 1 -1\n2 3 1000 0 0 1 1\n"), PLAIN, (one,), (Site("tip", swc_id=2),))
    pair = cell.pair("soma", "tip", np.array([-5.0, 5.0]), NO_HZ)
    want = worked_distal.distal_cable()
    keys = ("covariance_0_1000_minus_5ms_mV2", "covariance_0_1000_plus_5ms_mV2")
    assert_allclose(pair.covariance_mV2, [float(want[key]) for key in keys], rtol=EXACT)
    assert pair.correlation == pytest.approx(float(want["correlation_0_1000"]), rel=EXACT)


def test_ball_and_stick() -> None:
    want = worked.ball_and_stick()
    cell = stick()
    own = cell.pair("soma", "soma", np.array([0.0, 5.0, 20.0]), NO_HZ)
    rho = own.covariance_mV2 / own.covariance_mV2[0]
    assert_allclose(rho[1:], [float(want["rho_soma_5ms"]), float(want["rho_soma_20ms"])], rtol=IDENTITY)
    assert cell.correlation_matrix()[0, 1] == pytest.approx(float(want["correlation_soma_tip"]), rel=EXACT)


def test_uniform_cable_and_y_branch_correlations() -> None:
    one = replace(EVEN, density_per_um2=None, density_per_um=0.5)
    cable = CableModel(
        CellTree.from_text("1 3 0 0 0 1 -1\n2 3 1000 0 0 1 1\n"), PLAIN, (one,), (Site("tip", swc_id=2),)
    )
    assert cable.correlation_matrix()[1, 0] == pytest.approx(
        float(worked.uniform_cable()["correlation_0_1000"]), rel=EXACT
    )
    trunk = 0.5 * 2 ** (2 / 3) * 1.2
    swc = f"1 3 0 0 0 {trunk!r} -1\n2 3 400 0 0 {trunk!r} 1\n"
    swc += "3 3 400 0 0 0.6 2\n4 3 580 240 0 0.6 3\n5 3 400 0 0 0.6 2\n6 3 580 -240 0 0.6 5\n"
    sites = Site("one tip", swc_id=4), Site("other tip", swc_id=6)
    branch = CableModel(
        CellTree.from_text(swc), PLAIN, (replace(EVEN, density_per_um2=0.1),), sites
    ).correlation_matrix()
    want = worked.y_branch()
    assert branch[0, 1] == pytest.approx(float(want["correlation_root_tip"]), rel=EXACT)
    assert branch[1, 2] == pytest.approx(float(want["correlation_tip_tip"]), rel=EXACT)


def test_covariance_in_space_on_a_long_cable() -> None:
    """The infinite cable's closed form in the middle of 24 length constants (derived, verified twice)."""
    one = replace(EVEN, density_per_um2=None, density_per_um=0.5)
    sites = Site("x", path_um=10_000.0), Site("y", path_um=10_600.0)
    cell = CableModel(CellTree.from_text("1 3 0 0 0 1 -1\n2 3 20000 0 0 1 1\n"), PLAIN, (one,), sites)
    got = cell.pair("x", "y", np.zeros(1), NO_HZ).covariance_mV2[0]
    assert got == pytest.approx(float(distributed_covariance_mV2(Cable(), 0.5, 1e-3, 20.0, 2.0, 600.0)), rel=1e-8)


@pytest.mark.parametrize("lag", [0.0, 0.4, 7.0, 60.0, 200.0])
def test_every_lag_against_an_adaptive_fourier_integral(lag: float) -> None:
    cell = uneven()
    pair = cell.pair("a", "b", np.array([lag, -lag]), NO_HZ)
    from cable.noise.cross import cross_spectra

    nodes = [cell.node_of("a"), cell.node_of("b")]

    def spectrum(omega: float) -> complex:
        return complex(cross_spectra(cell.refined.point, nodes, np.array([1j * omega]))[:, 0, 1].sum())

    def integral(part, **weight) -> float:
        edges = [0.0, *np.geomspace(0.02, 400.0, 16)]
        return sum(quad(part, a, b, epsabs=1e-13, limit=200, **weight)[0] for a, b in pairwise(edges))

    if lag:
        even = integral(lambda w: spectrum(w).real, weight="cos", wvar=lag)
        odd = integral(lambda w: spectrum(w).imag, weight="sin", wvar=lag)
    else:
        even, odd = integral(lambda w: spectrum(w).real), 0.0
    want = [(even + odd) / np.pi, (even - odd) / np.pi]
    field = cell.fluctuations()
    size = field.at("a").sd_mV * field.at("b").sd_mV
    assert_allclose(pair.covariance_mV2, want, atol=IDENTITY * size)


def test_lag_zero_is_the_variance_and_exchange_turns_the_lag() -> None:
    cell = uneven()
    lags = np.array([-30.0, -2.0, 0.0, 2.0, 30.0])
    pair, turned = cell.pair("a", "b", lags, NO_HZ), cell.pair("b", "a", lags, NO_HZ)
    assert_allclose(pair.covariance_mV2, turned.covariance_mV2[::-1], rtol=EXACT)
    assert abs(pair.covariance_mV2[1] / pair.covariance_mV2[3] - 1) > 1e-3  # it does have a direction
    assert_allclose(pair.phase_rad, -turned.phase_rad, atol=1e-12)
    assert_allclose(sum(pair.covariance_by_input_mV2.values()), pair.covariance_mV2, rtol=1e-12)
    field = cell.fluctuations()
    for name in ("a", "b"):
        own = cell.pair(name, name, np.zeros(1), NO_HZ)
        assert own.covariance_mV2[0] == pytest.approx(field.at(name).variance_mV2, rel=EXACT)
        assert own.correlation == pytest.approx(1.0, abs=1e-12)
        assert own.coherence[0] == pytest.approx(1.0, abs=1e-12)


def test_bounds_and_positive_matrix() -> None:
    tree = arbor(12, 60)
    sites = tuple(Site(f"s{k}", swc_id=int(tree.ids[k])) for k in (5, 20, 33, 48, 59))
    matrix = model(tree, replace(EXCITATION, correlation=0.01), INHIBITION, sites=sites).correlation_matrix()
    assert_allclose(matrix, matrix.T, atol=1e-12)
    assert_allclose(np.diag(matrix), 1.0, atol=1e-12)
    assert np.linalg.eigvalsh(matrix).min() > 0
    assert (np.abs(matrix) <= 1 + 1e-12).all()


@pytest.mark.parametrize("correlation", [0.0, 0.02])
def test_correlation_map_is_the_matrix_at_every_point(correlation: float) -> None:
    tree = arbor(13, 40)
    rows = (4, 17, 39)
    sites = tuple(Site(f"s{k}", swc_id=int(tree.ids[k])) for k in rows)
    cell = model(tree, replace(EXCITATION, correlation=correlation), INHIBITION, sites=sites)
    matrix = cell.correlation_matrix()
    for k, row in enumerate(rows):
        found = cell.correlation_map(f"s{row}", 1e-9)
        assert_allclose(found.correlation[[0, *rows]], matrix[k + 1], rtol=10 * EXACT)
        assert found.lag_ms[row] == pytest.approx(0.0, abs=1e-9)
        # the centroid of the cross-covariance, from a dense sum over lags
        lags = np.linspace(-400, 400, 16001)
        curve = cell.pair(f"s{row}", "soma", lags, NO_HZ).covariance_mV2
        assert found.lag_ms[0] == pytest.approx(float((lags * curve).sum() / curve.sum()), rel=1e-3, abs=1e-3)


def test_even_input_has_no_phase_and_matches_the_laplace_identity() -> None:
    cell = stick()
    pair = cell.pair("soma", "tip", np.array([-9.0, 9.0, 0.0]), np.array([0.5, 5.0, 30.0]))
    assert pair.covariance_mV2[0] == pytest.approx(pair.covariance_mV2[1], rel=EXACT)
    assert_allclose(np.sin(pair.phase_rad), 0.0, atol=1e-9)
    plain = Cell((Cylinder(0, 1, 1000.0, 2.0),), (Sphere(0, 4 * np.pi * 100.0),))
    want = covariance_mV2(plain, [0, 1], (2.0,), 20.0, 1e-3 * 0.08 / 0.01)[0, 1]
    assert pair.covariance_mV2[2] == pytest.approx(want, rel=IDENTITY)


def test_gamma_trains_and_ringing_kernels_keep_the_certificate() -> None:
    tree = arbor(3, 30)
    for kernel, train in (
        (EXPONENTIAL, SpikeTrain.gamma(3)),
        (Kernel.expression("exp(-t/3)*sin(t)"), SpikeTrain.poisson()),
    ):
        one = SynapticInput(
            name="a", where=Zone(), density_per_um=0.3, rate_Hz=40.0, current_pA=2.0, kernel=kernel, spike_train=train
        )
        cell = CableModel(tree, PLAIN, (one,))
        assert cell.pair("soma", "soma", np.zeros(1), NO_HZ).covariance_mV2[0] == pytest.approx(
            cell.fluctuations().at("soma").variance_mV2, rel=EXACT
        )
