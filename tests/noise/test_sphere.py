"""One isopotential cell: Campbell's and Rice's closed forms for every kernel."""

from __future__ import annotations

import math

import numpy as np
import pytest
from scipy.optimize import brentq

from cable import CableModel, Fluctuations, Kernel, Membrane, SpikeTrain, SynapticInput
from morphology import CellTree, Zone
from oracles import shot_noise
from tolerances import EXACT, TYPED

# 100 pF, 200 MΩ, 20 fC an event, one event per ms
MEMBRANE = Membrane(axial_resistivity_ohm_cm=150, capacitance_uF_cm2=1, resistance_ohm_cm2=20000, rest_mV=-70)
TAU_M_MS, RESISTANCE_GOHM, CHARGE_FC = 20.0, 0.2, 20.0
SWC = f"1 1 0 0 0 {math.sqrt(1e4 / (4 * math.pi))!r} -1\n"
# variances (mV²) and rates of upcrossing of the mean (Hz): Campbell 1909 and Rice 1944/45 (from memory), derived,
# verified by two computations
KERNELS = {
    "exponential": (Kernel.exponential(2.0), (2.0,), 0.363636363636, 25.1646060522),
    "alpha": (Kernel.alpha(2.0), (2.0, 2.0), 0.347107438017, 17.3652279511),
    "two exponentials": (Kernel.two_exponential(0.5, 5.0), (0.5, 5.0), 0.319290465632, 15.005271936),
}


def drive(kernel: Kernel, rate_Hz: float = 1000.0, charge_fC: float = CHARGE_FC, **more) -> SynapticInput:
    return SynapticInput(
        name="a",
        where=Zone(),
        count=1,
        spread="area",
        rate_Hz=rate_Hz,
        current_pA=charge_fC / kernel.area_ms,
        kernel=kernel,
        **more,
    )


def answer(one: SynapticInput, threshold_mV: float | None = None) -> Fluctuations:
    return CableModel(CellTree.from_text(SWC), MEMBRANE, (one,), threshold_mV=threshold_mV).fluctuations()


@pytest.mark.parametrize("name", KERNELS)
def test_mean_variance_and_correlation_time(name: str) -> None:
    kernel, poles, typed, _ = KERNELS[name]
    field = answer(drive(kernel))
    want = shot_noise.variance_mV2(1.0, CHARGE_FC, RESISTANCE_GOHM, TAU_M_MS, poles)
    assert field.mean_mV[0] + 70 == pytest.approx(shot_noise.mean_mV(1.0, CHARGE_FC, RESISTANCE_GOHM), rel=EXACT)
    assert field.variance_mV2[0] == pytest.approx(want, rel=EXACT)
    assert want == pytest.approx(typed, rel=TYPED)
    still = (CHARGE_FC * RESISTANCE_GOHM) ** 2
    assert field.correlation_time_ms[0] == pytest.approx(still / (2 * want), rel=EXACT)


@pytest.mark.parametrize("name", KERNELS)
def test_crossings_of_the_mean_are_the_published_ones(name: str) -> None:
    kernel, _, _, typed = KERNELS[name]
    field = answer(drive(kernel), threshold_mV=-66.0)
    assert field.upcrossing_Hz is not None
    assert field.upcrossing_Hz[0] == pytest.approx(typed, rel=EXACT)


# crossings of higher levels by the exponential kernel, Hz: derived, verified by two computations
@pytest.mark.parametrize(("deviations", "typed"), [(2.0, 3.40565908762), (3.0, 0.279553521521)])
def test_crossings_of_higher_levels(deviations: float, typed: float) -> None:
    field = answer(drive(Kernel.exponential(2.0)), threshold_mV=-66.0 + deviations * math.sqrt(4 / 11))
    assert field.upcrossing_Hz is not None
    assert field.upcrossing_Hz[0] == pytest.approx(typed, rel=EXACT)


def test_crossings_ten_millivolts_above_the_mean_with_an_sd_of_four() -> None:
    """SD 4 mV by larger events: 1.10565562578 Hz; derived, verified by two computations."""
    larger = 4 / math.sqrt(4 / 11)
    field = answer(drive(Kernel.exponential(2.0), charge_fC=CHARGE_FC * larger), threshold_mV=-70 + 4 * larger + 10)
    assert field.sd_mV[0] == pytest.approx(4.0, rel=EXACT)
    assert field.upcrossing_Hz is not None
    assert field.upcrossing_Hz[0] == pytest.approx(1.10565562578, rel=EXACT)


def test_a_cascade_of_three_exponentials() -> None:
    """∫dω/2π Π 1/(1 + ω²τ²) = Σ τᵢ^{2n-3}/(2 Π(τᵢ² - τⱼ²)); derived, verified by computer algebra."""
    tau = 0.5, 1.5, 4.0
    text = " + ".join(f"{t / math.prod(t - other for other in tau if other != t)!r}*exp(-t/{t})" for t in tau)
    every = (*tau, TAU_M_MS)
    want = sum(
        t ** (2 * len(every) - 3) / (2 * math.prod(t * t - other * other for other in every if other != t))
        for t in every
    )
    field = answer(drive(Kernel.expression(text)))
    assert field.variance_mV2[0] == pytest.approx((CHARGE_FC * RESISTANCE_GOHM) ** 2 * want, rel=EXACT)


def renewal_variance(train: SpikeTrain, rate_per_ms: float, decay_ms: float) -> float:
    """Variance of exponentially filtered renewal events by their Laplace transform, from the interval density.

    With exponentials of decay a and b (membrane) the covariance of the spike train enters at the two real
    frequencies 1/a and 1/b only: ∫₀^∞ e^{-t/τ}(R(t) - r)dt = p/(1 - p) - rτ with p the interval's transform at
    1/τ (Cox & Lewis 1966, from memory; derived, verified by simulation).
    """
    hazard = rate_per_ms / (1 - rate_per_ms * train.dead_time_ms)

    def beyond(tau: float) -> float:
        if train.process == "gamma":
            p = (1 + 1 / (tau * train.order * rate_per_ms)) ** -train.order
        else:
            p = hazard * math.exp(-train.dead_time_ms / tau) / (hazard + 1 / tau)
        return p / (1 - p) - rate_per_ms * tau

    a, b = decay_ms, TAU_M_MS
    # h = (e^{-t/b} - e^{-t/a})/(b - a); its own autocorrelation is (b e^{-t/b} - a e^{-t/a})/(2(b² - a²))
    return (1 / (2 * (a + b)) + (b * beyond(b) - a * beyond(a)) / (b * b - a * a)) * rate_per_ms


@pytest.mark.parametrize("train", [SpikeTrain.gamma(2), SpikeTrain.gamma(7), SpikeTrain.dead_time(10.0)])
def test_regular_spike_trains(train: SpikeTrain) -> None:
    field = answer(drive(Kernel.exponential(2.0), rate_Hz=20.0, spike_train=train))
    want = (CHARGE_FC * RESISTANCE_GOHM) ** 2 * renewal_variance(train, 0.02, 2.0)
    assert field.variance_mV2[0] == pytest.approx(want, rel=EXACT)


@pytest.mark.parametrize("train", [SpikeTrain.gamma(60), SpikeTrain.dead_time(40.0), SpikeTrain.dead_time(49.7)])
def test_trains_that_ring_cost_no_more_than_others(train: SpikeTrain) -> None:
    field = answer(drive(Kernel.exponential(2.0), rate_Hz=20.0, spike_train=train))
    want = (CHARGE_FC * RESISTANCE_GOHM) ** 2 * renewal_variance(train, 0.02, 2.0)
    assert field.variance_mV2[0] == pytest.approx(want, rel=EXACT)
    assert field.certificate.frequencies <= 120
    assert field.correlation_time_ms[0] < 0.2 * answer(drive(Kernel.exponential(2.0))).correlation_time_ms[0]


def test_renewal_variance_reaches_the_published_ones_as_events_shorten() -> None:
    """Jumps of 0.2 mV, 20 ms, 20/s: gamma of order 2 0.00553846153846, dead time 10 ms 0.00565457065693 mV²."""
    for train, typed in ((SpikeTrain.gamma(2), 0.00553846153846), (SpikeTrain.dead_time(10.0), 0.00565457065693)):
        jump = (0.2 * TAU_M_MS) ** 2 * renewal_variance(train, 0.02, 1e-12)
        assert jump == pytest.approx(typed, rel=TYPED)


def test_small_cells_are_points() -> None:
    """A compact cell with the sphere's area has the sphere's variance, to the square of its electrotonic length."""
    kernel, _, typed, _ = KERNELS["alpha"]

    def excess(length_um: float) -> float:
        radius = brentq(lambda r: 4 * math.pi * r * r + 2 * math.pi * length_um - 1e4, 1, 100)
        soma = f"1 1 0 0 0 {radius!r} -1\n2 3 {radius!r} 0 0 1 1\n3 3 {radius + length_um!r} 0 0 1 2\n"
        field = CableModel(CellTree.from_text(soma), MEMBRANE, (drive(kernel),)).fluctuations()
        return abs(field.variance_mV2[0] / typed - 1)

    short, shorter = excess(20.0), excess(10.0)
    assert short < 1e-3
    assert np.log2(short / shorter) > 1.9


def test_nearly_regular_spike_trains() -> None:
    """Gamma of a high order is almost regular: there, jumps of 0.2 mV give 0.00303080783734 mV² (derived)."""
    field = answer(drive(Kernel.exponential(0.02), rate_Hz=20.0, charge_fC=20.0, spike_train=SpikeTrain.gamma(400)))
    want = 16 * renewal_variance(SpikeTrain.gamma(400), 0.02, 0.02)
    assert field.variance_mV2[0] == pytest.approx(want, rel=EXACT)
    assert want == pytest.approx(0.00303080783734, rel=0.01)
    assert field.variance_mV2[0] > 0.00303080783734
