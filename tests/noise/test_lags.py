"""Covariance against lag: closed forms in space and lag, trains with a dead time, the lag of the peak."""

from __future__ import annotations

from dataclasses import replace
from itertools import pairwise
from math import factorial

import numpy as np
import pytest
from numpy.testing import assert_allclose
from scipy.integrate import quad

from cable import CableModel, Kernel, Membrane, SpikeTrain, SynapticInput
from cable.noise.covariance import covariances
from cable.noise.cross import cross_spectra
from morphology import CellTree, Site, Zone
from noise.cells import EXCITATION, INHIBITION, arbor, model
from oracles import worked
from oracles.infinite_cable import (
    Cable,
    distributed_covariance_mV2,
    distributed_lagged_covariance_mV2,
    white_covariance_infinite,
)
from tolerances import EXACT, IDENTITY

PLAIN = Membrane(axial_resistivity_ohm_cm=150, capacitance_uF_cm2=1, resistance_ohm_cm2=20000, rest_mV=0)
NO_HZ = np.ones(1)
SPHERE = "1 1 0 0 0 10 -1\n"
RATE_HZ, DEAD_MS = 60.0, 8.0


def sphere(rate_Hz: float = 5.0, train: SpikeTrain | None = None) -> CableModel:
    """The worked sphere: 200 synapses, exponential events of 10 fC and 2 ms."""
    one = SynapticInput(
        name="a",
        rate_Hz=rate_Hz,
        kernel=Kernel.exponential(2.0),
        where=Zone(),
        count=200,
        spread="area",
        current_pA=5,
        spike_train=train or SpikeTrain.poisson(),
    )
    return CableModel(CellTree.from_text(SPHERE), PLAIN, (one,))


def long_cable(decay_ms: float, distance_um: float) -> CableModel:
    """24 length constants of cable with 0.5 synapses/µm of 20 fC, and two sites about its middle."""
    one = SynapticInput(
        name="a",
        rate_Hz=1,
        kernel=Kernel.exponential(decay_ms),
        where=Zone(),
        density_per_um=0.5,
        current_pA=20 / decay_ms,
    )
    sites = Site("x", path_um=10_000.0), Site("y", path_um=10_000.0 + distance_um)
    return CableModel(CellTree.from_text("1 3 0 0 0 1 -1\n2 3 20000 0 0 1 1\n"), PLAIN, (one,), sites)


def test_sphere_at_a_lag() -> None:
    own = sphere().pair("soma", "soma", np.array([0.0, 10.0, -10.0]), NO_HZ)
    want = float(worked.sphere_current()["rho_10ms"])
    assert_allclose(own.covariance_mV2[1:] / own.covariance_mV2[0], want, rtol=EXACT)
    assert own.peak_lag_ms == 0.0


@pytest.mark.parametrize("distance_um", [0.0, 600.0, 1500.0])
def test_exponential_events_on_a_long_cable_in_space_and_lag(distance_um: float) -> None:
    """Sum over the cable's modes (derived, verified by two computations); its lag 0 is the known closed form."""
    lags = np.array([-5.0, 0.5, 5.0, 40.0, 200.0])
    got = long_cable(2.0, distance_um).pair("x", "y", lags, NO_HZ).covariance_mV2
    constants = Cable(), 0.5, 1e-3, 20.0, 2.0, distance_um
    at_once = distributed_covariance_mV2(*constants)
    assert distributed_lagged_covariance_mV2(*constants, 0.0) == pytest.approx(at_once, rel=IDENTITY)
    variance = distributed_covariance_mV2(*constants[:-1])
    want = [distributed_lagged_covariance_mV2(*constants, lag) for lag in lags]
    assert_allclose(got, want, atol=IDENTITY * variance, rtol=0)


def test_white_noise_on_a_long_cable_in_space_and_lag() -> None:
    """The limit of brief events, whose error falls with the square of their duration (Wan & Tuckwell 1979, Biol
    Cybern 33:39, setting from memory; covariance derived, verified by two computations)."""
    cable = Cable()
    for X, T in ((1.0, 0.5), (0.5, 2.0), (0.0, 1.0)):
        lag = np.array([T * cable.tau_m_ms])
        longer, brief = (
            long_cable(decay, X * cable.lambda_um).pair("x", "y", lag, NO_HZ, 1e-11).covariance_mV2[0]
            for decay in (0.02, 0.01)
        )
        scale = 4 * distributed_covariance_mV2(cable, 0.5, 1e-3, 20.0, 0.0)
        assert (4 * brief - longer) / 3 == pytest.approx(scale * white_covariance_infinite(X, T), rel=IDENTITY)


def excess_rate(u: np.ndarray, rate: float) -> np.ndarray:
    """Rate of spikes at u after one, less the mean rate, as the sum over intervals of a dead time and a free time."""
    hazard = rate / (1 - rate * DEAD_MS)
    total = np.full_like(u, -rate)
    for n in range(1, 100):
        y = np.maximum(u - n * DEAD_MS, 0.0)
        term = hazard * np.exp(-hazard * y) * (hazard * y) ** (n - 1) / factorial(n - 1)
        total += np.where(u > n * DEAD_MS, term, 0.0)
    return total


@pytest.mark.parametrize("lag", [0.0, 0.3, 5.0, DEAD_MS, 13.0, 41.0, 200.0])
def test_dead_time_on_a_sphere_at_every_lag(lag: float) -> None:
    """The closed covariance of a Poisson-driven RC cell, convolved with the train's own correlation."""
    tau, decay, rate = 20.0, 2.0, 1e-3 * RATE_HZ
    front = 200 * rate * (10.0 / (0.2 * np.pi)) ** 2 / (2 * (tau**2 - decay**2))

    def poisson(t: float) -> float:
        return front * (tau * np.exp(-abs(t) / tau) - decay * np.exp(-abs(t) / decay))

    def integrand(u: float) -> float:
        return float(excess_rate(np.array([u]), rate)[0]) * (poisson(lag - u) + poisson(lag + u))

    knots = sorted({*(DEAD_MS * k for k in range(22)), *((lag,) if lag < 168 else ())})
    tail = sum(quad(integrand, a, b, epsabs=1e-12)[0] for a, b in pairwise(knots))
    cell = sphere(RATE_HZ, SpikeTrain.dead_time(DEAD_MS))
    got = cell.pair("soma", "soma", np.array([lag, -lag]), NO_HZ).covariance_mV2
    variance = cell.fluctuations().variance_mV2[0]
    assert_allclose(got, poisson(lag) + tail, atol=IDENTITY * variance, rtol=0)
    if lag == 0.0:
        assert_allclose(got, variance, rtol=EXACT)
        assert got[0] < 0.5 * poisson(0.0)  # the dead time does matter


def test_dead_time_on_an_uneven_tree_in_both_directions() -> None:
    """Against Gauss points along the real frequency axis, which know nothing of waves and poles."""
    tree = arbor(11, 30)
    driven = replace(
        EXCITATION,
        kernel=Kernel.two_exponential(1.0, 5.0),
        rate_Hz=RATE_HZ,
        conductance_nS=0.02,
        correlation=0.1,
        spike_train=SpikeTrain.dead_time(DEAD_MS),
    )
    cell = model(tree, driven, sites=(Site("a", swc_id=int(tree.ids[29])),))
    lags = np.array([-21.0, -8.0, -1.0, 0.0, 3.0, 8.0, 21.0])
    found = covariances(cell, ("a", "soma"), lags)
    at, weight = np.polynomial.legendre.leggauss(16)
    edges = np.r_[np.linspace(0, 60, 401), np.arange(60.5, 150, 0.5)]
    omega = (edges[:-1, None] + np.diff(edges)[:, None] * (at + 1) / 2).ravel()
    weights = (np.diff(edges)[:, None] / 2 * weight).ravel()
    nodes = [cell.node_of("a"), cell.node_of("soma")]
    blocks = [cross_spectra(cell.refined.point, nodes, 1j * omega[k : k + 64])[0] for k in range(0, len(omega), 64)]
    spectrum = np.concatenate(blocks, axis=-1) * weights / np.pi
    want = (spectrum.swapaxes(0, 1) @ np.exp(1j * omega[:, None] * lags)).real
    size = np.sqrt(want[0, 0, 3] * want[1, 1, 3])
    assert_allclose(found.covariance_mV2, want, atol=IDENTITY * size, rtol=0)
    assert abs(want[0, 1, 1] / want[0, 1, 5] - 1) > 1e-2  # the pair has a direction


def test_variances_of_ringing_trains_are_their_covariances_at_lag_0() -> None:
    """Smoothing at real frequencies against waves on the bent path, which share no formula of the train."""
    tree = arbor(11, 40)
    one = replace(EXCITATION, rate_Hz=40.0, conductance_nS=0.02, spike_train=SpikeTrain.dead_time(22.0), size_cv=0.3)
    two = replace(INHIBITION, correlation=0.1, rate_Hz=30.0, spike_train=SpikeTrain.dead_time(6.0))
    cell = model(tree, one, two, sites=(Site("a", swc_id=int(tree.ids[29])),))
    found = covariances(cell, ("a", "soma"), np.zeros(1))
    field = cell.fluctuations()
    for k, site in enumerate(("a", "soma")):
        got = field.at(site).variance_by_input_mV2
        assert_allclose(list(got.values()), found.at_zero_mV2[:, k, k], rtol=EXACT)
        slow = cell.spectrum(site, np.zeros(1)).psd_mV2_per_Hz[0]  # one-sided: 4·(two-sided per rad/ms)·1e-3
        assert_allclose(field.at(site).correlation_time_ms, slow / 4e-3 / field.at(site).variance_mV2, rtol=EXACT)


def test_dead_time_of_nearly_the_whole_interval_is_refused_with_a_way_out() -> None:
    """Before anything is computed: e to the power of dead time times hazard would overflow, in variances too."""
    with pytest.raises(ValueError, match="use a shorter dead time"):
        sphere(99.9, SpikeTrain.dead_time(10.0))
    sphere(99.5, SpikeTrain.dead_time(10.0)).pair("soma", "soma", np.zeros(1), NO_HZ)


def test_peak_lies_between_the_lags_asked_for() -> None:
    tree = arbor(11, 70)
    sites = Site("a", swc_id=int(tree.ids[50])), Site("b", swc_id=int(tree.ids[69]))
    cell = model(tree, EXCITATION, INHIBITION, sites=sites)
    coarse = cell.pair("a", "b", np.linspace(-100, 100, 21), NO_HZ)
    near = np.linspace(coarse.peak_lag_ms - 0.02, coarse.peak_lag_ms + 0.02, 401)
    height = cell.pair("a", "b", near, NO_HZ, 1e-12).covariance_mV2
    assert abs(near[np.argmax(height)] - coarse.peak_lag_ms) < 2e-4
    assert coarse.peak_lag_ms != 0.0
    assert cell.pair("b", "a", np.linspace(-100, 100, 21), NO_HZ).peak_lag_ms == pytest.approx(
        -coarse.peak_lag_ms, abs=2e-4
    )


def test_no_input_has_no_covariance() -> None:
    cell = CableModel(CellTree.from_text(SPHERE), PLAIN)
    found = cell.pair("soma", "soma", np.array([0.0, 1.0]), NO_HZ)
    assert found.covariance_mV2.tolist() == [0.0, 0.0] and np.isnan(found.correlation)
