"""What became of a kernel expression: a refusal, or a kernel that is the expression up to its scale."""

from __future__ import annotations

import ast
import cmath
import math
import random
from pathlib import Path

import numpy as np

from cable.theory.kernel import Kernel
from hostile.guards import Defect, clean_refusal, guarded, nothing_executes
from tolerances import HOSTILE_PEAK, HOSTILE_ROUND_OFF


def try_expression(text: str, folder: Path, draw: random.Random) -> str:
    """The verdict on a kernel expression: a refusal, or a kernel that is the expression up to its scale."""

    def work() -> str:
        try:
            kernel = Kernel.expression(text)
        except ValueError as error:
            return clean_refusal(ValueError(str(error).encode("unicode_escape").decode("ascii")))
        same_as_text(kernel, text)
        return "answered"

    with nothing_executes(folder):
        return guarded(work)


def same_as_text(kernel: Kernel, text: str) -> None:
    """Check a kernel against the expression, evaluated by plain complex arithmetic that knows no terms."""
    slow, fast = kernel.slowest_rate_per_ms, max(abs(p) for p in kernel.poles_per_ms)
    times = np.geomspace(1e-6 / fast, 8 / slow, 25)  # at 0 the text may divide by t
    tree = ast.parse(text.strip(), mode="eval").body
    try:
        said = np.array([plain(tree, float(t)) for t in times])
    except (OverflowError, ZeroDivisionError):
        return  # the exponentials of the text leave double precision one by one
    found, most = kernel.value(times), np.abs(said).max()
    if not np.isfinite(found).all() or np.abs(found).max() > 1 + HOSTILE_PEAK:
        raise Defect(f"the kernel of {text!r} is not finite, or beyond its peak of 1")
    at = int(np.argmax(np.abs(said)))
    scale = found[at] / said[at] if said[at] else math.nan
    # the sum of large terms that nearly cancel keeps fewer digits, in either way to add them
    terms = max(abs(term.factor) * (term.power / (math.e * complex(term.rate_per_ms).real)) ** term.power
                for term in kernel.terms)  # fmt: skip
    slack = HOSTILE_ROUND_OFF * max(1.0, terms)
    if most and not (np.abs(found - scale * said) <= slack).all():
        raise Defect(f"the kernel of {text!r} is not what the text says")


def plain(node: ast.expr, t: float) -> float:
    """Arithmetic in t at one time, as a pocket calculator does it."""
    match node:
        case ast.Constant(value=number):
            return float(number)
        case ast.Name(id="t"):
            return t
        case ast.Name(id="pi"):
            return math.pi
        case ast.UnaryOp(op=ast.USub(), operand=inner):
            return -plain(inner, t)
        case ast.UnaryOp(op=ast.UAdd(), operand=inner):
            return plain(inner, t)
        case ast.BinOp(left=left, op=op, right=right):
            a, b = plain(left, t), plain(right, t)
            match op:
                case ast.Add():
                    return a + b
                case ast.Sub():
                    return a - b
                case ast.Mult():
                    return a * b
                case ast.Div():
                    return a / b
                case ast.Pow():
                    return a**b
        case ast.Call(func=ast.Name(id=name), args=[argument]):
            return {"exp": cmath.exp, "sin": cmath.sin, "cos": cmath.cos}[name](plain(argument, t)).real
    raise Defect(f"accepted {ast.unparse(node)!r}, which is no arithmetic in t")
