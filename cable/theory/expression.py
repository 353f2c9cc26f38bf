"""A user's kernel expression: parsed from a whitelist of syntax, then turned into terms c·tⁿ·e^{-pt} exactly.

The text is walked as a syntax tree and only numbers, t, pi, + - * / **, exp, sin and cos are rebuilt in
sympy; nothing of it is ever evaluated as code.
"""

from __future__ import annotations

import ast
from typing import TYPE_CHECKING

import numpy as np

if TYPE_CHECKING:
    import sympy

    from cable.theory.kernel import Kernel

MAX_CHARACTERS, MAX_NODES, MAX_POWER, MAX_TERMS = 300, 120, 12, 24
ALLOWED = "numbers, t, pi, + - * / ** ( ), exp(), sin() and cos()"


def parse_expression(text: str) -> sympy.Expr:
    """The sympy expression, in the real symbol t, of arithmetic given as text.

    Raises:
        ValueError: anything but the allowed syntax, or too long.
    """
    import sympy

    if len(text) > MAX_CHARACTERS:
        raise ValueError(f"the expression has {len(text)} characters; at most {MAX_CHARACTERS} are read")
    try:
        tree = ast.parse(text.strip(), mode="eval")
    except (SyntaxError, ValueError, RecursionError, MemoryError):
        raise ValueError(f"{text!r} is not arithmetic in t: expected {ALLOWED}") from None
    if sum(1 for _ in ast.walk(tree)) > MAX_NODES:
        raise ValueError(f"the expression is too large: more than {MAX_NODES} parts")
    return _rebuild(tree.body, sympy.Symbol("t", positive=True))


def _rebuild(node: ast.expr, t: sympy.Symbol) -> sympy.Expr:
    import sympy

    match node:
        case ast.Constant(value=int() | float() as number) if not isinstance(number, bool):
            if not abs(number) < 1e12:
                raise ValueError(f"the number {number!r:.30} is too large for a kernel")
            return sympy.Rational(repr(number))
        case ast.Name(id="t"):
            return t
        case ast.Name(id="pi"):
            return sympy.pi
        case ast.UnaryOp(op=ast.USub(), operand=inner):
            return -_rebuild(inner, t)
        case ast.UnaryOp(op=ast.UAdd(), operand=inner):
            return _rebuild(inner, t)
        case ast.BinOp(left=left, op=ast.Pow(), right=right):
            power = _rebuild(right, t)
            if not (power.is_Integer and 0 <= power <= MAX_POWER):
                raise ValueError(f"a power must be a whole number from 0 to {MAX_POWER}, found {power}")
            return _rebuild(left, t) ** power
        case ast.BinOp(left=left, op=ast.Add() | ast.Sub() | ast.Mult() | ast.Div() as op, right=right):
            a, b = _rebuild(left, t), _rebuild(right, t)
            if isinstance(op, ast.Div):
                if b.is_zero:
                    raise ValueError("the expression divides by zero")
                return a / b
            return a + b if isinstance(op, ast.Add) else a - b if isinstance(op, ast.Sub) else a * b
        case ast.Call(func=ast.Name(id="exp" | "sin" | "cos" as name), args=[argument], keywords=[]):
            return getattr(sympy, name)(_rebuild(argument, t))
    found = ast.unparse(node)[:60]
    raise ValueError(f"{found!r} is not allowed in a kernel: expected {ALLOWED}")


def kernel_from_text(text: str) -> Kernel:
    """The kernel that `text` describes, scaled to a peak of 1.

    Raises:
        ValueError: as `Kernel.expression`.
    """
    import sympy

    from cable.theory.kernel import Kernel, peak_of
    from cable.theory.spelling import Term

    expression = parse_expression(text)
    t = sympy.Symbol("t", positive=True)
    found = _terms(expression, t, text)
    if not found:
        raise ValueError(f"{text!r} is zero at all times")
    for _, rate in found:
        if not complex(rate).real > 0:
            raise ValueError(f"{text!r} does not decay: expected every term to fall as exp(-t/decay) with decay > 0")
    s = sympy.Symbol("s")
    poles: dict[sympy.Expr, int] = {}
    for power, rate in found:
        poles[rate] = max(poles.get(rate, 0), power + 1)
    # over the common denominator Π(1 + s/p): each term c·n!/(s + p)^{n+1} brings the factors it lacks
    numerator = sympy.Integer(0)
    for (power, rate), factor in found.items():
        part = factor * sympy.factorial(power) / rate ** (power + 1)
        for pole, multiplicity in poles.items():
            part *= (1 + s / pole) ** (multiplicity - (power + 1 if pole == rate else 0))
        numerator += part
    coefficients = [complex(sympy.N(c, 40)).real for c in reversed(sympy.Poly(sympy.expand(numerator), s).all_coeffs())]
    while len(coefficients) > 1 and abs(coefficients[-1]) <= 1e-14 * max(abs(c) for c in coefficients):
        coefficients.pop()
    poles_per_ms = tuple(complex(p) if sympy.im(p) != 0 else float(p) for p, m in poles.items() for _ in range(m))
    terms = tuple(Term(complex(f), n, complex(p)) for (n, p), f in found.items())
    kernel = Kernel(terms, tuple(coefficients), poles_per_ms, text)
    _, peak = peak_of(kernel.value, poles_per_ms)
    if not (np.isfinite(peak) and peak > 0):
        raise ValueError(f"{text!r} has no positive peak; write the kernel so that its largest value is positive")
    scaled = tuple(Term(term.factor / peak, term.power, term.rate_per_ms) for term in terms)
    return Kernel(scaled, tuple(c / peak for c in coefficients), poles_per_ms, f"({text.strip()})/{peak!r}")


def _terms(expression: sympy.Expr, t: sympy.Symbol, text: str) -> dict[tuple[int, sympy.Expr], sympy.Expr]:
    """{(n, p): c} with the expression equal to the sum of c·tⁿ·e^{-pt}, exact."""
    import sympy

    wanted = f"{text!r} is not a sum of terms like t**2*exp(-t/3) or exp(-t/5)*cos(2*t), whose transform is exact"
    flat = sympy.expand(expression.rewrite(sympy.exp), power_base=True, power_exp=False)
    summands = sympy.Add.make_args(sympy.expand(sympy.powsimp(flat)))
    if len(summands) > MAX_TERMS:
        raise ValueError(f"{text!r} expands into {len(summands)} terms; at most {MAX_TERMS} are taken")
    found: dict[tuple[int, sympy.Expr], sympy.Expr] = {}
    for summand in summands:
        if summand.is_zero:
            continue
        power, exponent, factor = 0, sympy.Integer(0), sympy.Integer(1)
        for part in sympy.Mul.make_args(summand):
            if isinstance(part, sympy.exp):
                exponent += part.args[0]
            elif part == t:
                power += 1
            elif part.is_Pow and part.base == t and part.exp.is_Integer and part.exp > 0:
                power += int(part.exp)
            elif not part.has(t):
                factor *= part
            else:
                raise ValueError(wanted)
        line = sympy.Poly(sympy.expand(exponent), t) if exponent.is_polynomial(t) else None
        if line is None or line.degree() > 1:
            raise ValueError(wanted)
        rate = sympy.nsimplify(-line.coeff_monomial(t))
        factor *= sympy.exp(line.coeff_monomial(1))
        key = (power, rate)
        found[key] = sympy.simplify(found.get(key, 0) + factor)
    return {key: factor for key, factor in found.items() if factor != 0}
