"""Covariances against lag.

The covariance at lag τ > 0 is (1/2π)∫ S(ω) e^{iωτ} dω. Its path is bent into the upper half plane, ω =
ω₀ sinh(v + ia/2), with a the half width of the strip in u = asinh(ω/ω₀) that no pole enters (π/2 for a
passive tree, whose poles lie on the imaginary axis, less for ringing kernels): there the integrand decays
faster than any exponential for τ > 0, stays analytic within a/2 of the path, and the trapezoidal rule errs by
e^{-πa/h} at every lag alike. One set of nodes serves all lags; rules with h and 2h certify it. So the
covariance is a sum of waves e^{iω|τ|}; for spike trains with a dead time it is a sum of such waves convolved
with the train's own correlation (`cable.theory.dead_time`).
"""

from __future__ import annotations

import math
from concurrent.futures import ThreadPoolExecutor
from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from cable.network.quadrature import NotConverged
from cable.noise.cross import BLOCK, cross_spectra, rows
from cable.noise.integral import analytic_strip, check_finite, slowest_rate_per_ms
from cable.noise.steepness import falls_as
from cable.theory.dead_time import DeadTime

if TYPE_CHECKING:
    from cable.noise.model import CableModel

Floats = NDArray[np.float64]
Complexes = NDArray[np.complex128]
SAFETY = 10.0
MAX_NODES = 4000
PROBES = np.r_[0.0, np.geomspace(1e-3, 30.0, 12)]  # lags over 1/ω₀ at which the rules are compared at least


@dataclass(frozen=True, eq=False)
class Waves:
    """Covariances among a few sites, known at every lag.

    Attributes:
        omega: (F,) complex frequencies, rad/ms.
        weighted: (rows, sites, sites, F) what each wave counts; [a, b] is that of E[V_b(t) V_a(t + lag)].
        dead_times: per row, the dead time of its spike trains, None where they have none.
        parts: per row, which part (an input, or what inputs share) it belongs to.
    """

    omega: Complexes
    weighted: Complexes
    dead_times: tuple[DeadTime | None, ...]
    parts: tuple[int, ...]

    def at(self, lag_ms: Floats) -> Floats:
        """(parts, sites, sites, L) with [a, b] = E[V_a(t) V_b(t + lag)] about the means, at lags (L,), mV²."""
        lag = np.asarray(lag_ms, dtype=float)
        size, place = np.unique(np.abs(lag), return_inverse=True)
        wave = np.exp(1j * self.omega * size[:, None])
        result = np.zeros((max(self.parts, default=-1) + 1, *self.weighted.shape[1:3], len(lag)))
        for k, weighted, dead in zip(self.parts, self.weighted, self.dead_times, strict=True):
            # [a, b] is the covariance in which a is behind b
            if dead is None:
                behind = (weighted @ wave.T).real
            else:
                own, other = dead.waves(size, self.omega)
                behind = (weighted @ own.T + weighted.swapaxes(0, 1) @ other.T).real
            turned = behind.swapaxes(0, 1)
            result[k] += np.where(lag < 0, behind[..., place], turned[..., place])
        return result

    def every_second(self) -> Waves:
        """The rule of twice the step."""
        return Waves(self.omega[::2], 2 * self.weighted[..., ::2], self.dead_times, self.parts)


@dataclass(frozen=True, eq=False)
class Covariances:
    """Covariances of all pairs among a few sites as functions of lag.

    Attributes:
        sites: names of the sites.
        lag_ms: (L,) lags, negative ones allowed.
        by_input_mV2: per input, and for shared spikes, (sites, sites, L) with [a, b, l] = E[V_a(t) V_b(t + lag)]
            about the means.
        at_zero_mV2: (parts, sites, sites) covariances at lag 0, per input and for shared spikes.
        relative_error: certified bound, relative to the geometric mean of the two variances.
        waves: the covariances at any other lag.
    """

    sites: tuple[str, ...]
    lag_ms: Floats
    by_input_mV2: dict[str, Floats]
    at_zero_mV2: Floats
    relative_error: float
    waves: Waves

    @property
    def covariance_mV2(self) -> Floats:
        """(sites, sites, L) sum over the inputs."""
        none = np.zeros((len(self.sites), len(self.sites), len(self.lag_ms)))
        return np.sum([*self.by_input_mV2.values(), none], axis=0)


def covariances(model: CableModel, sites: tuple[str, ...], lag_ms: Floats, tolerance: float = 1e-9) -> Covariances:
    """Covariances between all pairs of `sites` at the lags (L,), to `tolerance` of the variances at every lag.

    Raises:
        KeyError: a site that the model has not.
        NotConverged: the tolerance cannot be reached, or a dead time takes up almost all of the mean interval.
    """
    lag = np.asarray(lag_ms, dtype=float)
    point = model.refined.point
    nodes = [model.node_of(site) for site in sites]
    check_finite(falls_as(point)[nodes])
    poles = [p for one in model.inputs for p in one.kernel.poles_per_ms]
    omega0 = slowest_rate_per_ms(point, dead_times=False)
    tilt = analytic_strip(point, omega0, dead_times=False) / 2
    step = 2 * math.pi * tilt / math.log(100 * SAFETY / tolerance)
    order = rows(point)
    dead, parts = _dead_times(model, [train for _, train in order]), tuple(part for part, _ in order)

    def block(start: int) -> tuple[Complexes, Complexes]:
        index = np.arange(start, start + BLOCK)
        omega = omega0 * np.sinh(index * step + 1j * tilt)
        weight = omega0 * np.cosh(index * step + 1j * tilt) * step / math.pi * np.where(index == 0, 0.5, 1.0)
        return omega, cross_spectra(point, nodes, 1j * omega, dead_times=False) * weight

    reach = math.asinh(max(abs(p) for p in poles) / omega0) + math.log(1 / tolerance) / 2.5 if poles else 1.0
    found: list[tuple[Complexes, Complexes]] = []
    with ThreadPoolExecutor(2) as pool:
        more = 2 * max(1, math.ceil(reach / step / BLOCK / 2))
        while True:
            start = BLOCK * len(found)
            found += pool.map(block, range(start, start + BLOCK * more, BLOCK))
            more = 2
            omega, weighted = (np.concatenate(part, axis=-1) for part in zip(*found, strict=True))
            waves = Waves(omega, weighted, dead, parts)
            zero = waves.at(np.zeros(1))[..., 0]
            variance = np.diag(zero.sum(axis=0))
            size = np.sqrt(np.outer(variance, variance).clip(min=0))
            size = np.where(size > 0, size, 1.0)
            left_out = float(np.max(np.abs(waves.weighted[..., -1].sum(axis=0)) / size, initial=0.0))
            left_out /= -math.expm1(-step)
            if left_out <= 0.3 * tolerance:
                break
            if len(waves.omega) > MAX_NODES:
                raise NotConverged("the cross-spectrum falls too slowly for its integral to be certified")
    probes = np.r_[lag, PROBES / omega0, -PROBES / omega0]
    values = waves.at(probes)
    change = (values - waves.every_second().at(probes)).sum(axis=0)
    difference = float(np.max(np.abs(change) / size[..., None], initial=0.0))
    error = left_out + SAFETY * difference * math.exp(-math.pi * tilt / step)
    if error > tolerance:
        raise NotConverged(f"the covariance reached a relative error of {error:.1e}, not {tolerance:.1e}")
    by_input = dict(zip(model.part_names, values[..., : len(lag)], strict=True))
    return Covariances(tuple(sites), lag, by_input, zero, error, waves)


def _dead_times(model: CableModel, trains: list[int | None]) -> tuple[DeadTime | None, ...]:
    found: list[DeadTime | None] = []
    try:
        for train in trains:
            one = model.inputs[train] if train is not None else None
            regular = one is not None and one.spike_train.dead_time_ms > 0 and one.rate_Hz > 0
            found.append(DeadTime(one.rate_Hz, one.spike_train.dead_time_ms) if one is not None and regular else None)
    except ValueError as error:
        raise NotConverged(f"covariances against lag: {error}") from None
    return tuple(found)
