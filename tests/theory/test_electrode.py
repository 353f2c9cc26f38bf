"""Filters against scipy's own response and against their definitions; the pipette against a nodal solve."""

from __future__ import annotations

import math

import numpy as np
import pytest
from numpy.polynomial.legendre import leggauss
from scipy import signal

from cable.network.loads import Load
from cable.theory.electrode import Electrode
from cable.theory.filters import LowPass, high_pass, kept_of_trend, removed_by_trend
from tolerances import ALGEBRA, ROUND_OFF

HZ = 2e-3 * math.pi  # rad/ms in 1 Hz
FREQUENCY_HZ = np.array([0.0, 0.3, 40.0, 700.0, 1000.0, 5300.0, 8e4])


@pytest.mark.parametrize("family", ["bessel", "butterworth"])
@pytest.mark.parametrize("order", [1, 2, 4, 8])
def test_low_pass_is_scipys_analog_filter(family: str, order: int) -> None:
    if family == "bessel":
        b, a = signal.bessel(order, 2 * math.pi * 1000.0, analog=True, norm="mag")
    else:
        b, a = signal.butter(order, 2 * math.pi * 1000.0, analog=True)
    _, want = signal.freqs(b, a, 2 * math.pi * FREQUENCY_HZ)
    found = LowPass(family, order, 1000.0).response(HZ * FREQUENCY_HZ)
    assert np.allclose(found, want, rtol=ALGEBRA, atol=0)
    assert abs(found[4]) ** 2 == pytest.approx(0.5, rel=ALGEBRA)
    if family == "butterworth":
        assert np.allclose(np.abs(found) ** 2, 1 / (1 + (FREQUENCY_HZ / 1000) ** (2 * order)), rtol=ALGEBRA, atol=0)


def test_low_pass_poles_are_those_of_its_response() -> None:
    one = LowPass("bessel", 5, 300.0)
    omega = HZ * FREQUENCY_HZ
    product = np.prod([1 / (1 + 1j * omega / p) for p in one.poles_per_ms], axis=0)
    assert np.allclose(one.response(omega), product, rtol=ROUND_OFF * 10, atol=0)
    assert all(p.real > 0 for p in one.poles_per_ms)


def test_far_beyond_its_corner_a_filter_lets_nothing_pass() -> None:
    assert np.abs(LowPass("butterworth", 12, 1.0).response(np.array([1e60]))) < 1e-200


def test_high_pass_is_a_resistor_and_a_capacitor() -> None:
    f = FREQUENCY_HZ[1:]
    assert np.allclose(high_pass(HZ * f, 0.5), 1 / (1 - 0.5j / f), rtol=ALGEBRA, atol=0)
    assert high_pass(np.zeros(1), 0.5) == 0


@pytest.mark.parametrize("trend", ["mean", "line"])
@pytest.mark.parametrize("x", [1e-3, 0.2, 0.9, 1.1, 2.0, 7.3, 40.0])
def test_trend_is_what_least_squares_take_off_a_wave(trend: str, x: float) -> None:
    """A wave e^{iωt} over one window of W = 2, so that x = ω: what a fit leaves of its mean square."""
    t, w = leggauss(200)
    wave = np.exp(1j * x * t)
    shapes = np.stack([np.ones_like(t), t] if trend == "line" else [np.ones_like(t)])
    weights = np.linalg.solve((shapes * w) @ shapes.T, (shapes * w) @ wave)
    left = np.abs(wave - weights @ shapes) ** 2 @ w / 2
    assert kept_of_trend(np.array([x]), trend)[0] == pytest.approx(left, rel=1e-9, abs=1e-15)
    assert removed_by_trend(np.array([x]), trend)[0] == pytest.approx(1 - left, rel=1e-9)


def test_slow_trends_vanish_by_their_power() -> None:
    x = np.array([1e-5])
    assert kept_of_trend(x, "mean")[0] == pytest.approx(1e-10 / 3, rel=1e-9)
    assert kept_of_trend(x, "line")[0] == pytest.approx(1e-20 / 45, rel=1e-9)


def test_pipette_is_two_nodes() -> None:
    """Site and amplifier input as the two nodes of a dense solve."""
    one = Electrode(site="soma", series_resistance_MOhm=30.0, pipette_capacitance_pF=7.0)
    cell_nS = 12.0
    for f in FREQUENCY_HZ:
        s = 1j * HZ * f
        axial = 1 / 0.030
        nodal = np.array([[cell_nS + s * 40 + axial, -axial], [-axial, axial + 7.0 * s]])
        site, amplifier = np.linalg.solve(nodal, [1.0, 0.0])
        load = Load(0, one.resistance_GOhm, one.pipette_capacitance_pF).admittance_nS(np.array([s]))[0]
        assert 1 / (cell_nS + s * 40 + load) == pytest.approx(site, rel=ALGEBRA)
        assert one.gain(np.array([HZ * f]))[0] == pytest.approx(amplifier / site, rel=ALGEBRA)


def test_pipette_is_a_filter_of_its_own_time_constant() -> None:
    one = Electrode(site="soma", series_resistance_MOhm=20.0, pipette_capacitance_pF=5.0)
    assert one.time_constant_ms == pytest.approx(0.1)
    assert abs(one.gain(np.array([10.0]))[0]) ** 2 == pytest.approx(0.5)
    plain = Electrode(site="soma", series_resistance_MOhm=20.0)
    assert np.array_equal(plain.gain(np.array([0.0, 1e5])), [1, 1])
    assert plain.poles_per_ms == ()


def test_gain_is_the_product_of_its_parts() -> None:
    low = LowPass("bessel", 4, 2000.0)
    one = Electrode(
        site="soma", series_resistance_MOhm=20.0, pipette_capacitance_pF=5.0, low_pass=low, high_pass_Hz=1.0
    )
    omega = HZ * FREQUENCY_HZ
    want = low.response(omega) * high_pass(omega, 1.0) / (1 + 0.1j * omega)
    assert np.allclose(one.gain(omega), want, rtol=ROUND_OFF * 10, atol=0)
    assert len(one.poles_per_ms) == 6
    assert not one.keeps_mean


def test_what_loads_the_cell_at_rest() -> None:
    leaky = Electrode(site="soma", seal_GOhm=4.0)
    assert leaky.steady_load_nS == pytest.approx(0.25)
    assert leaky.steady_current_pA(-70.0) == pytest.approx(17.5)
    clamp = Electrode(
        site="soma", mode="voltage clamp", holding_mV=-60.0, series_resistance_MOhm=10.0, compensation=0.75
    )
    assert clamp.resistance_GOhm == pytest.approx(0.0025)
    assert clamp.steady_load_nS == pytest.approx(400.0)
    assert clamp.steady_current_pA(-70.0) == pytest.approx(4000.0)
    assert (leaky.unit, clamp.unit) == ("mV", "pA")


CLAMP = {"mode": "voltage clamp", "holding_mV": -70.0}


@pytest.mark.parametrize(
    ("values", "said"),
    [
        ({"mode": "dynamic clamp"}, 'mode: found \'dynamic clamp\', expected "current clamp" or "voltage clamp"'),
        (
            {"series_resistance_MOhm": -1.0},
            "series_resistance_MOhm: expected a finite number of at least 0, found -1.0",
        ),
        ({"series_resistance_MOhm": math.inf}, "series_resistance_MOhm: expected a finite number of at least 0"),
        ({"pipette_capacitance_pF": -3.0}, "pipette_capacitance_pF: expected a finite number of at least 0"),
        ({"seal_GOhm": 0.0}, "seal_GOhm: expected a finite number above 0"),
        ({"high_pass_Hz": -1.0}, "high_pass_Hz: expected a finite number above 0"),
        ({"window_s": 0.0}, "window_s: expected a finite number above 0"),
        ({"bridge_balance": 1.2}, "bridge_balance: expected a share from 0 to 1, found 1.2"),
        ({**CLAMP, "compensation": math.nan}, "compensation: expected a share from 0 to 1, found nan"),
        ({"holding_mV": -70.0}, "holding_mV: means nothing in current clamp, where nothing is held; take it out"),
        ({"compensation": 0.5}, "compensation: means nothing in current clamp, where the bridge does it"),
        ({**CLAMP, "pipette_capacitance_pF": 5.0}, "means nothing in voltage clamp, where the amplifier charges it"),
        ({**CLAMP, "bridge_balance": 0.5}, "bridge_balance: means nothing in voltage clamp, where there is no bridge"),
        ({"mode": "voltage clamp"}, "holding_mV: found nothing, expected the potential that is held, mV; add it"),
        ({**CLAMP, "holding_mV": math.nan}, "holding_mV: found nan, expected the potential that is held"),
        ({"trend": "parabola", "window_s": 1.0}, 'trend: found \'parabola\', expected "mean" or "line"'),
        ({"trend": "line"}, "trend: goes with window_s, found it alone"),
    ],
)
def test_bad_electrodes(values: dict, said: str) -> None:
    with pytest.raises(ValueError) as caught:
        Electrode(site="soma", **values)
    assert said in str(caught.value)


@pytest.mark.parametrize(
    ("family", "order", "corner", "said"),
    [
        ("chebyshev", 4, 1e3, 'family: found \'chebyshev\', expected "bessel" or "butterworth"'),
        ("bessel", 0, 1e3, "order: found 0, expected a whole number of poles, 1 to 12"),
        ("bessel", 2.5, 1e3, "order: found 2.5"),
        ("bessel", True, 1e3, "order: found True"),
        ("bessel", 4, -5.0, "corner_Hz: expected a finite number above 0, found -5.0"),
        ("bessel", 4, 3e6, "corner_Hz: found 3e+06, expected Hz and at most 1e+06"),
    ],
)
def test_bad_filters(family: str, order: int, corner: float, said: str) -> None:
    with pytest.raises(ValueError) as caught:
        LowPass(family, order, corner)
    assert said in str(caught.value)
