"""Integrals over the spectrum of a record: (1/π)∫₀^∞ f(ω) dω, f of spectra behind an electrode's filters.

Filters have poles, which join those of the cell, so that the certified rule holds. Windows whose trend is
removed have none: their factor 1 - r(ωW/2) oscillates. What they take off is integrated by itself, with Gauss
points in each half turn of the oscillation (in shorter panels where a pole is near) and, beyond, with its
average and the first term that this leaves.
"""

from __future__ import annotations

import cmath
import math
from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from cable.network.quadrature import integrate
from cable.noise.integral import analytic_strip, range_u, slowest_rate_per_ms
from cable.noise.operating_point import OperatingPoint
from cable.noise.steepness import falls_as
from cable.theory.electrode import Electrode
from cable.theory.filters import removed_by_trend

Floats = NDArray[np.float64]
HALF_TURNS, GAUSS, BLOCK = 48, 8, 8
WIDEST, LONGEST = 1.0, 45.0  # panels in log ω beyond the half turns: width of one, length of all
# the share of the power that is removed, averaged over an oscillation, is a/x², its square b/x⁴; what this leaves
# of the integral beyond X is c·f/X³
AVERAGE = {"mean": (0.5, 0.375, -0.25), "line": (2.0, 4.5, -0.5)}


@dataclass(frozen=True, eq=False)
class RecordIntegral:
    """Integrals (rows,), the functions at ω = 0 (rows,), and the error relative to the rows' scales."""

    value: Floats
    at_zero: Floats
    relative_error: float


def integral(
    point: OperatingPoint,
    nodes: list[int],
    electrodes: tuple[Electrode, ...],
    function: Callable[[Floats], Floats],
    degree: NDArray[np.int64],
    scale: Callable[[Floats], Floats],
    tolerance: float,
) -> RecordIntegral:
    """Integrals of functions of spectra at `nodes`, behind the filters of `electrodes` (none: as it is there).

    Args:
        point: the operating point.
        nodes: where the spectra are.
        electrodes: whose filters `function` has applied; the window of the first is applied here.
        function: maps ω (F,) to (rows, F).
        degree: (rows,) 1 for a spectrum, 2 for a product of two.
        scale: maps the integrals to the numbers that errors are measured by.
        tolerance: wanted relative error.

    Raises:
        NotConverged: the tolerance cannot be reached.
    """
    slowest = slowest_rate_per_ms(point)
    poles = [complex(p) for one in electrodes for p in one.poles_per_ms]
    omega0 = min([slowest, *(abs(p) for p in poles)])
    strip = min([analytic_strip(point, omega0), *(abs(cmath.asinh(1j * p / omega0).imag) for p in poles)])
    reach = range_u(point, falls_as(point)[nodes], False, tolerance, slowest) + math.log(slowest / omega0)
    crowded = any(one.spike_train.dead_time_ms > 0 for one in point.model.inputs)
    found = integrate(function, scale, omega0, tolerance, reach, strip, crowded)
    value, error = found.value, found.relative_error
    window_s = electrodes[0].window_s if electrodes else None
    if window_s is None:
        return RecordIntegral(value, found.at_zero, error)
    size, panels = np.abs(value), (omega0, strip)
    change, rest = _removed(function, degree, 1e3 * window_s, electrodes[0].trend, panels, size)
    value = value + change
    size = scale(value)
    left = np.max(np.abs(rest) / np.where(size > 0, size, 1.0), initial=0.0)
    return RecordIntegral(value, np.zeros_like(value), error + float(left))


def _removed(
    function: Callable[[Floats], Floats],
    degree: NDArray[np.int64],
    window_ms: float,
    trend: str,
    panels: tuple[float, float],
    size: Floats,
) -> tuple[Floats, Floats]:
    """(rows,) what the windows change in the integrals, and a bound of its error.

    `panels` are the slowest rate and the angle from the real axis that no pole of the functions goes below.
    """
    per_x, (omega0, strip) = 2 / window_ms, panels
    at, weight = np.polynomial.legendre.leggauss(GAUSS)
    edge = HALF_TURNS * np.pi
    graded = omega0 / per_x / 2 * np.exp(np.arange(0.0, 200.0, min(0.5, strip)))
    ends = np.unique(np.r_[np.pi * np.arange(HALF_TURNS + 1), graded[graded < edge]])
    width = np.diff(ends)[:, None]
    x = (ends[:-1, None] + width * (at + 1) / 2).ravel()
    factor = (1 - removed_by_trend(x, trend)) ** degree[:, None] - 1
    total = (_values(function, per_x * x) * factor) @ (width / 2 * weight).ravel()
    single, square, left = AVERAGE[trend]
    step = min(WIDEST, 2 * strip)
    for start in np.arange(0.0, LONGEST, step):
        x = edge * np.exp(start + step * (at + 1) / 2)
        average = -degree[:, None] * single / x**2 + np.where(degree == 2, square, 0.0)[:, None] / x**4
        part = (_values(function, per_x * x) * average * x) @ (weight * step / 2)
        total = total + part
        if np.all(np.abs(part) * per_x <= 1e-13 * size):
            break
    rest = -degree * left * function(np.array([per_x * edge]))[:, 0] / edge**3
    return (total + rest) * per_x / np.pi, rest * per_x / np.pi


def _values(function: Callable[[Floats], Floats], omega: Floats) -> Floats:
    return np.concatenate([function(omega[k : k + BLOCK]) for k in range(0, len(omega), BLOCK)], axis=-1)
