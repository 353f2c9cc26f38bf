"""One population: what it takes and refuses, the sizes of its events, and spikes shared with others."""

from __future__ import annotations

from typing import Any

import numpy as np
import pytest

from cable import Kernel, SpikeTrain, SynapticInput
from cable.theory.sharing import Shared, SharingError, correlations
from morphology import Zone
from tolerances import ROUND_OFF

POPULATION: dict[str, Any] = {
    "name": "a",
    "where": Zone(),
    "count": 10.0,
    "rate_Hz": 4.0,
    "current_pA": 5.0,
    "kernel": Kernel.exponential(2.0),
}


def population(**changes: Any) -> SynapticInput:
    return SynapticInput(**{k: v for k, v in (POPULATION | changes).items() if v is not None})


@pytest.mark.parametrize(
    ("changes", "words"),
    [
        ({"current_pA": None}, "exactly one of conductance_nS .* current_pA and charge_fC"),
        ({"charge_fC": 3.0}, "exactly one of"),
        ({"kernel": None}, "kernel: current_pA needs a time course"),
        ({"kernel": None, "current_pA": None, "conductance_nS": 1.0, "reversal_mV": 0.0}, "kernel: conductance_nS"),
        ({"kernel": Kernel.impulse()}, "needs a time course"),
        ({"current_pA": None, "charge_fC": float("inf")}, "charge_fC: expected a finite number"),
        (
            {"current_pA": None, "charge_fC": 1.0, "kernel": Kernel.expression("exp(-t/2)*(1 - t/2)")},
            "charge_fC: the kernel carries no charge",
        ),
        ({"size_cv": -0.1}, "size_cv: expected"),
        ({"size_cv": float("nan")}, "size_cv: expected"),
        ({"spike_train": SpikeTrain.dead_time(300.0)}, "dead_time_ms = 300 allows rates below"),
    ],
)
def test_messages(changes: dict[str, Any], words: str) -> None:
    with pytest.raises(ValueError, match=words):
        population(**changes)


def test_charge_is_what_an_event_carries_whatever_its_kernel() -> None:
    at_once = population(current_pA=None, charge_fC=20.0, kernel=None)
    slow = population(current_pA=None, charge_fC=20.0, kernel=Kernel.alpha(3.0))
    peak = population(current_pA=10.0)  # 10 pA for 2 ms
    assert at_once.kernel == Kernel.impulse()
    for one in (at_once, slow, peak):
        assert one.mean_current_pA == pytest.approx(4e-3 * 20.0, rel=ROUND_OFF)
    assert slow.event_current_pA == pytest.approx(20.0 / (np.e * 3.0), rel=ROUND_OFF)


def test_moments_of_sizes_are_those_of_gamma_numbers() -> None:
    sizes = population(size_cv=0.6)
    shape = 1 / 0.6**2
    for order in (1, 2, 3, 4):
        want = np.prod([(shape + k) / shape for k in range(order)])
        assert sizes.size_moment(order) == pytest.approx(want, rel=ROUND_OFF)
    assert population().size_moment(4) == 1.0


def test_impulse_is_the_limit_of_fast_kernels() -> None:
    impulse, fast = Kernel.impulse(), Kernel.exponential(1e-6)
    omega = np.array([0.0, 0.1, 3.0])
    np.testing.assert_allclose(impulse.transform(omega), fast.transform(omega) / fast.area_ms, atol=5e-6)
    assert (impulse.falls_as, impulse.area_ms, impulse.peak_ms, impulse.is_impulse) == (0, 1.0, 0.0, True)
    assert impulse.slowest_rate_per_ms == np.inf and not fast.is_impulse
    assert impulse.value(np.array([-1.0, 0.0, 1.0])).tolist() == [0.0, np.inf, 0.0]
    assert str(impulse.symbolic) == "DiracDelta(t)"


@pytest.mark.parametrize(
    ("kernel", "text", "latex"),
    [
        (Kernel.exponential(2.0), "exp(-t/2)", "e^{-t/2}"),
        (Kernel.alpha(3.0), "0.9061*t*exp(-t/3)", r"0.9061 \, t \, e^{-t/3}"),
        (
            Kernel.two_exponential(0.5, 5.0),
            "1.435*exp(-t/5) - 1.435*exp(-t/0.5)",
            r"1.435 \, e^{-t/5} - 1.435 \, e^{-t/0.5}",
        ),
        (
            Kernel.expression("exp(-t/4)*(1 + 0.5*cos(2*t))"),
            "0.3333*exp(-t/4)*cos(2*t) + 0.6667*exp(-t/4)",
            r"0.3333 \, e^{-t/4} \, \cos(2 t) + 0.6667 \, e^{-t/4}",
        ),
        (
            Kernel.expression("t**2*exp(-t*1e6)"),
            "1.847e12*t**2*exp(-t/1e-6)",
            r"1.847 \times 10^{12} \, t^{2} \, e^{-t/(1 \times 10^{-6})}",
        ),
        (Kernel.impulse(), "impulse", r"\delta(t)"),
    ],
)
def test_kernels_read_as_people_write_them(kernel: Kernel, text: str, latex: str) -> None:
    assert (kernel.text, kernel.latex) == (text, latex)


@pytest.mark.parametrize(
    "kernel",
    [
        Kernel.two_exponential(0.5, 5.0),
        Kernel.alpha(3.0),
        Kernel.expression("exp(-t/4)*(1 + 0.5*cos(2*t))"),
        Kernel.expression("t*exp(-t/4)*sin(2*t - 1) + exp(-t)"),
    ],
)
def test_what_is_read_is_the_kernel(kernel: Kernel) -> None:
    """The short text, read back as arithmetic, has the kernel's values to the digits that it shows."""
    import sympy

    t = np.linspace(0.0, 20.0, 41)
    for expression, error in ((sympy.sympify(kernel.text), 2e-3), (kernel.symbolic, 1e-12)):
        (symbol,) = expression.free_symbols
        np.testing.assert_allclose(sympy.lambdify(symbol, expression, "numpy")(t), kernel.value(t), atol=error)


def sharing(*fractions: tuple[int, int, float], **changes: Any) -> list[SynapticInput]:
    """Three populations of correlation 0.2, 0.3 and 0.4 that share `fractions` (from, with, fraction)."""
    found = []
    for k in range(3):
        shares = tuple(Shared("abc"[j], f) for i, j, f in fractions if i == k)
        found.append(population(name="abc"[k], correlation=0.1 * (k + 2), shares=shares))
    return found


def test_a_fraction_counts_for_both() -> None:
    given_once = correlations(sharing((0, 1, 0.1), (2, 1, 0.15)))
    np.testing.assert_allclose(given_once, [[0.2, 0.1, 0.0], [0.1, 0.3, 0.15], [0.0, 0.15, 0.4]])
    np.testing.assert_allclose(correlations(sharing((0, 1, 0.1), (1, 0, 0.1), (1, 2, 0.15))), given_once)
    np.testing.assert_allclose(correlations(sharing((0, 1, 0.06**0.5))), correlations(sharing((1, 0, 0.06**0.5))))


@pytest.mark.parametrize(
    ("inputs", "index", "words"),
    [
        (sharing((0, 0, 0.1)), 0, "shares spikes with itself by its correlation"),
        ([population(shares=(Shared("x", 0.1),))], 0, "found 'x', expected the name of another input: none"),
        ([*sharing()[:2], population(name="d", shares=(Shared("x", 0.1),))], 2, "another input: 'a', 'b'; correct"),
        (sharing((1, 0, 0.1), (1, 0, 0.1)), 1, "found 'a' twice"),
        (sharing((0, 1, 0.1), (1, 0, 0.2)), 1, "found fraction 0.2 with 'a', which says 0.1 of the same pair"),
        (sharing((0, 1, 0.25)), 0, "correlations of 0.2 and 0.3 .* at most the root of their product, 0.2449"),
        ([*sharing((0, 1, 0.2))[:2], population(name="shared")], 0, "rename it"),
        (sharing((0, 1, 0.24), (1, 2, 0.34)), 1, "negative eigenvalue"),
        (
            [population(correlation=1.0, shares=(Shared("b", 0.6),)), population(name="b", correlation=1, rate_Hz=1.0)],
            0,
            "at most 0.5 for rates of 1 and 4 Hz",
        ),
        (
            [
                population(correlation=0.5, shares=(Shared("b", 0.1),)),
                population(name="b", correlation=0.5, spike_train=SpikeTrain.gamma(2.0)),
            ],
            0,
            "spike trains of 'a' and 'b' that differ",
        ),
    ],
)
def test_sharing_that_cannot_be(inputs: list[SynapticInput], index: int, words: str) -> None:
    with pytest.raises(SharingError, match=words) as caught:
        correlations(inputs)
    assert caught.value.index == index


def test_fraction_is_one_at_most() -> None:
    with pytest.raises(ValueError, match="fraction: expected 0 to 1"):
        Shared("b", 1.5)
