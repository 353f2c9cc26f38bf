"""Waves convolved with the correlation of a train that has a dead time, against Gauss points in time."""

from __future__ import annotations

from itertools import pairwise
from math import factorial

import numpy as np
import pytest
from numpy.testing import assert_allclose

from cable.theory.dead_time import DeadTime
from tolerances import ALGEBRA

AT, WEIGHT = np.polynomial.legendre.leggauss(24)
FREQUENCY = np.array([0.001, 0.03, 0.2, 1.0, 30.0]) * np.exp(0.25j * np.pi)


def excess(train: DeadTime, u: np.ndarray) -> np.ndarray:
    """Rate of spikes at u after one, less the mean rate: the n-th spike comes after n dead and n free times."""
    h, dead = train.hazard, train.dead_time_ms
    total = np.full_like(u, -train.rate)
    for n in range(1, int(u.max() / dead) + 1):
        y = np.maximum(u - n * dead, 0.0)
        total += np.where(u > n * dead, h * np.exp(-h * y) * (h * y) ** (n - 1) / factorial(n - 1), 0.0)
    return total


def integral(train: DeadTime, start: float, end: float, lag: float, sign: float) -> np.ndarray:
    """∫ excess(u) e^{sign·iω(u - lag)} du with knots at the dead times, finely divided towards both ends."""
    dead = train.dead_time_ms
    inner = [k * dead for k in range(int(start / dead) + 1, int(end / dead) + 1)]
    knots = np.unique([start, *(k for k in inner if start < k < end), end])
    graded = (1 - np.cos(np.pi * np.arange(17) / 16)) / 2
    edges = np.unique(np.concatenate([a + (b - a) * graded for a, b in pairwise(knots)]))
    u = (edges[:-1, None] + np.diff(edges)[:, None] * (AT + 1) / 2).ravel()
    weight = (np.diff(edges)[:, None] / 2 * WEIGHT).ravel() * excess(train, u)
    return np.exp(sign * 1j * FREQUENCY[:, None] * (u - lag)) @ weight


@pytest.mark.parametrize(("rate_Hz", "dead_ms"), [(1.0, 3.0), (60.0, 5.0), (140.0, 5.0), (20.0, 20.0)])
@pytest.mark.parametrize("dead_times", [0.0, 0.01, 0.5, 1.0, 2.2, 7.6, 13.3])
def test_waves_are_the_convolution(rate_Hz: float, dead_ms: float, dead_times: float) -> None:
    train, lag = DeadTime(rate_Hz, dead_ms), dead_times * dead_ms
    end = lag + 60 * dead_ms  # beyond which all that the train remembers is below the tolerance
    later = np.exp(1j * FREQUENCY * lag) * (1 + integral(train, 0.0, 60 * dead_ms, 0.0, 1.0))
    earlier = integral(train, 0.0, lag, lag, -1.0) if lag else 0.0
    ahead, behind = train.waves(np.array([lag]), FREQUENCY)
    assert_allclose(ahead[0], later + earlier, atol=ALGEBRA, rtol=0)
    assert_allclose(behind[0], integral(train, lag, end, lag, 1.0), atol=ALGEBRA, rtol=0)


def test_poles_are_those_of_the_interval() -> None:
    train = DeadTime(100.0, 5.0)
    p, _ = train.poles
    assert_allclose(train.hazard * np.exp(p * 5.0) / (train.hazard - p), 1.0, rtol=ALGEBRA)
    assert p.real.min() > 0


def test_almost_no_free_time_is_refused() -> None:
    with pytest.raises(ValueError, match="use a shorter dead time"):
        DeadTime(99.9, 10.0)
    with pytest.raises(ValueError, match="leaves almost no chance at 200 Hz"):
        DeadTime(200.0, 10.0)
