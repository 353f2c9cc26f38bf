"""A user's kernel expression: parsed from a whitelist of syntax, then turned into terms c·tⁿ·e^{-pt} exactly.

The text is walked as a syntax tree and only numbers, t, pi, + - * / **, exp, sin and cos are rebuilt in
sympy; nothing of it is ever evaluated as code.
"""

from __future__ import annotations

import ast
import math
from typing import TYPE_CHECKING

import numpy as np

if TYPE_CHECKING:
    import sympy

    from cable.theory.kernel import Kernel

MAX_CHARACTERS, MAX_NODES, MAX_POWER, MAX_TERMS = 300, 120, 12, 24
MAX_EXPANSION, MAX_DIGITS = 48.0, 400.0  # before like terms are put together
CANCELLED = 1e-30  # of its largest part, below which a sum is zero
LARGEST_EXPONENT = 1000  # of 2, in a number that is no fraction
MOST_RADIANS = 1000.0  # of an oscillation in the slowest decay time; its highest cycle must be found
SMALLEST, LARGEST = 1e-12, 1e100  # of rates in 1/ms; of any number
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
    _check_size(tree.body)
    return _rebuild(tree.body, sympy.Symbol("t", positive=True))


def _check_size(node: ast.expr) -> tuple[float, float]:
    """Bounds on how many terms and digits a part expands into, before anything is expanded.

    Raises:
        ValueError: more than `MAX_EXPANSION` terms or `MAX_DIGITS` digits.
    """
    terms, digits = 1.0, 1.0
    match node:
        case ast.Constant(value=int() | float() as number):
            digits = float(min(len(repr(number)) if abs(number) < 1e12 else 1, MAX_CHARACTERS))
        case ast.UnaryOp(operand=inner):
            terms, digits = _check_size(inner)
        case ast.BinOp(left=left, op=ast.Pow(), right=ast.Constant(value=int() as power)) if 0 <= power <= MAX_POWER:
            base, each = _check_size(left)
            # the ways to choose `power` of so many terms, with repetition
            terms = math.prod((base + k) / (k + 1) for k in range(power))
            digits = power * each
        case ast.BinOp(left=left, op=op, right=right):
            (a, more), (b, others) = _check_size(left), _check_size(right)
            terms = a + b if isinstance(op, ast.Add | ast.Sub) else a * b
            digits = more + others
        case ast.Call(func=ast.Name(id=name), args=[argument]):
            _, digits = _check_size(argument)
            terms = 1.0 if name == "exp" else 2.0
    if terms > MAX_EXPANSION or digits > MAX_DIGITS:
        raise ValueError("the expression expands into more terms or digits than a kernel has; write it more simply")
    return terms, digits


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
    sizes = [*coefficients, *map(abs, poles_per_ms), *(abs(term.factor) for term in terms)]
    if not all(abs(size) < LARGEST for size in sizes) or not all(SMALLEST < abs(p) for p in poles_per_ms):
        raise ValueError(f"{text!r} holds numbers too large or too small for a kernel in ms")
    rings, slow = max(abs(complex(p).imag) for p in poles_per_ms), min(complex(p).real for p in poles_per_ms)
    if rings > MOST_RADIANS * slow:
        raise ValueError(
            f"{text!r} turns by {rings / slow:.3g} radians while it decays, expected at most {MOST_RADIANS:g}; "
            "take the fast oscillation out, which the membrane does not follow"
        )
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
    largest: dict[tuple[int, sympy.Expr], float] = {}
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
        key = (power, _rational(-line.coeff_monomial(t)))
        factor = _rational(factor * sympy.exp(line.coeff_monomial(1)))
        found[key] = sympy.expand(found.get(key, 0) + factor)
        largest[key] = max(largest.get(key, 0.0), abs(complex(factor)))
    return {key: factor for key, factor in found.items() if abs(complex(factor)) > CANCELLED * largest[key]}


def _rational(number: sympy.Expr) -> sympy.Expr:
    """A complex number as one with rational parts, exact or to 45 digits: algebra with π or sin(1) would never end."""
    import sympy

    parts = []
    for part in sympy.N(number, 50).as_real_imag() if not number.is_Rational else (number, sympy.Integer(0)):
        if part.is_Rational:
            parts.append(part)
            continue
        _, digits, exponent, bits = part._mpf_
        size = exponent + bits if digits else -2 * LARGEST_EXPONENT
        if not size < LARGEST_EXPONENT:
            raise ValueError("the expression holds numbers too large for a kernel")
        tiny = size < -LARGEST_EXPONENT
        parts.append(sympy.Integer(0) if tiny else _short(sympy.Rational(str(sympy.N(part, 45)))))
    return parts[0] + sympy.I * parts[1]


def _short(number: sympy.Rational) -> sympy.Rational:
    """The simple fraction that a number with 45 digits stands for, where there is one."""
    simple = number.limit_denominator(10**15)
    return simple if abs(simple - number) <= abs(number) / 10**40 else number
