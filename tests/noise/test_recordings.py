"""Records of a known process: through scipy's own filters, in windows, and how long they must be."""

from __future__ import annotations

import itertools
import math
from dataclasses import replace

import numpy as np
import pytest
from numpy.polynomial.legendre import leggauss
from scipy import signal
from scipy.integrate import quad

from cable.noise.cross import by_frequency
from cable.noise.record.recorded_integral import _removed
from cable.theory.electrode import Electrode
from cable.theory.filters import LowPass
from noise.electrode_cells import (
    BALL_AND_STICK,
    CAPACITANCE_PF,
    CHARGE_FC,
    RATE_PER_MS,
    RESISTANCE_GOHM,
    sphere,
    spread,
)
from oracles.worked_typed import TYPED
from tolerances import EXACT
from tolerances import TYPED as TWELVE_DIGITS

TAU_MS, DECAY_MS, HZ = 20.0, 2.0, 2e-3 * math.pi
PIPETTE = {"series_resistance_MOhm": 150.0, "pipette_capacitance_pF": 4.0}


def loaded_density(frequency_Hz: float, pipette: dict[str, float]) -> tuple[float, float]:
    """One-sided spectra of the sphere's voltage and of the amplifier's, by Ohm's law in complex numbers, mV²/Hz."""
    s = 1j * HZ * frequency_Hz
    through = 1e-3 * pipette["series_resistance_MOhm"] * pipette["pipette_capacitance_pF"]
    load = s * pipette["pipette_capacitance_pF"] / (1 + s * through)
    z = 1 / (1 / RESISTANCE_GOHM + s * CAPACITANCE_PF + load)
    density = 2e-3 * RATE_PER_MS * CHARGE_FC**2 * abs(z / (1 + s * DECAY_MS)) ** 2
    return density, density / abs(1 + s * through) ** 2


def response(family: str, order: int, corner_Hz: float, high_pass_Hz: float):
    """|H|² of the filters at one frequency, by scipy.signal.freqs."""
    design = {"bessel": lambda: signal.bessel(order, corner_Hz, analog=True, norm="mag")}
    b, a = design.get(family, lambda: signal.butter(order, corner_Hz, analog=True))()
    d, c = signal.butter(1, high_pass_Hz, btype="high", analog=True)

    def power(f: float) -> float:
        return float(abs(signal.freqs(b, a, [f])[1][0] * signal.freqs(d, c, [f])[1][0]) ** 2)

    return power


@pytest.mark.parametrize(
    ("family", "order", "corner", "high_pass"),
    [
        ("bessel", 4, 300.0, 0.1),
        ("bessel", 8, 30.0, 2.0),
        ("butterworth", 2, 100.0, 0.01),
        ("butterworth", 8, 8.0, 1.0),
    ],
)
def test_recorded_variance_through_scipys_filters(family: str, order: int, corner: float, high_pass: float) -> None:
    one = Electrode(site="soma", low_pass=LowPass(family, order, corner), high_pass_Hz=high_pass, **PIPETTE)
    power = response(family, order, corner, high_pass)

    def integral(which: int, degree: int, filtered: bool) -> float:
        def integrand(log_f: float) -> float:
            f = math.exp(log_f)
            return f * (loaded_density(f, PIPETTE)[which] * (power(f) if filtered else 1.0)) ** degree

        pieces = [-25.0, math.log(high_pass), math.log(corner), math.log(corner) + 2, 22.0]
        return sum(quad(integrand, a, b, epsabs=0, epsrel=1e-11, limit=200)[0] for a, b in itertools.pairwise(pieces))

    found = sphere(one).recording("soma")
    assert found.loaded.variance == pytest.approx(integral(0, 1, False), rel=EXACT)
    assert found.recorded.variance == pytest.approx(integral(1, 1, True), rel=EXACT)
    # ∫C² dτ = ∫S² df two-sided; with the one-sided S₁ = 2S it is half ∫S₁² over f > 0, here from Hz to 1/ms
    assert found.recorded.square == pytest.approx(1e3 * integral(1, 2, True) / 2, rel=1e-8)
    assert found.recorded.relative_error < 1e-8
    f = np.array([0.5, 20.0, 400.0])
    spectrum = found.spectrum(f)
    assert spectrum.recorded == pytest.approx([loaded_density(x, PIPETTE)[1] * power(x) for x in f], rel=EXACT)
    assert spectrum.loaded == pytest.approx([loaded_density(x, PIPETTE)[0] for x in f], rel=EXACT)
    assert math.isnan(found.recorded.mean)


def autocovariance(t_ms: float) -> float:
    """Of the bare sphere (the worked sphere's closed form)."""
    scale = TYPED["sphere_current"]["sd_mV"] ** 2 / (TAU_MS - DECAY_MS)
    return scale * (TAU_MS * math.exp(-t_ms / TAU_MS) - DECAY_MS * math.exp(-t_ms / DECAY_MS))


@pytest.mark.parametrize("window_s", [0.003, 0.05, 1.0, 60.0])
@pytest.mark.parametrize("trend", ["mean", "line"])
def test_windows_take_off_what_the_autocovariance_says(window_s: float, trend: str) -> None:
    """In the time domain: the variance of a window's mean and slope from C(τ), without any spectrum."""
    window = 1e3 * window_s

    def overlap(lag: float) -> float:
        """∫φ(t)φ(t + lag) dt of the orthonormal line φ on [0, W], from its antiderivative."""
        u, w = leggauss(4)
        t = (window - lag) * (u + 1) / 2
        return float(12 / window**3 * ((t - window / 2) * (t + lag - window / 2)) @ w * (window - lag) / 2)

    def removed(weight) -> float:
        ends = sorted({0.0, min(window, 5.0), min(window, 40.0), min(window, 200.0), min(window, 900.0), window})
        parts = itertools.pairwise(ends)
        return sum(quad(lambda t: 2 / window * weight(t) * autocovariance(t), a, b, epsrel=1e-12)[0] for a, b in parts)

    lost = removed(lambda t: 1 - t / window)
    if trend == "line":
        lost += removed(overlap)
    one = Electrode(site="soma", window_s=window_s, trend=trend)
    found = sphere(one).recording("soma")
    variance = TYPED["sphere_current"]["sd_mV"] ** 2
    assert found.loaded.variance == pytest.approx(variance, rel=EXACT)
    assert found.recorded.variance == pytest.approx(variance - lost, rel=1e-6)
    assert found.recorded.variance == pytest.approx(
        variance - lost, abs=2 * variance * found.recorded.relative_error + 1e-11
    )
    assert math.isnan(found.recorded.mean)
    f = np.array([0.1, 3.0, 80.0])
    if trend == "mean":
        kept = 1 - np.sinc(f * window_s) ** 2
        assert found.spectrum(f).power_gain == pytest.approx(kept, rel=1e-6, abs=1e-12)
        assert found.spectrum(f).recorded == pytest.approx(kept * found.spectrum(f).true, rel=1e-6, abs=1e-15)


@pytest.mark.parametrize("trend", ["mean", "line"])
def test_what_long_windows_take_off_is_exact_too(trend: str) -> None:
    """C = e^{-t}/2 in windows of W: (1 - 1/W)/W goes with the mean, (1 - 3/W + 12/W³)/W with the line."""
    window = 2000.0
    want = (1 - 1 / window) / window + (trend == "line") * (1 - 3 / window + 12 / window**3) / window
    change, rest = _removed(lambda w: 1 / (1 + w[None] ** 2), np.ones(1, int), window, trend, (1.0, 1.5), np.ones(1))
    assert -change[0] == pytest.approx(want, rel=1e-10)
    assert 0 < abs(rest[0]) < 1e-6 * want


def test_square_of_a_windowed_spectrum() -> None:
    """∫C² behind a window against quad on the closed spectrum times 1 - sinc², one half turn at a time."""
    window_ms = 100.0
    scale = 2 * RATE_PER_MS * (CHARGE_FC * RESISTANCE_GOHM) ** 2 / 2

    def integrand(omega: float) -> float:
        spectrum = scale / ((1 + (omega * TAU_MS) ** 2) * (1 + (omega * DECAY_MS) ** 2))
        return (spectrum * (1 - np.sinc(omega * window_ms / 2 / math.pi) ** 2)) ** 2 / math.pi

    ends = [2 * math.pi * k / window_ms for k in range(80)]
    want = sum(quad(integrand, a, b, epsabs=0, epsrel=1e-10)[0] for a, b in itertools.pairwise(ends))
    found = sphere(Electrode(site="soma", window_s=0.1)).recording("soma").recorded
    assert found.square == pytest.approx(want, rel=1e-5)


def test_errors_of_a_record_of_the_worked_sphere() -> None:
    """∫ρ² of a difference of exponentials in closed form."""
    found = sphere().recording("soma").recorded
    m, s = TAU_MS, DECAY_MS
    want = (m**3 + s**3 - 4 * m**2 * s**2 / (m + s)) / (m - s) ** 2
    assert found.sd == pytest.approx(TYPED["sphere_current"]["sd_mV"], rel=TWELVE_DIGITS)
    assert found.mean == pytest.approx(TYPED["sphere_current"]["mean_mV"], rel=TWELVE_DIGITS)
    assert found.square_time_ms == pytest.approx(want, rel=EXACT)
    assert found.correlation_time_ms == pytest.approx(m + s, rel=EXACT)
    assert found.variance_relative_error(10.0) == pytest.approx(math.sqrt(2 * want / 1e4), rel=EXACT)
    assert found.sd_relative_error(found.seconds_for_sd(0.05)) == pytest.approx(0.05, rel=EXACT)
    assert found.mean_error(found.seconds_for_mean(0.05)) == pytest.approx(0.05 * found.sd, rel=EXACT)


def test_published_rules_for_an_exponential_autocorrelation() -> None:
    """τ = 20 ms, T = 100 s: 2 % of the variance, 1 % of the SD, 0.02 SD of the mean (derived, checked on 4000
    simulated records). A kernel of 1 µs leaves ρ exponential to 1e-4."""
    found = sphere(decay_ms=1e-3).recording("soma").recorded
    assert found.variance_relative_error(100.0) == pytest.approx(0.02, rel=1e-3)
    assert found.sd_relative_error(100.0) == pytest.approx(0.01, rel=1e-3)
    assert found.mean_error(100.0) == pytest.approx(0.02 * found.sd, rel=1e-3)


def test_correlation_and_its_error_on_simulated_records() -> None:
    """Gaussian records with the cell's own cross-spectra: their correlations scatter as Bartlett's formula says.

    The published correlation of soma and tip is 0.630294846558. 1500 records give the scatter to 1.8 %.
    """
    pipette = Electrode(site="tip", low_pass=LowPass("butterworth", 1, 4.0))
    cell = spread(BALL_AND_STICK, pipette)
    pair = cell.recorded_pair("soma", "tip")
    assert pair.true.value == pytest.approx(TYPED["ball_and_stick"]["correlation_soma_tip"], rel=1e-9)
    assert pair.loaded.value == pytest.approx(pair.true.value, rel=1e-9)
    assert pair.recorded.value < 0.8 * pair.true.value  # the filter delays the tip's slow noise
    step_ms, size, many = 1.0, 4096, 1500
    f = np.fft.rfftfreq(size, 1e-3 * step_ms)
    spectrum = by_frequency(cell.refined.point, [cell.node_of("soma"), cell.node_of("tip")], f).sum(axis=0)
    gain = np.stack([np.ones(len(f)), 1 / (1 + 1j * f / 4.0)])
    spectrum = spectrum * gain[:, None] * gain[None].conj()
    root = np.linalg.cholesky(np.moveaxis(spectrum, -1, 0) * size / step_ms)
    rng = np.random.default_rng(11)
    white = rng.normal(size=(many, len(f), 2)) + 1j * rng.normal(size=(many, len(f), 2))
    white[:, [0, -1]] = rng.normal(size=(many, 2, 2)) * math.sqrt(2)
    # e^{+iωt} with S_ab = E[V_a V_b*] is numpy's own convention
    records = np.fft.irfft(np.einsum("fab,mfb->maf", root, white / math.sqrt(2)), n=size)[..., : size // 2]
    found = np.array([np.corrcoef(one)[0, 1] for one in records])
    seconds = 1e-3 * step_ms * size / 2
    # each record loses its mean, as windows of its length do; a sample correlation r is low by about r(1 - r²)/2n
    windows = Electrode(site="soma", window_s=seconds), replace(pipette, window_s=seconds)
    left = np.mean([np.cov(one, bias=True) for one in records], axis=0)
    windowed = spread(BALL_AND_STICK, *windows)
    want = windowed.recorded_pair("soma", "tip").recorded.value
    assert left[0, 1] / math.sqrt(left[0, 0] * left[1, 1]) == pytest.approx(want, abs=0.003)
    assert left[1, 1] == pytest.approx(windowed.recording("tip").recorded.variance, rel=0.015)
    assert found.std() == pytest.approx(pair.recorded.error(seconds), rel=0.08)
    sd = records[:, 1].std(axis=1)
    record = cell.recording("tip").recorded
    assert sd.std() / sd.mean() == pytest.approx(record.sd_relative_error(seconds), rel=0.08)
    assert records[:, 1].mean(axis=1).std() == pytest.approx(record.mean_error(seconds), rel=0.08)
    assert pair.recorded.error(pair.recorded.seconds_for(0.02)) == pytest.approx(0.02, rel=EXACT)


def test_records_that_are_one_correlate_perfectly() -> None:
    pair = sphere(sites=("again",)).recorded_pair("soma", "again")
    assert pair.recorded.value == pytest.approx(1.0, rel=EXACT)
    assert pair.recorded.variance_ms == pytest.approx(0.0, abs=1e-6)


def test_a_cell_without_input_records_nothing() -> None:
    cell = replace(sphere(), inputs=())
    found = cell.recording("soma")
    assert (found.recorded.sd, found.recorded.mean) == (0.0, 0.0)
    assert math.isnan(found.recorded.correlation_time_ms)
    assert found.recorded.shortest_s == 0.0


def test_messages() -> None:
    cell = sphere(Electrode(site="soma", window_s=1.0), sites=("again",))
    with pytest.raises(KeyError, match="no site 'tip'; the sites are soma, again"):
        cell.recording("tip")
    with pytest.raises(ValueError, match="a correlation needs two sites, found 'soma' twice"):
        cell.recorded_pair("soma", "soma")
    with pytest.raises(ValueError, match="have different windows; a correlation needs the same window_s and trend"):
        cell.recorded_pair("soma", "again")
    with pytest.raises(ValueError, match="the electrode at 'soma' is no voltage clamp"):
        cell.clamp_shares("soma")
