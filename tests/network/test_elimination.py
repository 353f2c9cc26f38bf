"""The sweeps against dense inverses on random asymmetric trees, and where stiffness would ruin plain algebra."""

from __future__ import annotations

import mpmath as mp
import numpy as np
import pytest
from numpy.testing import assert_allclose

from cable.network.elimination import eliminate, impedances, solve, variances
from cable.network.plan import plan_elimination
from oracles.dense import impedance_and_covariance
from tolerances import ALGEBRA, ROUND_OFF


def random_parent(seed: int, n: int, span: int) -> np.ndarray:
    rng = np.random.default_rng(seed)
    return np.r_[-1, [rng.integers(max(0, i - span), i) for i in range(1, n)]].astype(np.int64)


SHAPES = [(1, 1), (2, 1), (3, 1), (3, 3), (40, 1), (60, 3), (300, 6), (120, 120), (1001, 0)]


@pytest.mark.parametrize(("n", "span"), SHAPES)
def test_against_dense_inverse(n: int, span: int) -> None:
    parent = random_parent(n, n, span) if span else np.r_[-1, np.zeros(n - 1, dtype=np.int64)]
    rng = np.random.default_rng(n + 1)
    frequencies = 3
    shunt = rng.uniform(0.1, 1, (n, frequencies)) + 1j * rng.uniform(0, 2, (n, frequencies))
    coupling = rng.uniform(0.5, 2, (n - 1, frequencies)) * np.exp(-1j * rng.uniform(0, 0.5, (n - 1, frequencies)))
    own, cross = rng.uniform(1, 2, (n, frequencies)), rng.uniform(-0.02, 0.2, (n - 1, frequencies))
    current = rng.normal(size=(n, frequencies)) + 1j * rng.normal(size=(n, frequencies))
    plan = plan_elimination(parent)
    factors = eliminate(plan, shunt, coupling)
    z = impedances(factors)
    spectra, voltages = variances(factors, z, own, cross), solve(factors, current)
    for k in range(frequencies):
        a, w = np.diag(shunt[:, k]).copy(), np.diag(own[:, k]).astype(complex)
        for i in range(1, n):
            j = parent[i]
            a[[i, j], [i, j]] += coupling[i - 1, k]
            a[[i, j], [j, i]] -= coupling[i - 1, k]
            w[[i, j], [j, i]] += cross[i - 1, k]
        dense_z, dense_p = (m[0] for m in impedance_and_covariance(a[None], w[None]))
        assert_allclose(z.point[plan.node, k], np.diag(dense_z), rtol=ALGEBRA)
        edges = np.arange(1, n)
        assert_allclose(z.edge[plan.edge, k], dense_z[edges, parent[1:]], rtol=ALGEBRA)
        assert_allclose(spectra[:, k], np.diag(dense_p).real, rtol=ALGEBRA)
        assert_allclose(voltages[:, k], dense_z @ current[:, k], rtol=ALGEBRA, atol=ALGEBRA)


def test_stiff_network_keeps_its_digits() -> None:
    """Couplings of 1e8 nS beside leaks of 1e-4 nS, against 60-digit algebra."""
    n = 12
    parent = random_parent(3, n, 3)
    rng = np.random.default_rng(4)
    shunt = 10.0 ** rng.uniform(-4, -2, (n, 1)) + 0j
    coupling = 10.0 ** rng.uniform(-2, 8, (n - 1, 1)) + 0j
    own = 10.0 ** rng.uniform(-2, 1, (n, 1))
    plan = plan_elimination(parent)
    factors = eliminate(plan, shunt, coupling)
    z = impedances(factors)
    spectra = variances(factors, z, own, np.zeros((n - 1, 1)))
    with mp.workdps(60):
        a = mp.diag([mp.mpf(float(v)) for v in shunt[:, 0].real])
        for i in range(1, n):
            j, c = int(parent[i]), mp.mpf(float(coupling[i - 1, 0].real))
            a[i, i] += c
            a[j, j] += c
            a[i, j] -= c
            a[j, i] -= c
        inverse = a**-1
        for i in range(n):
            assert abs(z.point[plan.node[i], 0] / inverse[i, i] - 1) < ROUND_OFF
            want = sum(inverse[i, k] ** 2 * mp.mpf(float(own[k, 0])) for k in range(n))
            assert abs(spectra[i, 0] / want - 1) < ROUND_OFF


def test_unbranched_chain_of_ten_thousand() -> None:
    """No recursion, a few rounds, and the far end of a long ladder against its continued fraction."""
    n = 10_000
    plan = plan_elimination(np.arange(-1, n - 1))
    assert len({step.nodes.start for step in plan.rounds}) <= 40
    shunt, coupling = np.full((n, 1), 0.01 + 0.02j), np.full((n - 1, 1), 3.0 + 0j)
    z = impedances(eliminate(plan, shunt, coupling))
    looking = shunt[0, 0]
    for _ in range(n - 1):
        looking = shunt[0, 0] + 1 / (1 / looking + 1 / coupling[0, 0])
    assert_allclose(z.point[plan.node[[0, n - 1]], 0], 1 / looking, rtol=ALGEBRA)


@pytest.mark.parametrize("span", [1, 2, 50])
def test_plan_uses_every_node_and_edge_once(span: int) -> None:
    n = 4000
    plan = plan_elimination(random_parent(9, n, span))
    assert sorted(plan.node) == list(range(n))
    used = [k for step in plan.rounds for part in (step.to_parent, step.to_child) for k in range(part.start, part.stop)]
    assert sorted(used) == list(range(plan.edges))
    assert sorted([*plan.edge, *(b for step in plan.rounds for b in step.bridge)]) == list(range(plan.edges))
