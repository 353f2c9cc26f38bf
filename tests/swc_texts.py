"""SWC texts, written by hand or by rule, that several tests read."""

import math

import numpy as np

from morphology.swc import read_swc, read_swc_text

CELL = """\
# an invented cell
1 1 0 0 0 8 -1
2 3 9 0 0 1 1
3 3 40 3 0 0.9 2
4 3 80 10 2 0.6 3
5 4 0 9 0 1.5 1
6 4 2 60 0 1.2 5
7 2 0 -9 0 0.5 1
8 2 0 -50 1 0.4 7
"""


def changed(line: int, new: str) -> str:
    """CELL with one line (from 1) replaced."""
    lines = CELL.split("\n")
    lines[line - 1] = new
    return "\n".join(lines)


def codes(text: str | bytes) -> set[str]:
    source = read_swc_text(text) if isinstance(text, str) else read_swc(text)
    return {f.code for f in source.findings}


def long_dendrite(rows: int, radius: str = "0.5", step: float = 5.0, kind: int = 3) -> str:
    lines = ["1 1 0 0 0 8 -1"]
    lines += [f"{i} {kind} {8 + step * (i - 1)} 0 0 {radius} {i - 1}" for i in range(2, rows + 2)]
    return "\n".join(lines)


def two_radii(rows: int) -> str:
    lines = long_dendrite(rows).split("\n")
    return "\n".join(line.replace(" 0.5 ", " 0.6 ") if n % 2 else line for n, line in enumerate(lines))


def ring(rows: int, pen: float = 0.2) -> str:
    """A soma drawn as a circle of radius 8 around (1, 2, 3), a dendrite on its first row."""
    angle = 2 * np.pi * np.arange(rows) / rows
    lines = [
        f"{i + 1} 1 {1 + 8 * math.cos(a)!r} {2 + 8 * math.sin(a)!r} 3 {pen} {i or -1}"
        for i, a in enumerate(angle.tolist())
    ]
    return "\n".join([*lines, f"{rows + 1} 3 30 2 3 0.7 1", f"{rows + 2} 3 60 2 3 0.7 {rows + 1}"])


def twiggy(twigs: int) -> str:
    """A dendrite with a one-row twig of 1.35 µm on every second row."""
    lines = [long_dendrite(2 * twigs + 2)]
    n = 2 * twigs + 4
    for k in range(twigs):
        row = 2 * k + 3
        lines.append(f"{n + k} 3 {8 + 5 * (row - 1)} 1.35 0 0.2 {row}")
    return "\n".join(lines)


def star(children: int) -> str:
    arms = [f"{i + 4} 3 {30 + i} 30 {i} 0.5 3" for i in range(children)]
    return "\n".join(["1 1 0 0 0 8 -1", "2 3 9 0 0 1 1", "3 3 30 0 0 1 2", *arms])
