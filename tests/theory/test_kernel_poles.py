"""A kernel's transform as an analytic function: its poles are poles, with the residues of its time course."""

from __future__ import annotations

import mpmath as mp
import numpy as np
import pytest

from cable import Kernel
from theory.test_kernel import KERNELS
from tolerances import EXACT, TYPED

APART = [name for name in KERNELS if name != "nearly equal"]


def at(kernel: Kernel, s: complex) -> complex:
    return complex(kernel.laplace(np.array([s]))[0])


def multiplicity(kernel: Kernel, pole: complex) -> int:
    return sum(abs(other - pole) < 1e-12 * abs(pole) for other in kernel.poles_per_ms)


@pytest.mark.parametrize("name", APART)
def test_transform_is_infinite_at_its_poles_and_nowhere_else(name: str) -> None:
    kernel = KERNELS[name]
    every = np.array(kernel.poles_per_ms)
    for pole in every:
        near = [abs(at(kernel, -pole * (1 + gap))) for gap in (2e-5, 1e-5)]
        assert np.log2(near[1] / near[0]) == pytest.approx(multiplicity(kernel, pole), abs=1e-3)
    # the argument principle: zeros less poles within a circle that holds all poles; zeros are those of the numerator
    reach = 3 * np.abs(every).max()
    turn = np.exp(2j * np.pi * np.arange(4001) / 4000)
    phase = np.unwrap(np.angle([at(kernel, reach * z) for z in turn]))
    zeros = np.roots(kernel.numerator[::-1])
    assert (phase[-1] - phase[0]) / (2 * np.pi) == pytest.approx((np.abs(zeros) < reach).sum() - len(every), abs=1e-6)


@pytest.mark.parametrize("name", APART)
def test_time_course_is_the_inverse_transform(name: str) -> None:
    """Talbot's contour (mpmath) from the transform alone."""
    kernel = KERNELS[name]

    def transform(s: mp.mpc) -> mp.mpc:
        value = mp.polyval([mp.mpf(c) for c in kernel.numerator[::-1]], s)
        for pole in kernel.poles_per_ms:
            value /= 1 + s / mp.mpmathify(pole)
        return value

    s = 0.3 + 0.7j
    assert at(kernel, s) == pytest.approx(complex(transform(mp.mpc(s))), rel=TYPED)
    for t in (0.3, 1.7, 6.0):
        want = mp.invertlaplace(transform, t, method="talbot", degree=40)
        assert float(kernel.value(t)) == pytest.approx(float(mp.re(want)), rel=EXACT)
