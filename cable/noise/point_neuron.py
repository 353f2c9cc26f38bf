"""The equivalent point neuron at a site: the few numbers to carry into a network model."""

from __future__ import annotations

from dataclasses import asdict, dataclass
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from cable.noise.covariance import covariances
from cable.theory.units import MOHM_PER_GOHM

if TYPE_CHECKING:
    from cable.noise.model import CableModel
    from cable.noise.operating_point import OperatingPoint

Floats = NDArray[np.float64]
SMALL = 1e-5  # of the slowest rate: the step of the derivative of the impedance at zero frequency
LAGS, REACH = 400, 8.0  # lags of the fit, up to this many correlation times or time constants


@dataclass(frozen=True)
class PointNeuron:
    """A single-compartment stand-in for the cell as seen from one site.

    Attributes:
        site: the site's name.
        mean_mV, sd_mV: mean and SD of the voltage.
        correlation_time_ms: area of the normalised autocorrelation over positive lags.
        input_resistance_MOhm: steady input resistance at the operating point.
        time_constant_ms: effective membrane time constant, -d ln Z/ds at s = 0: the centroid delay of the voltage
            behind a brief local current (Agmon-Snir & Segev 1993, J Neurophysiol 70:2066; from memory).
        capacitance_pF: the capacitance with which that resistance has that time constant.
        cell_time_constant_ms: all of the cell's capacitance over all of its conductance, synapses included: what the
            membrane would have if the cell were isopotential.
        slow_ms, fast_ms, slow_weight: the autocovariance as variance · [w e^{-t/slow} + (1 - w) e^{-t/fast}];
            the weight may exceed 1, as it does for an RC cell with exponential events.
        fit_error: the largest difference between autocorrelation and fit.

    What follows from the variance is NaN where that is infinite (see `Fluctuations.variance_note`) or 0.
    """

    site: str
    mean_mV: float
    sd_mV: float
    correlation_time_ms: float
    input_resistance_MOhm: float
    time_constant_ms: float
    capacitance_pF: float
    cell_time_constant_ms: float
    slow_ms: float
    fast_ms: float
    slow_weight: float
    fit_error: float

    def as_dict(self) -> dict[str, float | str]:
        """The attributes by name."""
        return asdict(self)


def point_neuron(model: CableModel, site: str) -> PointNeuron:
    """See `CableModel.point_neuron`."""
    at = model.fluctuations().at(site)
    point, node = model.refined.point, model.node_of(site)
    step = SMALL * point.network.slowest_rate_per_ms
    z = point.network.columns_at(np.array([1j * step]), [node]).impedance_GOhm[0, node, 0]
    time_constant = float(-z.imag / step / z.real)
    lag = np.linspace(0.0, REACH * max(at.correlation_time_ms, time_constant), LAGS) if at.sd_mV > 0 else np.zeros(0)
    rho = covariances(model, (site,), lag).covariance_mV2[0, 0] / at.variance_mV2 if lag.size else lag
    slow, fast, weight, error = _two_exponentials(lag, rho) if lag.size else (np.nan,) * 4
    return PointNeuron(
        site=site,
        mean_mV=at.mean_mV,
        sd_mV=at.sd_mV,
        correlation_time_ms=at.correlation_time_ms,
        input_resistance_MOhm=at.input_resistance_MOhm,
        time_constant_ms=time_constant,
        capacitance_pF=time_constant / (at.input_resistance_MOhm / MOHM_PER_GOHM),
        cell_time_constant_ms=_whole_cell_ms(point),
        slow_ms=slow,
        fast_ms=fast,
        slow_weight=weight,
        fit_error=error,
    )


def _whole_cell_ms(point: OperatingPoint) -> float:
    network = point.network
    capacitance = network.capacitance_pF.sum() + network.node_capacitance_pF.sum()
    return float(capacitance / (network.conductance_nS.sum() + network.node_conductance_nS.sum()))


def _two_exponentials(lag: Floats, rho: Floats) -> tuple[float, float, float, float]:
    """Slow and fast time (ms), weight of the slow one, and the largest error of the least-squares fit to rho."""
    from scipy.optimize import least_squares

    def curve(p: Floats) -> Floats:
        slow, fast = np.exp(p[0]), np.exp(p[0]) * (1 / (1 + np.exp(-p[1])))
        return p[2] * np.exp(-lag / slow) + (1 - p[2]) * np.exp(-lag / fast)

    area = float(np.trapezoid(rho, lag))
    starts = ([np.log(1.5 * area), logit, weight] for logit in (-2.0, 0.0) for weight in (0.6, 1.2))
    found = min(
        (least_squares(lambda p: curve(p) - rho, s, xtol=1e-15, ftol=1e-15) for s in starts), key=lambda f: f.cost
    )
    slow = float(np.exp(found.x[0]))
    fast = float(slow / (1 + np.exp(-found.x[1])))
    return slow, fast, float(found.x[2]), float(np.abs(curve(found.x) - rho).max())
