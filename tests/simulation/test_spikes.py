"""Spikes in steps: rates, covariances between compartments and populations, starts in equilibrium."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from numpy.testing import assert_allclose

from cable import Shared, SpikeTrain
from cable.simulation.spikes import (
    NoSuchTrains,
    PopulationSpikes,
    RenewalSpikes,
    common_trains,
    first_spikes,
    intervals,
)
from simulation.simulated_cells import EXCITATION, INHIBITION, divided, stick

DT, STEPS = 0.5, 40_000


def population(one, numbers):
    from cable.simulation.compartments import Population

    return Population(one, np.array(numbers, dtype=float))


def counts(spikes, volleys, rng, n: int) -> np.ndarray:
    """(STEPS, n) sizes that reach each compartment in each step."""
    found = spikes.events(STEPS, DT, volleys, rng)
    table = np.zeros((STEPS, n))
    step = np.repeat(np.arange(STEPS), np.diff(found.first))
    np.add.at(table, (step, found.node), found.size)
    return table + found.even[:, None] * spikes.number


def check_covariance(table: np.ndarray, want: np.ndarray) -> None:
    """Within 4.5 standard errors, from the scatter of the products: steps are independent."""
    apart = table - table.mean(axis=0)
    products = apart[:, :, None] * apart[:, None, :]
    se = products.std(axis=0) / np.sqrt(len(table))
    assert np.all(np.abs(products.mean(axis=0) - want) <= 4.5 * se), (products.mean(axis=0), want, se)


def check_mean(table: np.ndarray, want: np.ndarray) -> None:
    assert np.all(np.abs(table.mean(axis=0) - want) <= 4.5 * table.std(axis=0) / np.sqrt(len(table)))


@pytest.mark.parametrize("numbers", [(3, 0, 5), (2.25, 0.0, 0.4)])
@pytest.mark.parametrize("cv", [0.0, 0.8])
def test_correlated_populations(numbers, cv: float) -> None:
    c = 0.2
    one = replace(EXCITATION, rate_Hz=50.0, correlation=c, size_cv=cv)
    point, _ = divided(stick(one), 1)
    (common,) = common_trains(point.sources)
    assert common.rate_per_ms * common.copied[0] == pytest.approx(one.rate_per_ms)
    rng = np.random.default_rng(3)
    spikes = PopulationSpikes(population(one, numbers), {0: c}, {0: common.rate_per_ms})
    volleys = {0: np.sort(rng.integers(0, STEPS, rng.poisson(common.rate_per_ms * DT * STEPS)))}
    table = counts(spikes, volleys, rng, 3)
    number, mean = np.array(numbers), one.rate_per_ms * DT
    check_mean(table, mean * number)
    want = mean * (np.diag(number) * (1 - c + cv**2) + c * np.outer(number, number))
    check_covariance(table, want)


def test_independent_synapses_are_one_poisson_train_a_compartment() -> None:
    one = replace(EXCITATION, rate_Hz=30.0)
    table = counts(PopulationSpikes(population(one, (1.5, 0.0, 4.0)), {}, {}), {}, np.random.default_rng(1), 3)
    want = one.rate_per_ms * DT * np.array([1.5, 0.0, 4.0])
    check_mean(table, want)
    check_covariance(table, np.diag(want))


def test_two_populations_share_what_they_are_told_to() -> None:
    a = replace(EXCITATION, rate_Hz=40.0, correlation=0.3, shares=(Shared("inhibition", 0.15),))
    b = replace(INHIBITION, rate_Hz=60.0, correlation=0.2)
    point, _ = divided(stick(a, b), 1)
    commons = common_trains(point.sources)
    rng = np.random.default_rng(8)
    rates = {k: one.rate_per_ms for k, one in enumerate(commons)}
    volleys = {k: np.sort(rng.integers(0, STEPS, rng.poisson(rate * DT * STEPS))) for k, rate in rates.items()}
    tables = []
    for index, (one, numbers) in enumerate(((a, (4, 1)), (b, (2.5, 3.25)))):
        copied = {k: c.copied[index] for k, c in enumerate(commons) if index in c.copied}
        tables.append(counts(PopulationSpikes(population(one, numbers), copied, rates), volleys, rng, 2))
    number = np.array([4, 1, 2.5, 3.25])
    rate = DT * np.repeat([a.rate_per_ms, b.rate_per_ms], 2)
    correlation = np.array([[0.3, 0.15], [0.15, 0.2]]).repeat(2, axis=0).repeat(2, axis=1)
    own = np.diag(rate * number * np.array([0.7, 0.7, 0.8, 0.8]))
    want = own + correlation * np.sqrt(np.outer(rate, rate)) * np.outer(number, number)
    check_covariance(np.hstack(tables), want)
    check_mean(np.hstack(tables), rate * number)


@pytest.mark.parametrize("train", [SpikeTrain.gamma(3), SpikeTrain.dead_time(12.0)])
def test_regular_trains_keep_their_order_and_their_rate(train: SpikeTrain) -> None:
    """In windows much longer than an interval the variance of counts is CV² times the mean (Cox 1962; from memory)."""
    one = replace(EXCITATION, rate_Hz=50.0, spike_train=train)
    rng = np.random.default_rng(4)
    spikes = RenewalSpikes(population(one, (30.5, 0.0, 60.25)), rng)
    table = counts(spikes, {}, rng, 3)
    assert_allclose(table.mean(axis=0), one.rate_per_ms * DT * np.array([30.5, 0, 60.25]), rtol=0.02)
    long = table.sum(axis=1).reshape(-1, 2000).sum(axis=1)
    cv2 = 1 / 3 if train.process == "gamma" else (1 - one.rate_per_ms * 12.0) ** 2
    assert long.var(ddof=1) / long.mean() == pytest.approx(cv2, rel=5 * np.sqrt(2 / len(long)))
    # from the first step on: no synchronous start
    first = table[:200].sum()
    assert first == pytest.approx(one.rate_per_ms * DT * 200 * 90.75, rel=0.15)


@pytest.mark.parametrize("train", [SpikeTrain.gamma(4), SpikeTrain.dead_time(6.0)])
def test_the_first_spike_is_that_of_a_train_that_has_run_for_ever(train: SpikeTrain) -> None:
    """Its mean is (1 + CV²)/(2·rate) (Cox 1962; from memory)."""
    one, rng = replace(EXCITATION, rate_Hz=80.0, spike_train=train), np.random.default_rng(2)
    drawn = intervals(train, 80.0, 200_000, rng)
    assert drawn.mean() == pytest.approx(12.5, rel=0.01)
    cv2 = 0.25 if train.process == "gamma" else (1 - 0.48) ** 2
    assert first_spikes(one, 200_000, rng).mean() == pytest.approx((1 + cv2) * 12.5 / 2, rel=0.02)
    assert np.isinf(first_spikes(replace(one, rate_Hz=0.0), 3, rng)).all()


def test_what_cannot_be_made_is_refused() -> None:
    regular = replace(EXCITATION, correlation=0.1, spike_train=SpikeTrain.gamma(2))
    with pytest.raises(NoSuchTrains, match="correlated gamma trains cannot be simulated"):
        common_trains(divided(stick(regular), 1)[0].sources)
    rough = replace(EXCITATION, correlation=1.0, size_cv=0.5)
    with pytest.raises(NoSuchTrains, match="size_cv with a correlation of 1"):
        PopulationSpikes(population(rough, (0.5, 1.5)), {0: 1.0}, {0: 1.0})
