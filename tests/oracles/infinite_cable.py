"""Closed forms for noise on uniform cables: no tree, no matrices.

White noise: V_T = V_XX - V + xi with unit space-time white noise, X in length constants and T in membrane
time constants (the setting of Wan & Tuckwell 1979 Biol Cybern 33:39, from memory; formulas derived,
verified by two computations). Poisson noise: cable constants as in Rall 1959 Exp Neurol 1:491 (from
memory), formulas derived, verified by two computations. A sealed end is meant where nothing else is said.
"""

import math
from dataclasses import dataclass

import numpy as np
from scipy.integrate import quad
from scipy.special import erfc, k0


@dataclass(frozen=True)
class Cable:
    """The constants of a uniform cable."""

    diameter_um: float = 2.0
    Rm_ohm_cm2: float = 20000.0
    Ri_ohm_cm: float = 150.0
    Cm_uF_cm2: float = 1.0

    @property
    def lambda_um(self) -> float:
        return 1e4 * math.sqrt(self.Rm_ohm_cm2 * self.diameter_um * 1e-4 / (4.0 * self.Ri_ohm_cm))

    @property
    def tau_m_ms(self) -> float:
        return 1e-3 * self.Rm_ohm_cm2 * self.Cm_uF_cm2

    @property
    def R_inf_GOhm(self) -> float:
        """Input resistance of the semi-infinite cable."""
        ohm = 2.0 / math.pi * math.sqrt(self.Rm_ohm_cm2 * self.Ri_ohm_cm) * (self.diameter_um * 1e-4) ** -1.5
        return 1e-9 * ohm


def input_impedance_GOhm(cable: Cable, frequency_Hz: float, length_um: float | None, end: str = "sealed") -> complex:
    """Input impedance of a cable of the given length (None: semi-infinite) with a sealed or a killed end."""
    gamma = np.sqrt(1 + 2e-3j * np.pi * frequency_Hz * cable.tau_m_ms)
    if length_um is None:
        return cable.R_inf_GOhm / gamma
    tanh = np.tanh(gamma * length_um / cable.lambda_um)
    return cable.R_inf_GOhm / gamma * (tanh if end == "killed" else 1 / tanh)


def sealed_transfer_impedance_GOhm(cable: Cable, frequency_Hz: float, length_um: float, x_um: float, z_um: float):
    """Transfer impedance between two places of a cable with two sealed ends."""
    gamma = np.sqrt(1 + 2e-3j * np.pi * frequency_Hz * cable.tau_m_ms) / cable.lambda_um
    low, high = min(x_um, z_um), max(x_um, z_um)
    ratio = np.cosh(gamma * low) * np.cosh(gamma * (length_um - high)) / np.sinh(gamma * length_um)
    return cable.R_inf_GOhm / (gamma * cable.lambda_um) * ratio


def white_covariance_infinite(X: float, T: float) -> float:
    """Space-time covariance on the infinite line; T = 0 gives e^-|X|/4, X = 0 gives erfc(sqrt T)/4."""
    X, T = abs(X), abs(T)
    if T == 0:
        return math.exp(-X) / 4
    root, front = math.sqrt(T), X / (2 * math.sqrt(T))
    return (math.exp(-X) * erfc(root - front) + math.exp(X) * erfc(root + front)) / 8


def white_covariance_sealed(X: float, Z: float, L: float) -> float:
    """Spatial covariance on a finite sealed cable."""
    low, high = min(X, Z), max(X, Z)
    return math.cosh(low) * math.cosh(L - high) / math.sinh(L) / 2


def white_spectrum_infinite(Omega: float) -> float:
    """Two-sided point spectrum, dimensionless angular frequency; its integral over Omega/(2 pi) is 1/4."""
    if Omega == 0:
        return 0.25
    return -((1 + 1j * Omega) ** -0.5).imag / (2 * Omega)


def distributed_covariance_mV2(
    cable: Cable,
    density_per_um: float,
    rate_per_ms: float,
    charge_fC: float,
    tau_s_ms: float,
    distance_um: float = 0.0,
) -> float:
    """Poisson current events spread evenly on the infinite cable, exponential kernel (tau_s = 0: delta)."""
    X = distance_um / cable.lambda_um
    scale = density_per_um * rate_per_ms * cable.lambda_um * (charge_fC * cable.R_inf_GOhm) ** 2
    scale = scale / (4 * cable.tau_m_ms)
    if tau_s_ms == 0:
        return scale * math.exp(-X)
    r = tau_s_ms / cable.tau_m_ms
    return scale * (math.exp(-X) - math.sqrt(r / (1 + r)) * math.exp(-X * math.sqrt((1 + r) / r)))


def distributed_lagged_covariance_mV2(
    cable: Cable,
    density_per_um: float,
    rate_per_ms: float,
    charge_fC: float,
    tau_s_ms: float,
    distance_um: float,
    lag_ms: float,
) -> float:
    """The same at a lag: an integral over wave numbers k, each mode decaying at the rate 1 + k²."""
    X, T = distance_um / cable.lambda_um, abs(lag_ms) / cable.tau_m_ms
    b = cable.tau_m_ms / tau_s_ms

    def mode(k: float) -> float:
        """(b²/2) [e^(-aT)/a - e^(-bT)/b] / (b² - a²), a = 1 + k², written so that a = b is no exception."""
        a = 1 + k * k
        gap = abs(b - a)
        between = -math.expm1(-gap * T) / gap if gap else T
        return b / (2 * (a + b)) * (math.exp(-a * T) / a + math.exp(-min(a, b) * T) * between)

    options = {"epsabs": 1e-13, "limit": 400}
    total = quad(mode, 0, math.inf, weight="cos", wvar=X, **options) if X else quad(mode, 0, math.inf, **options)
    return 4 / math.pi * total[0] * distributed_covariance_mV2(cable, density_per_um, rate_per_ms, charge_fC, 0.0)


def point_variance_at_site_mV2(cable: Cable, rate_per_ms: float, charge_fC: float, tau_s_ms: float) -> float:
    """One Poisson synapse with an exponential kernel on the infinite cable, seen at its own site."""
    r = tau_s_ms / cable.tau_m_ms
    if r == 1:
        J = 1.0
    elif r < 1:
        J = math.atanh(math.sqrt(1 - r * r)) / math.sqrt(1 - r * r)
    else:
        J = math.atan(math.sqrt(r * r - 1)) / math.sqrt(r * r - 1)
    return rate_per_ms * (charge_fC * cable.R_inf_GOhm / 2) ** 2 / (math.pi * cable.tau_m_ms) * J


def point_variance_delta_mV2(cable: Cable, rate_per_ms: float, charge_fC: float, distance_um: float) -> float:
    """One synapse of instantaneous charges on the infinite cable, seen at a distance (infinite at 0)."""
    # The capacitance of one length constant is tau_m/R_inf.
    jump = charge_fC * cable.R_inf_GOhm / cable.tau_m_ms
    bessel = float(k0(2 * distance_um / cable.lambda_um))
    return rate_per_ms * cable.tau_m_ms * jump**2 * bessel / (2 * math.pi)
