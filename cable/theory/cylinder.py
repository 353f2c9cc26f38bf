"""One passive cylinder: its admittances, the noise it injects at its ends, and the mean voltage along it.

With x² = R·Y the Π form has the coupling c = (x csch x)/R between the ends and the shunt s = (x tanh(x/2))/R
at each end (Rall 1977, Handbook of Physiology, Nervous System I; Jack, Noble & Tsien 1975, ch. 3; from memory).

Currents that are white in space and independent from place to place, with the total spectrum q over the
cylinder, enter the ends as Norton currents J_a = ∫ i(s) sinh(x(1-s))/sinh x ds. The integrals
    E|J_a|²/q      = [sinh 2α/(4α) - sin 2β/(4β)]/|sinh x|²,      x = α + iβ,
    E[J_a J_b*]/q  = ½[cosh α sin β/β - sinh α cos β/α]/|sinh x|²
are, written with the admittances, Im(x coth x)/Im x² and -Im(x csch x)/Im x²: the cylinder's dissipation, as
the fluctuation-dissipation theorem wants it. Both forms are derived and verified against 40-digit quadrature.

For small |x| everything is a power series in x²; one backward recurrence with real numbers gives a series
and its divided imaginary part at once and to round-off. For larger |x| decaying exponentials are used, so
that nothing overflows or cancels.
"""

from __future__ import annotations

from fractions import Fraction
from functools import cache
from math import comb, factorial
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

Floats = NDArray[np.float64]
Complexes = NDArray[np.complex128]

SERIES_BELOW = 0.25  # |x²| up to which the series are used: they converge as (|x²|/π²)^k


class CylinderForm(NamedTuple):
    """Dimensionless Π form and noise of cylinders, each an array of the shape of x².

    Attributes:
        coupling: x csch x; times 1/R the admittance between the ends.
        shunt: x tanh(x/2); times 1/R the admittance of each end to ground.
        noise_self: E|J_a|²/q, equal at both ends.
        noise_cross: E[J_a J_b*]/q, real.
    """

    coupling: Complexes
    shunt: Complexes
    noise_self: Floats
    noise_cross: Floats


@cache
def _series(name: str, terms: int) -> tuple[float, ...]:
    """Coefficients in x² of x csch x ("coupling") and of x tanh(x/2) ("shunt").

    From the Bernoulli numbers (DLMF 4.33; from memory).
    """
    bernoulli = [Fraction(1)]
    for m in range(1, 2 * terms):
        bernoulli.append(-sum((comb(m + 1, k) * bernoulli[k] for k in range(m)), Fraction(0)) / (m + 1))
    found = []
    for k in range(terms):
        b = bernoulli[2 * k] / factorial(2 * k)
        found.append(float((2 - 4**k) * b if name == "coupling" else 2 * (4**k - 1) * b))
    return tuple(found)


def _terms_for(largest: float) -> int:
    """How many terms bring the series to round-off at |x²| = largest."""
    return max(4, int(np.ceil(38.0 / np.log(np.pi**2 / max(largest, 1e-300)))) + 1)


def _sum_series(name: str, terms: int, real: Floats, imag: Floats, modulus2: Floats) -> tuple[Complexes, Floats]:
    """The series at z = real + i·imag and its imaginary part over `imag`.

    Both come out of the synthetic division by t² - 2·real·t + |z|².
    """
    coefficients = _series(name, terms)
    twice = 2 * real
    b1: Floats = np.full(real.shape, coefficients[-1])
    b2: Floats = np.zeros(real.shape)
    for coefficient in coefficients[-2:0:-1]:
        b2 *= -modulus2
        b2 += twice * b1
        b2 += coefficient
        b1, b2 = b2, b1
    value = np.empty(real.shape, dtype=np.complex128)
    value.real = coefficients[0] + real * b1 - modulus2 * b2
    value.imag = imag * b1
    return value, b1


def _small(x2: Complexes) -> CylinderForm:
    real, imag = x2.real, x2.imag
    modulus2 = real * real + imag * imag
    terms = _terms_for(float(np.sqrt(modulus2.max(initial=0.0))))
    coupling, coupling_divided = _sum_series("coupling", terms, real, imag, modulus2)
    shunt, shunt_divided = _sum_series("shunt", terms, real, imag, modulus2)
    return CylinderForm(coupling, shunt, coupling_divided + shunt_divided, -coupling_divided)


def _large(x2: Complexes) -> CylinderForm:
    x: Complexes = np.sqrt(x2)
    alpha, beta = x.real, x.imag
    e = np.exp(-x)
    e2 = e * e
    below = 1 / (1 - e2)
    size = e.real**2 + e.imag**2
    weight = below.real**2 + below.imag**2
    still = beta == 0
    safe = np.where(still, 1.0, beta)
    sine = np.where(still, np.sqrt(size), -e.imag / safe)  # e^-α sin β/β
    double = np.where(still, 2 * size, -e2.imag / safe)  # e^-2α sin 2β/β
    return CylinderForm(
        coupling=2 * x * e * below,
        shunt=x * (1 - e) / (1 + e),
        noise_self=((1 - size * size) / (2 * alpha) - double) * weight,
        noise_cross=((1 + size) * sine - (1 - size) * e.real / alpha) * weight,
    )


def cylinder_form(x2: Complexes) -> CylinderForm:
    """Π form and noise of cylinders of squared electrotonic length `x2` (..., F).

    Exact to round-off for |x| from 0 to beyond 1e3 and for real x² (zero frequency).
    The first axis may mix short and long cylinders.
    """
    short = np.abs(x2.real) + np.abs(x2.imag) <= SERIES_BELOW
    return _small(x2) if short.all() else _mixed(x2, short)


def _mixed(x2: Complexes, short: NDArray[np.bool_]) -> CylinderForm:
    """As `_large`, with the series where single entries are short."""
    if not short.any():
        return _large(x2)
    form = _large(np.where(short, 1.0, x2))
    series = _small(x2[short])
    for whole, part in zip(form, series, strict=True):
        whole[short] = part
    return form


def spread_current(x2: Complexes) -> Complexes:
    """tanh(x/2)/x: the share of an evenly spread current, in step, that enters each end (½ for short cylinders)."""
    form = cylinder_form(x2)
    small = np.abs(x2) < 1e-200
    return np.where(small, 0.5, form.shunt / np.where(small, 1.0, x2))


def mean_square_along(
    share: Floats, noise_self: Floats, noise_cross: Floats, at_a: Floats, at_b: Floats, far_from_ends: Floats
) -> Floats:
    """Mean over a cylinder of v(s)², where v solves the steady cable equation.

    v(s) = u + [(v_a - u) sinh x(1-s) + (v_b - u) sinh xs]/sinh x, with u the value far from both ends; the
    integrals over s are those that spread currents and noise need too.

    Args:
        share: (E,) tanh(x/2)/x at zero frequency, see `spread_current`.
        noise_self, noise_cross: (E,) as in `CylinderForm`, at zero frequency.
        at_a, at_b, far_from_ends: (E,) values at the ends, and u.
    """
    a, b, u = at_a - far_from_ends, at_b - far_from_ends, far_from_ends
    return u * u + 2 * u * share * (a + b) + (a * a + b * b) * noise_self + 2 * a * b * noise_cross


def noise_between(x2: Complexes, mirrored: Complexes) -> tuple[Complexes, Complexes]:
    """E|J_a|²/q and E[J_a J_b*]/q continued to complex frequency, where conjugates become mirrored values.

    Args:
        x2: (..., F) squared electrotonic length at the Laplace frequency s.
        mirrored: (..., F) the same at -s.

    Returns:
        The divided differences of x coth x and of -x csch x between the two; on the imaginary s axis they are
        `CylinderForm.noise_self` and `noise_cross`.
    """
    total, product = x2 + mirrored, x2 * mirrored
    largest = np.maximum(np.abs(x2), np.abs(mirrored))
    short = largest <= SERIES_BELOW
    terms = _terms_for(float(largest[short].max(initial=0.0)))
    coupling, shunt = (_divided_series(name, terms, total, product) for name in ("coupling", "shunt"))
    own, cross = coupling + shunt, -coupling
    if not short.all():
        long = ~short
        one, other = (_large(np.atleast_2d(z[long])) for z in (x2, mirrored))
        gap = (x2 - mirrored)[long]
        crossing = (one.coupling - other.coupling)[0] / gap
        own[long] = crossing + (one.shunt - other.shunt)[0] / gap
        cross[long] = -crossing
    return own, cross


def _divided_series(name: str, terms: int, total: Complexes, product: Complexes) -> Complexes:
    """The divided difference of a series between two points with this sum and product."""
    coefficients = _series(name, terms)
    b1, b2 = np.full(total.shape, coefficients[-1], dtype=np.complex128), np.zeros(total.shape, dtype=np.complex128)
    for coefficient in coefficients[-2:0:-1]:
        b1, b2 = coefficient + total * b1 - product * b2, b1
    return b1
