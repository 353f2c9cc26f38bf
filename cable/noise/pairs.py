"""Two electrodes: cross-covariance against lag, correlation, coherence and phase.

The covariance at lag τ > 0 is (1/2π)∫ S(ω) e^{iωτ} dω. Its path is bent into the upper half plane, ω =
ω₀ sinh(v + ia/2), with a the half width of the strip in u = asinh(ω/ω₀) that no pole enters (π/2 for a
passive tree, whose poles lie on the imaginary axis, less for ringing kernels): there the integrand decays
faster than any exponential for τ > 0, stays analytic within a/2 of the path, and the trapezoidal rule errs by
e^{-πa/h} at every lag alike. One set of nodes serves all lags; rules with h and 2h certify it.
"""

from __future__ import annotations

import math
from concurrent.futures import ThreadPoolExecutor
from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from cable.network.quadrature import NotConverged
from cable.noise.cross import BLOCK, by_frequency, cross_spectra
from cable.noise.integral import analytic_strip, slowest_rate_per_ms

if TYPE_CHECKING:
    from cable.noise.model import CableModel

Floats = NDArray[np.float64]
SAFETY = 10.0
MAX_NODES = 4000


@dataclass(frozen=True, eq=False)
class Covariances:
    """Covariances of all pairs among a few sites as functions of lag.

    Attributes:
        sites: names of the sites.
        lag_ms: (L,) lags, negative ones allowed.
        by_input_mV2: per input, (sites, sites, L) with [a, b, l] = E[V_a(t) V_b(t + lag)] about the means.
        at_zero_mV2: (inputs, sites, sites) covariances at lag 0, per input.
        relative_error: certified bound, relative to the geometric mean of the two variances.
    """

    sites: tuple[str, ...]
    lag_ms: Floats
    by_input_mV2: dict[str, Floats]
    at_zero_mV2: Floats
    relative_error: float

    @property
    def covariance_mV2(self) -> Floats:
        """(sites, sites, L) sum over the inputs."""
        return np.sum(list(self.by_input_mV2.values()), axis=0)


def covariances(model: CableModel, sites: tuple[str, ...], lag_ms: Floats, tolerance: float = 1e-9) -> Covariances:
    """Covariances between all pairs of `sites` at the lags (L,), to `tolerance` of the variances at every lag.

    Raises:
        KeyError: a site that the model has not.
        NotConverged: the tolerance cannot be reached; a spike train with a dead time has covariances with kinks
            at its multiples, for which the bent path has no strip.
    """
    lag = np.r_[0.0, np.asarray(lag_ms, dtype=float)]  # lag 0 gives the variances that errors are measured by
    point = model.refined.point
    nodes = [model.node_of(site) for site in sites]
    if any(one.spike_train.dead_time_ms > 0 for one in model.inputs):
        raise NotConverged(
            "covariances against lag are not certified for spike trains with a dead time; use a gamma process"
        )
    poles = [p for one in model.inputs for p in one.kernel.poles_per_ms]
    omega0 = slowest_rate_per_ms(point)
    tilt = analytic_strip(point, omega0) / 2
    step = 2 * math.pi * tilt / math.log(100 * SAFETY / tolerance)

    def block(start: int) -> tuple[Floats, Floats, Floats]:
        index = np.arange(start, start + BLOCK)
        omega = omega0 * np.sinh(index * step + 1j * tilt)
        weight = omega0 * np.cosh(index * step + 1j * tilt) * step / math.pi * np.where(index == 0, 0.5, 1.0)
        # E[V_a* V_b] is the cross-spectrum of (b, a); for negative lags the two change places
        spectrum = cross_spectra(point, nodes, 1j * omega) * weight
        wave = np.exp(1j * omega * np.abs(lag)[:, None])
        forward = np.einsum("kbaf,lf->kablf", spectrum, wave).real
        backward = np.einsum("kabf,lf->kablf", spectrum, wave).real
        terms = np.where((lag < 0)[:, None], backward, forward)
        return terms.sum(axis=-1), 2 * terms[..., index % 2 == 0].sum(axis=-1), np.abs(spectrum[..., -1].sum(axis=0))

    reach = math.asinh(max(abs(p) for p in poles) / omega0) + math.log(1 / tolerance) / 2.5 if poles else 1.0
    total = coarse = np.zeros(())
    with ThreadPoolExecutor(2) as pool:
        start, more = 0, 2 * max(1, math.ceil(reach / step / BLOCK / 2))
        while True:
            found = list(pool.map(block, range(start, start + BLOCK * more, BLOCK)))
            start, more = start + BLOCK * more, 2
            total = total + np.sum([part[0] for part in found], axis=0)
            coarse = coarse + np.sum([part[1] for part in found], axis=0)
            variance = np.einsum("kaal->al", total)[:, 0]
            size = np.sqrt(np.outer(variance, variance))
            size = np.where(size > 0, size, 1.0)
            left_out = float(np.max(found[-1][2] / size, initial=0.0)) / -math.expm1(-step)
            if left_out <= 0.3 * tolerance:
                break
            if start > MAX_NODES:
                raise NotConverged("the cross-spectrum falls too slowly for its integral to be certified")
    difference = float(np.max(np.abs((total - coarse).sum(axis=0)) / size[..., None], initial=0.0))
    error = left_out + SAFETY * difference * math.exp(-math.pi * tilt / step)
    if error > tolerance:
        raise NotConverged(f"the covariance reached a relative error of {error:.1e}, not {tolerance:.1e}")
    by_input = {one.name: total[k, :, :, 1:] for k, one in enumerate(model.inputs)}
    return Covariances(tuple(sites), lag[1:], by_input, total[..., 0], error)


@dataclass(frozen=True, eq=False)
class Pair:
    """What two electrodes at sites a and b share.

    Attributes:
        sites: the two names.
        covariances: at the lags asked for, of the two sites.
        correlation: at lag 0.
        peak_lag_ms: the lag asked for at which the covariance is largest in size; positive where b follows a.
        frequency_Hz: (F,) frequencies.
        coherence: (F,) |S_ab|²/(S_aa S_bb), 0 to 1.
        phase_rad: (F,) phase of b against a; negative where b follows a.
    """

    sites: tuple[str, str]
    covariances: Covariances
    correlation: float
    peak_lag_ms: float
    frequency_Hz: Floats
    coherence: Floats
    phase_rad: Floats

    @property
    def lag_ms(self) -> Floats:
        """(L,) lags, ms."""
        return self.covariances.lag_ms

    @property
    def covariance_mV2(self) -> Floats:
        """(L,) E[V_a(t) V_b(t + lag)] about the means, mV²."""
        return self.covariances.covariance_mV2[0, 1]

    @property
    def covariance_by_input_mV2(self) -> dict[str, Floats]:
        """Per input, (L,) its part of the covariance, mV²."""
        return {name: part[0, 1] for name, part in self.covariances.by_input_mV2.items()}


def pair(model: CableModel, a: str, b: str, lag_ms: Floats, frequency_Hz: Floats, tolerance: float = 1e-9) -> Pair:
    """See `CableModel.pair`."""
    lagged = covariances(model, (a, b), lag_ms, tolerance)
    zero = np.sum(lagged.at_zero_mV2, axis=0)
    frequency = np.asarray(frequency_Hz, dtype=float)
    spectrum = by_frequency(model.refined.point, [model.node_of(a), model.node_of(b)], frequency).sum(axis=0)
    with np.errstate(divide="ignore", invalid="ignore"):
        coherence = np.abs(spectrum[0, 1]) ** 2 / (spectrum[0, 0].real * spectrum[1, 1].real)
        correlation = float(zero[0, 1] / np.sqrt(zero[0, 0] * zero[1, 1]))
    peak = int(np.argmax(np.abs(lagged.covariance_mV2[0, 1]))) if lagged.lag_ms.size else 0
    return Pair(
        sites=(a, b),
        covariances=lagged,
        correlation=correlation,
        peak_lag_ms=float(lagged.lag_ms[peak]) if lagged.lag_ms.size else math.nan,
        frequency_Hz=frequency,
        coherence=np.minimum(coherence, 1.0),
        phase_rad=np.angle(spectrum[1, 0]),
    )


def correlation_matrix(model: CableModel, tolerance: float = 1e-9) -> Floats:
    """(S, S) correlations at lag 0 between all sites of the model, "soma" first."""
    zero = covariances(model, model.site_names, np.zeros(0), tolerance).at_zero_mV2.sum(axis=0)
    sd = np.sqrt(np.diag(zero))
    with np.errstate(divide="ignore", invalid="ignore"):
        return zero / np.outer(sd, sd)
