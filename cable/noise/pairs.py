"""Two electrodes: correlation, covariance against lag, coherence and phase; and the correlations of all sites."""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from cable.noise.covariance import Covariances, covariances
from cable.noise.cross import by_frequency

if TYPE_CHECKING:
    from cable.noise.model import CableModel

Floats = NDArray[np.float64]
PEAK_DIGITS = 1e-6  # of the distance of neighbouring lags, to which the lag of the peak is sought


@dataclass(frozen=True, eq=False)
class Pair:
    """What two electrodes at sites a and b share.

    Attributes:
        sites: the two names.
        covariances: at the lags asked for, of the two sites.
        correlation: at lag 0.
        peak_lag_ms: the lag, within the range asked for, at which the covariance is largest in size; positive
            where b follows a.
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
    return Pair(
        sites=(a, b),
        covariances=lagged,
        correlation=correlation,
        peak_lag_ms=_peak_lag_ms(lagged, math.sqrt(max(zero[0, 0] * zero[1, 1], 0.0))),
        frequency_Hz=frequency,
        coherence=np.minimum(coherence, 1.0),
        phase_rad=np.angle(spectrum[1, 0]),
    )


def _peak_lag_ms(lagged: Covariances, size: float) -> float:
    """Where the covariance of the first with the second site is largest in size; NaN where there are no lags.

    It is sought between the neighbours of the largest value at a given lag; that lag is kept where moving away
    from it gains no more than the certified error, as at lag 0 of two places that move together.
    """
    from scipy.optimize import minimize_scalar

    if not lagged.lag_ms.size:
        return math.nan
    lag, first = np.unique(lagged.lag_ms, return_index=True)
    height = np.abs(lagged.covariance_mV2[0, 1][first])
    top = int(np.argmax(height))
    low, high = lag[max(top - 1, 0)], lag[min(top + 1, len(lag) - 1)]
    if not low < high:
        return float(lag[top])

    def depth(at: float) -> float:
        return -abs(float(lagged.waves.at(np.array([at]))[:, 0, 1, 0].sum()))

    found = minimize_scalar(depth, bounds=(low, high), method="bounded", options={"xatol": PEAK_DIGITS * (high - low)})
    gain = -float(found.fun) - float(height[top])
    return float(found.x) if gain > lagged.relative_error * size else float(lag[top])


def correlation_matrix(model: CableModel, tolerance: float = 1e-9) -> Floats:
    """(S, S) correlations at lag 0 between all sites of the model, "soma" first."""
    zero = covariances(model, model.site_names, np.zeros(0), tolerance).at_zero_mV2.sum(axis=0)
    sd = np.sqrt(np.diag(zero))
    with np.errstate(divide="ignore", invalid="ignore"):
        return zero / np.outer(sd, sd)
