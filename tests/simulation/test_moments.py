"""Batch means: against a process of known statistics, and against numpy on the same numbers."""

from __future__ import annotations

import numpy as np
import pytest
from numpy.testing import assert_allclose
from scipy import signal, stats

from cable.simulation.moments import Moments
from tolerances import ALGEBRA

FADE, BATCH, BATCHES = 0.95, 4000, 60


def autoregressive(rng: np.random.Generator, count: int) -> np.ndarray:
    """(count,) a Gaussian process with correlation 0.95 a step and SD 1."""
    noise = rng.normal(size=count) * np.sqrt(1 - FADE**2)
    noise[0] = rng.normal()
    return signal.lfilter([1.0], [1.0, -FADE], noise)


def moments(x: np.ndarray) -> Moments:
    return Moments.joined([Moments.of(part, BATCH * 0.1) for part in np.split(x, len(x) // BATCH)])


def test_estimates_are_those_of_numpy() -> None:
    rng = np.random.default_rng(0)
    a = autoregressive(rng, BATCH * BATCHES)
    x = np.column_stack([3 + 2 * a, -1 + np.exp(0.5 * (0.6 * a + 0.8 * autoregressive(rng, len(a))))])
    found = moments(x)
    for k in range(2):
        assert_allclose(found.mean(k).value, x[:, k].mean(), rtol=ALGEBRA)
        # unbiased by the square of the mean's error
        assert_allclose(found.sd(k).value ** 2, x[:, k].var() + found.mean(k).se ** 2, rtol=ALGEBRA)
        assert_allclose(found.skewness(k).value, stats.skew(x[:, k]), rtol=ALGEBRA, atol=ALGEBRA)
    assert_allclose(found.correlation(1).value, np.corrcoef(x.T)[0, 1], rtol=ALGEBRA)
    assert found.batches == BATCHES and found.skewness(1).value > 1


def test_standard_errors_are_those_that_repetition_shows() -> None:
    """Mean: SD·√(2τ/T); SD: √(τ/2T) with the correlation time of the square, here of an AR(1) process (Bartlett)."""
    count, time = BATCH * BATCHES, (1 + FADE) / (1 - FADE) / 2
    square = (1 + FADE**2) / (1 - FADE**2) / 2
    found = moments(autoregressive(np.random.default_rng(7), count)[:, None])
    assert found.mean(0).se == pytest.approx(np.sqrt(2 * time / count), rel=0.25)
    assert found.sd(0).se == pytest.approx(np.sqrt(square / count), rel=0.25)
    assert abs(found.mean(0).value) < 4 * found.mean(0).se
    assert abs(found.sd(0).value - 1) < 4 * found.sd(0).se
    at = found.correlation_time_ms(0)
    assert abs(at.value - 0.1 * time) < 4 * at.se and at.se / at.value == pytest.approx(np.sqrt(2 / 59))


def test_what_stands_still_has_no_skewness() -> None:
    still = moments(np.zeros((BATCH * 3, 1)))
    assert still.sd(0).value == 0.0 and np.isnan(still.skewness(0).value)
    assert np.isnan(still.correlation(0).value) and np.isnan(still.correlation_time_ms(0).value)
