"""Integrals of spectra over frequency, with the nodes that suit one cell and its inputs."""

from __future__ import annotations

import cmath
import math
from collections.abc import Callable
from dataclasses import dataclass, replace
from functools import partial

import numpy as np
from numpy.typing import NDArray

from cable.network.quadrature import BLOCK, Integral, NotConverged, integrate
from cable.noise.operating_point import OperatingPoint
from cable.noise.smoothing import Smoothing

Floats = NDArray[np.float64]
VARIANCE_FINITE_ABOVE = 1.0  # the power of 1/ω above which ∫S dω is finite
VALUES_AT_ONCE = 300_000  # nodes times frequencies; smaller blocks cost more in calls, larger ones memory
DERIVATIVE_FINITE_ABOVE = 3.0  # the power of 1/ω above which ∫ω²S dω is finite


@dataclass(frozen=True, eq=False)
class SpectralIntegral:
    """An integral of spectra.

    Attributes:
        found: the integral.
        seen: the mean state whose spectra were summed: that of the model, with spectra of regular spike trains
            smoothed to the nodes where that saves frequencies.
        at_zero: (...) the spectra at ω = 0, not smoothed.
    """

    found: Integral
    seen: OperatingPoint
    at_zero: Floats

    @property
    def value(self) -> Floats:
        """The integrals, of the shape that the spectra have."""
        return self.found.value

    @property
    def relative_error(self) -> float:
        """The certified error."""
        return self.found.relative_error


def integrate_spectra(
    point: OperatingPoint,
    spectra: Callable[[OperatingPoint, Floats], Floats],
    scale: Callable[[Floats], Floats],
    tolerance: float,
    power: Floats,
    derivative: bool = False,
) -> SpectralIntegral:
    """(1/π)∫₀^∞ of spectra around an operating point, certified to `tolerance`.

    Args:
        point: the mean state; its membrane, kernels and spike trains place the nodes.
        spectra: maps the mean state, with or without smoothed trains, and ω (F,) to values (..., F), even in ω and
            linear in the spectra of spike trains.
        scale: maps the integrals to the positive numbers that errors are measured by.
        tolerance: wanted relative error.
        power: the powers of 1/ω that the spectra fall with, see `cable.noise.steepness`.
        derivative: whether ω² times a spectrum is among them.

    Raises:
        NotConverged: the tolerance cannot be reached.
    """
    if not _trains_ring(point):
        omega0 = slowest_rate_per_ms(point)
        reach, strip = range_u(point, power, derivative, tolerance, omega0), analytic_strip(point, omega0)
        found = integrate(partial(spectra, point), scale, omega0, tolerance, reach, strip, block=block_for(point))
        return SpectralIntegral(found, point, found.at_zero)
    omega0 = cell_rate_per_ms(point)

    def smoothed(step: float) -> OperatingPoint:
        return replace(point, smoothing=Smoothing(omega0, step))

    found = integrate(
        partial(spectra, point),
        scale,
        omega0,
        tolerance,
        range_u(point, power, derivative, tolerance, omega0),
        cell_strip(point, omega0) / 2,  # sinc interpolation errs by the root of the trapezoidal rule's error
        adapted=lambda step: partial(spectra, smoothed(step)),
        block=block_for(point),
    )
    return SpectralIntegral(found, smoothed(found.step), spectra(point, np.zeros(1))[..., 0])


def block_for(point: OperatingPoint) -> int:
    """How many frequencies to handle at once, so that memory stays bounded on the largest cells."""
    return max(2, min(BLOCK, VALUES_AT_ONCE // len(point.layout.parent)))


def _trains_ring(point: OperatingPoint) -> bool:
    """Whether spike trains are so regular that smoothing them for the nodes saves frequencies."""
    omega0 = slowest_rate_per_ms(point)
    dead = any(one.spike_train.dead_time_ms > 0 for one in point.model.inputs)
    return dead or analytic_strip(point, omega0) < cell_strip(point, omega0) / 2


def cell_rate_per_ms(point: OperatingPoint) -> float:
    """The slowest rate of the membrane and of all kernels, 1/ms."""
    return min([point.network.slowest_rate_per_ms, *(one.kernel.slowest_rate_per_ms for one in point.model.inputs)])


def slowest_rate_per_ms(point: OperatingPoint, dead_times: bool = True) -> float:
    """The slowest rate of the membrane, of all kernels and of all spike trains (dead times among them), 1/ms."""
    return min([cell_rate_per_ms(point), *map(abs, _train_poles(point, dead_times))])


def analytic_strip(point: OperatingPoint, omega0: float, dead_times: bool = True) -> float:
    """Half width of the strip in u = asinh(ω/ω₀) that no pole of the kernels or spike trains enters."""
    trains = [abs(cmath.asinh(1j * p / omega0).imag) for p in _train_poles(point, dead_times)]
    return min([cell_strip(point, omega0), *trains])


def cell_strip(point: OperatingPoint, omega0: float) -> float:
    """Half width of the strip in u = asinh(ω/ω₀) that no pole of the kernels enters."""
    poles = [p for one in point.model.inputs for p in one.kernel.poles_per_ms]
    return min([math.pi / 2, *(abs(cmath.asinh(1j * p / omega0).imag) for p in poles)])


def _train_poles(point: OperatingPoint, dead_times: bool) -> list[complex]:
    inputs = [one for one in point.model.inputs if dead_times or one.spike_train.dead_time_ms == 0]
    return [p for one in inputs for p in one.spike_train.poles_per_ms(one.rate_Hz)]


def range_u(point: OperatingPoint, power: Floats, derivative: bool, tolerance: float, slowest: float) -> float:
    """Where in u = asinh(ω/ω₀) the integrand has fallen to the tolerance, from its power at high frequency.

    Raises:
        NotConverged: a spectrum whose integral is infinite.
    """
    check_finite(power)
    corner = max([slowest, *(abs(p) for one in point.model.inputs for p in one.kernel.poles_per_ms)])
    finite = power[np.isfinite(power)]
    decay = float(finite.min(initial=6.0)) - 1.0
    if derivative:
        smooth = finite[finite > DERIVATIVE_FINITE_ABOVE]
        decay = min(decay, float(smooth.min(initial=6.0)) - 3.0)
    return math.asinh(corner / slowest) + math.log(1 / tolerance) / decay


def check_finite(power: Floats) -> None:
    """Raise NotConverged where a spectrum falls so slowly, as this power of 1/ω, that the variance is infinite."""
    if (power <= VARIANCE_FINITE_ABOVE).any():
        raise NotConverged(
            "the variance is infinite at a place asked for: point synapses whose charge comes at once sit there on a "
            "neurite; give them a kernel, or spread them over a zone"
        )
