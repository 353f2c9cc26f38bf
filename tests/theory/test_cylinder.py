"""One cylinder against 50-digit closed forms and against 40-digit quadrature of the noise's definition."""

from __future__ import annotations

import cmath

import mpmath as mp
import numpy as np
import pytest

from cable.theory.cylinder import cylinder_form, mean_square_along, spread_current
from oracles.dense import cylinder_coherent_mp, cylinder_noise_mp
from tolerances import ROUND_OFF

MODULI = [1e-8, 1e-4, 0.01, 0.3, 0.499, 0.501, 0.6, 1.0, 3.0, 20.0, 300.0, 1e3]
ANGLES = [0.0, 1e-7, 0.2, 0.9, 1.4, 1.5707]


@pytest.mark.parametrize("modulus", MODULI)
@pytest.mark.parametrize("angle", ANGLES)
def test_form_at_any_length(modulus: float, angle: float) -> None:
    x2 = modulus**2 * cmath.exp(1j * angle)
    form = cylinder_form(np.array([[x2]]))
    with mp.workdps(50):
        z = mp.mpc(x2)
        x = mp.sqrt(z)
        a, b = mp.re(x), mp.im(x)
        size = abs(mp.sinh(x)) ** 2
        sine = mp.sin(b) / b if b else mp.mpf(1)
        double = mp.sin(2 * b) / (4 * b) if b else mp.mpf(1) / 2
        want = (
            x / mp.sinh(x),
            x * mp.tanh(x / 2),
            (mp.sinh(2 * a) / (4 * a) - double) / size,
            (mp.cosh(a) * sine - mp.sinh(a) * mp.cos(b) / a) / 2 / size,
        )
        # the cross covariance oscillates through zero; its natural size is the decay of a signal along x
        sizes = (abs(want[0]), abs(want[1]), want[2], max(abs(want[3]), mp.exp(-a) / (1 + a)))
        for got, exact, scale in zip(form, want, sizes, strict=True):
            assert abs(mp.mpc(complex(got[0, 0])) - exact) <= ROUND_OFF * scale + mp.mpf(10) ** -300


@pytest.mark.parametrize("x", [0.05 + 0.02j, 0.6 + 0.4j, 2.0 + 1.7j])
def test_noise_is_the_integral_that_defines_it(x: complex) -> None:
    form = cylinder_form(np.array([[x * x]]))
    near, far, cross = cylinder_noise_mp(x)
    assert float(form.noise_self[0, 0]) == pytest.approx(float(near), rel=ROUND_OFF)
    assert float(form.noise_self[0, 0]) == pytest.approx(float(far), rel=ROUND_OFF)
    assert float(form.noise_cross[0, 0]) == pytest.approx(float(mp.re(cross)), rel=ROUND_OFF)
    coherent = complex(cylinder_coherent_mp(x)[0])
    assert complex(spread_current(np.array([[x * x]]))[0, 0]) == pytest.approx(coherent, rel=ROUND_OFF)


def test_short_and_long_cylinders_in_one_array() -> None:
    moduli = np.array([1e-6, 0.02, 0.45, 0.55, 2.0, 80.0])
    mixed = moduli[:, None] ** 2 * np.exp(1j * np.array([0.0, 0.4, 1.5]))[None]
    together = cylinder_form(mixed)
    for row in range(len(moduli)):
        for whole, single in zip(together, cylinder_form(mixed[row : row + 1]), strict=True):
            np.testing.assert_allclose(whole[row], single[0], rtol=ROUND_OFF)


def test_mean_square_of_the_mean_voltage_along_a_cylinder() -> None:
    x, a, b, u = 1.3, 4.0, -2.5, 0.7
    form = cylinder_form(np.array([[x * x + 0j]]))
    share = spread_current(np.array([[x * x + 0j]])).real[:, 0]
    got = mean_square_along(share, form.noise_self[:, 0], form.noise_cross[:, 0], *(np.array([v]) for v in (a, b, u)))

    def profile(s: float) -> mp.mpf:
        return u + ((a - u) * mp.sinh(x * (1 - s)) + (b - u) * mp.sinh(x * s)) / mp.sinh(x)

    assert got[0] == pytest.approx(float(mp.quad(lambda s: profile(s) ** 2, [0, 1])), rel=ROUND_OFF)
