"""A kernel as a person writes it: its terms c·tⁿ·e^{-pt} with short numbers, as plain arithmetic or as LaTeX."""

from __future__ import annotations

import cmath
from dataclasses import dataclass

SIGNIFICANT = 4


@dataclass(frozen=True)
class Term:
    """One term c·tⁿ·e^{-pt} of a kernel, t in ms; complex p come in conjugate pairs."""

    factor: complex
    power: int
    rate_per_ms: complex


@dataclass(frozen=True)
class Style:
    """How the parts of a term are written: format strings, and what stands between factors."""

    times: str
    power: str
    decay: str
    cosine: str
    exponent: str
    impulse: str


PLAIN = Style("*", "t**{}", "exp(-t/{})", "cos({}*t{})", "{}e{}", "impulse")
LATEX = Style(r" \, ", "t^{{{}}}", "e^{{-t/{}}}", r"\cos({} t{})", r"{} \times 10^{{{}}}", r"\delta(t)")


def spelled(terms: tuple[Term, ...], style: Style) -> str:
    """The sum of `terms` (none: the impulse); a conjugate pair becomes one cosine with its phase."""
    parts: list[tuple[bool, str]] = []
    for term in terms:
        rate, factor = complex(term.rate_per_ms), complex(term.factor)
        if rate.imag < 0:
            continue  # its partner speaks for both
        # 2 Re[c e^{-i·Im p·t}] = 2|c| cos(Im p·t - arg c)
        rings = rate.imag > 0
        size = 2 * abs(factor) if rings else factor.real
        number = _number(abs(size), style)
        factors = [] if number == "1" else [number]
        if term.power:
            factors.append("t" if term.power == 1 else style.power.format(term.power))
        time = _number(1 / rate.real, style)
        factors.append(style.decay.format(f"({time})" if " " in time else time))
        if rings:
            phase = -cmath.phase(factor)
            shift = "" if abs(phase) < 1e-12 else f" {'-' if phase < 0 else '+'} {_number(abs(phase), style)}"
            factors.append(style.cosine.format(_number(rate.imag, style), shift))
        parts.append((size < 0, style.times.join(factors)))
    if not parts:
        return style.impulse
    (minus, first), *others = sorted(parts, key=lambda part: part[0])  # a sum reads better when it begins with a plus
    return ("-" if minus else "") + first + "".join(f" {'-' if less else '+'} {part}" for less, part in others)


def _number(value: float, style: Style) -> str:
    mantissa, _, exponent = f"{value:.{SIGNIFICANT}g}".partition("e")
    return style.exponent.format(mantissa, int(exponent)) if exponent else mantissa
