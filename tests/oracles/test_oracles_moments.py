"""The moment oracle against published values, a closed form, and itself at another degree."""

from __future__ import annotations

import numpy as np
import pytest

from oracles.conductance_moments import Place, mean_and_covariance
from tolerances import EXACT, NEXT_ORDER, REFINED, TYPED

IN_VIVO = [Place(0, 12.1 / 1.2 / 2.728, 1.2, 1 / 2.728, 80.0), Place(0, 57.3 / 0.6 / 10.49, 0.6, 1 / 10.49, 5.0)]


def test_full_nonlinear_simulation_of_the_in_vivo_like_point_is_met() -> None:
    """40 cells simulated for 60 s: mean -65.252 (s.e. 0.004), SD 1.369 ± 0.002 mV (a recorded Monte Carlo run)."""
    mean, covariance = mean_and_covariance([346.36], [[15.5862]], IN_VIVO, 8)
    assert abs(mean[0] - 80 - -65.252) < 2 * 0.004
    assert abs(np.sqrt(covariance[0, 0]) - 1.369) < 0.002


def test_small_and_many_events_give_the_effective_time_constant_approximation() -> None:
    """SD 1.37066238059 mV (Richardson 2004, Phys Rev E 69:051918, from memory), to which the error falls linearly."""
    errors = []
    for scale in (1e-3, 1e-4):
        small = [Place(0, p.rate_per_ms / scale, p.jump_nS * scale, p.decay_per_ms, p.reversal_mV) for p in IN_VIVO]
        _, covariance = mean_and_covariance([346.36], [[15.5862]], small, 6)
        errors.append(np.sqrt(covariance[0, 0] / scale) / 1.37066238059 - 1)
    assert errors[0] == pytest.approx(10 * errors[1], rel=NEXT_ORDER)
    assert abs(errors[1] - errors[0] / 10) < TYPED


def test_the_degree_has_converged() -> None:
    answers = [mean_and_covariance([346.36], [[15.5862]], IN_VIVO, degree)[1][0, 0] for degree in (8, 10)]
    assert answers[0] == pytest.approx(answers[1], rel=EXACT)


def test_two_compartments_in_contact_are_one() -> None:
    one = mean_and_covariance([346.36], [[15.5862]], IN_VIVO, 6)
    far = [Place(k, p.rate_per_ms, p.jump_nS, p.decay_per_ms, p.reversal_mV) for k, p in enumerate(IN_VIVO)]
    joined = [[10.0 + 1e9, -1e9], [-1e9, 5.5862 + 1e9]]
    two = mean_and_covariance([200.0, 146.36], joined, far, 6)
    assert two[0] == pytest.approx(np.repeat(one[0], 2), rel=REFINED)
    assert two[1] == pytest.approx(np.full((2, 2), one[1][0, 0]), rel=REFINED)
