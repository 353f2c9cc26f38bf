"""The error of compartments and steps is computed: against the discrete Lyapunov equation of the recursion itself."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from numpy.testing import assert_allclose
from scipy.linalg import solve_discrete_lyapunov

from cable import CableModel, Kernel
from cable.simulation.discretisation import choose_grid, variances
from simulation.simulated_cells import INHIBITION, PLAIN, SPHERE, divided, stick
from tolerances import IDENTITY, REFINED


def by_lyapunov(cells, step: float, decay_ms: float) -> np.ndarray:
    """(n,) variances of the time-stepping recursion with exponential synapses, one Poisson number a compartment."""
    n = len(cells.parent)
    (population,) = cells.populations
    one = population.source
    mass = np.diag(cells.capacitance_pF) / (2 * step)
    inverse = np.linalg.inv(cells.matrix_nS.toarray() + 3 * mass)
    fade = np.exp(-step / decay_ms)
    area = step * np.exp(-step / 2 / decay_ms) / (1 - fade)
    kick = np.exp(-step / 2 / decay_ms) * one.kernel.area_ms / area
    force = np.diag(one.conductance_nS * (one.reversal_mV - cells.mean_mV))
    none, unit = np.zeros((n, n)), np.eye(n)
    # states: v, the voltage before, the synapses' states
    move = np.block(
        [
            [4 * inverse @ mass, -inverse @ mass, inverse @ force * fade],
            [unit, none, none],
            [none, none, fade * unit],
        ]
    )
    push = np.vstack([inverse @ force * kick, none, kick * unit])
    noise = push @ np.diag(one.rate_per_ms * population.number * step) @ push.T
    return np.diag(solve_discrete_lyapunov(move, noise))[:n]


@pytest.mark.parametrize("step", [0.05, 0.4])
def test_variance_in_steps(step: float) -> None:
    one = replace(INHIBITION, kernel=Kernel.exponential(3.0))
    point, cells = divided(stick(one), 3)
    nodes = list(range(0, len(cells.parent), 2))
    assert_allclose(variances(cells, point, nodes, step), by_lyapunov(cells, step, 3.0)[nodes], rtol=REFINED)


def test_variance_in_continuous_time_nears_the_exact_one_with_the_square() -> None:
    model = stick()
    exact = np.array([s.variance_mV2 for s in model.fluctuations().sites])
    apart = []
    for pieces in (8, 16):
        point, cells = divided(model, pieces)
        nodes = [point.layout.node_at(place) for place in model.site_places.values()]
        apart.append(np.abs(variances(cells, point, nodes, None) / exact - 1))
    assert np.all((apart[0] / apart[1] > 3.4) & (apart[0] / apart[1] < 4.6))


def test_one_compartment_is_exact_in_space_and_of_second_order_in_time() -> None:
    model = CableModel(SPHERE, PLAIN, (INHIBITION,))
    errors = []
    for step in (0.4, 0.2):
        grid = choose_grid(model, 1.0, step)
        assert abs(grid.space_error[0]) < REFINED
        errors.append(grid.time_error[0])
    assert errors[0] / errors[1] == pytest.approx(4.0, rel=0.05)


def test_the_grid_is_as_fine_as_wanted() -> None:
    model = stick()
    coarse, fine = choose_grid(model, 3e-2), choose_grid(model, 3e-4)
    assert coarse.error <= 3e-2 and fine.error <= 3e-4
    assert len(fine.cells.parent) > len(coarse.cells.parent) and fine.dt_ms <= coarse.dt_ms
    assert IDENTITY < fine.error  # no finer than need be
