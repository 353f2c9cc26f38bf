"""Kernel expressions that mean harm: none of them runs, hangs or fills memory, and each is refused in one message."""

from __future__ import annotations

import random

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from cable.theory.kernel import SAMPLES_A_CYCLE, Kernel, peak_of
from hostile.kernel_verdict import try_expression
from hostile.mutators import HOSTILE
from tolerances import HOSTILE_PEAK

# sums of terms t^n exp(-pt), odd as they look
FINE = {"exp(-t)*exp(-0*t)", "exp(-t)**12", "exp(-t*(1+exp(1)))", "exp(-t*sin(1))", "exp(-t)#"}


@pytest.mark.parametrize("text", [text for text in HOSTILE if text not in FINE])
def test_each_is_refused(tmp_path, text):
    assert try_expression(text, tmp_path, random.Random(1)) == "refused"


@pytest.mark.parametrize("text", sorted(FINE))
def test_odd_ones_that_are_kernels_are_taken(tmp_path, text):
    assert try_expression(text, tmp_path, random.Random(1)) == "answered"


@pytest.mark.parametrize("power", [4, 6, 12])
def test_powers_of_powers_are_refused_before_they_are_multiplied_out(power):
    for text in (f"((((9**{power})**12)**12)**12)**12*exp(-t)", f"(((t+1)**{power})**12)**12*exp(-t)"):
        with pytest.raises(ValueError, match="more terms or digits"):
            Kernel.expression(text)


@pytest.mark.parametrize("letter", ["\uff54", "\u0442", "\U0001d42d"])  # fullwidth, Cyrillic, bold: all look like t
def test_letters_that_look_like_t(letter):
    # Python reads names in their compatible form (NFKC), so two of them are t; the Cyrillic one is not
    text = f"exp(-{letter})"
    if letter == "\u0442":
        with pytest.raises(ValueError, match="not allowed"):
            Kernel.expression(text)
    else:
        assert Kernel.expression(text).slowest_rate_per_ms == 1.0


@pytest.mark.parametrize("digit", ["\u0663", "\uff13", "\u00b3"])
def test_digits_of_other_scripts_are_no_numbers(digit):
    with pytest.raises(ValueError, match="not arithmetic"):
        Kernel.expression(f"exp(-t/{digit})")


@pytest.mark.parametrize(
    "text",
    ["t*exp(-t/100)*(1+cos(9*t))", "t**12*exp(-t)*(1+cos(20*t))", "exp(-t/100)*(1-cos(8*t))"],
)
def test_the_highest_of_many_cycles_is_the_peak(text):
    """Against a fine grid: the kernel's peak is 1, and the grid meets every cycle a thousand times."""
    kernel = Kernel.expression(text)
    slow, fast = kernel.slowest_rate_per_ms, max(abs(p) for p in kernel.poles_per_ms)
    highest = np.abs(kernel.value(np.arange(0.0, 20 / slow, 2 * np.pi / fast / 1000))).max()
    assert abs(highest - 1) < 10 * HOSTILE_PEAK


def test_ringing_beyond_what_can_be_searched_is_refused():
    with pytest.raises(ValueError, match="radians while it decays"):
        Kernel.expression("exp(-t/100)*(1+cos(50*t))")


@settings(max_examples=150, deadline=None, derandomize=True)
@given(st.text(st.sampled_from("t19.*+-/() expsincoπ_,=[]'\"\\\n\x00é"), max_size=40))
def test_any_text_is_refused_or_is_what_it_says(tmp_path_factory, text):
    try_expression(text, tmp_path_factory.getbasetemp(), random.Random(1))


@pytest.mark.parametrize(
    "text", ["exp(-t*sin(1))*(1+cos(pi*t))**5", "exp(-t*exp(1)/pi)*(1+sin(pi*t/7))*cos(t)", "exp(-t/2)*cos(t)**12"]
)
def test_constants_without_an_end_are_no_burden(tmp_path, text):
    """Algebra with π, sin(1) or e as such took minutes; each is a number of 45 digits instead."""
    assert try_expression(text, tmp_path, random.Random(1)) == "answered"


def test_terms_that_cancel_are_gone():
    """cos(π/7) - cos(2π/7) + cos(3π/7) = 1/2 (from memory), which no rewriting of the terms shows."""
    kernel = Kernel.expression("exp(-t/3)*(cos(pi/7) - cos(2*pi/7) + cos(3*pi/7) - 0.5) + t*exp(-t)")
    assert [term.power for term in kernel.terms] == [1] and kernel.poles_per_ms == (1.0, 1.0)


def test_a_peak_between_samples_wins_over_a_lower_one_on_a_sample():
    """Two bumps a sixth of a cycle wide, the lower on a sample of the search, the higher between two of them."""
    poles = (1.0, 1 + 20j, 1 - 20j)
    step = 60.0 / (SAMPLES_A_CYCLE * 191)
    low, high, width = 300 * step, 700.5 * step, 0.05

    def bumps(t):
        return np.exp(-(((t - low) / width) ** 2)) + 1.002 * np.exp(-(((t - high) / width) ** 2))

    assert peak_of(bumps, poles) == pytest.approx((high, 1.002), rel=HOSTILE_PEAK)
