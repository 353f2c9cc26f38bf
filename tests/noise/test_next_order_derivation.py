"""The terms of the next order derived again, by sympy, where the whole expansion can be written out: a sphere.

The conductance g = mean·(1 + x) has jumps at the rate 1/e, which decay as exp(-p t); v is the voltage from the linear
mean: v' = -mu v + a x (F - v). The moments E[x^k v^m] of this Markov process are known to second order in e from a
closed set of linear equations, with no diagram and no integral. The terms of our expansion must add up to them.
"""

from __future__ import annotations

from functools import cache
from math import comb

import pytest
import sympy as sp

from noise.beyond_linear import sphere_model
from tolerances import NEXT_ORDER, ON_A_PATH

E, A, MU, P, F = sp.symbols("e a mu p F", positive=True)
# sums in denominators, kept whole while products of exponentials are multiplied out
APART, TOGETHER, DOUBLE = sp.symbols("apart together double")
WHOLE = {APART: 1 / (P - MU), TOGETHER: 1 / (P + MU), DOUBLE: 1 / (2 * P - MU)}
T, U1, U2, U3 = sp.symbols("t u1 u2 u3", positive=True)


@cache
def second_order() -> tuple[sp.Expr, sp.Expr, sp.Expr]:
    """The mean in first order of e, the variance in first and in second order, from the moments."""
    keys = [(k, m) for m in range(3) for k in range(5) if k + m <= 4]  # what lies beyond is of third order
    unknown = {key: sp.Symbol(f"m{key[0]}{key[1]}") for key in keys if key != (0, 0)}
    moment = {**unknown, (0, 0): sp.Integer(1)}
    equations = []
    for k, m in unknown:
        total = -(P * k + MU * m) * moment[k, m]
        total += sum(comb(k, q) * (E * P) ** (k - q) / E * moment[q, m] for q in range(k - 1))
        if m:
            total += m * A * (F * moment.get((k + 1, m - 1), 0) - moment.get((k + 1, m), 0))
        equations.append(total)
    found = sp.solve(equations, list(unknown.values()), dict=True)[0]
    mean = found[unknown[0, 1]]
    variance = sp.together(found[unknown[0, 2]] - mean**2)
    orders = [sp.simplify(sp.diff(variance, E, n).subs(E, 0) / n) for n in (1, 2)]
    return sp.simplify(sp.diff(mean, E).subs(E, 0)), *orders


def half_line(expression: sp.Expr, *variables: sp.Symbol) -> sp.Expr:
    """The integral of a sum of decaying exponentials over positive values of the variables."""
    total = sp.Integer(0)
    for term in sp.Add.make_args(sp.expand(expression)):
        factors = sp.Mul.make_args(term)
        exponent = sp.expand(sum(one.args[0] for one in factors if isinstance(one, sp.exp)))
        value = sp.Mul(*(one for one in factors if not isinstance(one, sp.exp)))
        for variable in variables:
            value /= -exponent.coeff(variable)
        total += value
    return sp.simplify(total.subs(WHOLE))


@cache
def terms() -> dict[str, sp.Expr]:
    """Our terms for the variance, over e², with C_g = c e^{-p|τ|}, z = e^{-mu t}; and the mean's shift over e."""
    c = P * A**2 / 2
    shift = -F / MU * c / (P + MU)
    linear = F**2 * c / (MU * (MU + P))

    def heard_after(t: sp.Expr) -> sp.Expr:  # E[a x(0) v(t)], t > 0
        return F * c * ((sp.exp(-MU * t) - sp.exp(-P * t)) * APART + sp.exp(-MU * t) * TOGETHER)

    def autocovariance(t: sp.Expr) -> sp.Expr:
        return F**2 * c * APART * TOGETHER * (P / MU * sp.exp(-MU * t) - sp.exp(-P * t))

    def driven(source: sp.Expr) -> sp.Expr:  # variance from the covariance of a source at t > 0
        return half_line(source * sp.exp(-MU * T), T) / MU

    event = A * P * (sp.exp(-MU * T) - sp.exp(-P * T)) * APART  # z * h of one event
    loss = -A * P * sp.exp(-P * T) * event  # what saturation takes from its current
    # the voltage of the loss: ∫ e^{-mu (t - u)} loss(u) du, by its Laplace poles
    lost = (
        -((A * P) ** 2)
        * APART
        * ((sp.exp(-MU * T) - sp.exp(-(P + MU) * T)) / P - (sp.exp(-MU * T) - sp.exp(-2 * P * T)) * DOUBLE)
    )
    assert sp.simplify((sp.diff(lost, T) + MU * lost - loss).subs(WHOLE)) == 0
    scatter = c * sp.exp(-(P + MU) * U2)
    return {
        "shift": shift,
        "linear": linear,
        "force at the shifted mean": -2 * shift / F * linear,
        "saturating events": 2 * F**2 * half_line(event * lost, T),
        "fluctuating admittance": 2 * half_line(sp.exp(-MU * U1) * scatter * autocovariance(U1 + U2), U1, U2),
        "multiplicative source": driven(c * sp.exp(-P * T) * autocovariance(T)),
        "crossing b": driven(heard_after(T) * F * c * sp.exp(-P * T) * TOGETHER),
        "crossing a": 2
        * half_line(sp.exp(-MU * (U1 + U2 + U3)) * F * c * sp.exp(-P * (U2 + U3)) * heard_after(U1 + U2), U1, U2, U3),
    }


def test_the_terms_add_up_to_the_second_order_of_the_exact_moments() -> None:
    mean, first, second = second_order()
    ours = terms()
    assert sp.simplify(ours["shift"] - mean) == 0
    assert sp.simplify(ours["linear"] - first) == 0
    corrections = [value for key, value in ours.items() if key not in ("shift", "linear")]
    assert sp.simplify(sum(corrections) - second) == 0
    # none of the terms is there for nothing
    for left_out in range(len(corrections)):
        assert sp.simplify(sum(corrections[:left_out] + corrections[left_out + 1 :]) - second) != 0


@pytest.mark.parametrize(("decay_per_ms", "leak_nS"), [(0.5, 10.0), (0.1, 10.0), (0.11, 2.0)])
def test_the_program_has_the_same_coefficients(decay_per_ms: float, leak_nS: float) -> None:
    """Capacitance 100 pF, mean conductance 6 nS; events ever smaller and more, extrapolated to none."""
    capacitance, conductance, reversal, rest = 100.0, 6.0, 0.0, -70.0
    rate = 400.0
    jump = conductance * decay_per_ms / rate
    total = leak_nS + conductance
    force = reversal - (leak_nS * rest + conductance * reversal) / total
    values = {A: conductance / capacitance, MU: total / capacitance, P: decay_per_ms, F: force}
    mean, _, second = (float(one.subs(values)) for one in second_order())
    found = []
    for scale in (1.0, 0.5):
        answer = sphere_model(capacitance, leak_nS, rest, [(rate, jump, decay_per_ms, reversal)], scale).next_order()
        e = scale / rate
        change = answer.variance_mV2[0] - answer.linear.variance_mV2[0]
        found.append((change / e**2, (answer.mean_mV[0] - answer.linear.mean_mV[0]) / e))
    assert 2 * found[1][0] - found[0][0] == pytest.approx(second, rel=NEXT_ORDER)
    assert 2 * found[1][1] - found[0][1] == pytest.approx(mean, rel=ON_A_PATH)
