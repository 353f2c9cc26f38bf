"""Filtered Poisson events on one isopotential RC cell: Campbell's theorem and Rice's rate.

Campbell 1909 Proc Camb Phil Soc 15; Rice 1944/45 Bell Syst Tech J 23:282 and 24:46 (both from memory). With
rate nu and response h to one event: mean = nu int h, cumulant_n = nu int h^n, two-sided S(f) = nu |H(f)|^2.
Kernels are written by their poles as in `plain`; the charge of one event is `charge_fC`.
"""

import math
from itertools import pairwise

import numpy as np
from scipy.integrate import quad


def mean_mV(rate_per_ms: float, charge_fC: float, resistance_GOhm: float) -> float:
    """nu Q R, whatever the kernel."""
    return rate_per_ms * charge_fC * resistance_GOhm


def variance_mV2(
    rate_per_ms: float, charge_fC: float, resistance_GOhm: float, tau_m_ms: float, poles_ms: tuple[float, ...]
) -> float:
    """Variance in closed form for delta, exponential, alpha and two-exponential kernels."""
    scale = rate_per_ms * (charge_fC * resistance_GOhm) ** 2
    m = tau_m_ms
    if not poles_ms:
        return scale / (2 * m)
    if len(poles_ms) == 1:
        return scale / (2 * (m + poles_ms[0]))
    a, b = poles_ms
    if a == b:
        return scale * (a + 2 * m) / (4 * (a + m) ** 2)
    return scale * (a * b + b * m + a * m) / (2 * (a + b) * (b + m) * (a + m))


def response_mV(t_ms, charge_fC: float, resistance_GOhm: float, tau_m_ms: float, poles_ms: tuple[float, ...]):
    """Voltage t ms after one event; time constants all differ, save the two of an alpha kernel."""
    t = np.asarray(t_ms, dtype=float)
    if len(poles_ms) == 2 and poles_ms[0] == poles_ms[1]:
        a, m = poles_ms[0], tau_m_ms
        # Convolution of t e^(-t/a)/a^2 with e^(-t/m)/m.
        rate = 1 / a - 1 / m
        shape = (np.exp(-t / m) - np.exp(-t / a) * (1 + rate * t)) / (a**2 * m * rate**2)
        return charge_fC * resistance_GOhm * shape
    taus = (tau_m_ms, *poles_ms)
    shape = np.zeros_like(t)
    for i, tau in enumerate(taus):
        others = math.prod(tau - other for j, other in enumerate(taus) if j != i)
        shape = shape + tau ** (len(taus) - 2) / others * np.exp(-t / tau)
    return charge_fC * resistance_GOhm * shape


def cumulant(
    n: int,
    rate_per_ms: float,
    charge_fC: float,
    resistance_GOhm: float,
    tau_m_ms: float,
    poles_ms: tuple[float, ...],
) -> float:
    """n-th cumulant in mV^n: the definition nu int h^n dt by adaptive quadrature."""

    def integrand(t: float) -> float:
        return float(response_mV(t, charge_fC, resistance_GOhm, tau_m_ms, poles_ms)) ** n

    slow = max((tau_m_ms, *poles_ms))
    fast = min((tau_m_ms, *poles_ms))
    pieces = [0.0, fast, 5 * fast, slow, 3 * slow, 10 * slow, 50 * slow]
    ends = sorted(set(pieces))
    return rate_per_ms * sum(
        quad(integrand, lo, hi, epsabs=0.0, epsrel=1e-12, limit=200)[0] for lo, hi in pairwise(ends)
    )


def skewness(rate_per_ms, charge_fC, resistance_GOhm, tau_m_ms, poles_ms) -> float:
    """Third cumulant over the 3/2 power of the second."""
    arguments = (rate_per_ms, charge_fC, resistance_GOhm, tau_m_ms, poles_ms)
    return cumulant(3, *arguments) / cumulant(2, *arguments) ** 1.5


def excess_kurtosis(rate_per_ms, charge_fC, resistance_GOhm, tau_m_ms, poles_ms) -> float:
    """Fourth cumulant over the square of the second."""
    arguments = (rate_per_ms, charge_fC, resistance_GOhm, tau_m_ms, poles_ms)
    return cumulant(4, *arguments) / cumulant(2, *arguments) ** 2


def psd_one_sided_mV2_per_Hz(frequency_Hz, rate_per_ms, charge_fC, resistance_GOhm, tau_m_ms, poles_ms):
    """2 nu |H|^2, with the ms of nu |H|^2 turned into 1/Hz; its integral over f > 0 is the variance."""
    omega = 2e-3 * np.pi * np.asarray(frequency_Hz, dtype=float)
    S = rate_per_ms * (charge_fC * resistance_GOhm) ** 2 / (1 + (omega * tau_m_ms) ** 2)
    for tau in poles_ms:
        S = S / (1 + (omega * tau) ** 2)
    return 2e-3 * S


def autocorrelation_exponential(lag_ms, tau_m_ms: float, tau_s_ms: float):
    """Normalised autocorrelation for the exponential kernel."""
    lag = np.abs(np.asarray(lag_ms, dtype=float))
    slow = tau_m_ms * np.exp(-lag / tau_m_ms) - tau_s_ms * np.exp(-lag / tau_s_ms)
    return slow / (tau_m_ms - tau_s_ms)


def derivative_ratio_per_ms2(tau_m_ms: float, poles_ms: tuple[float, ...]) -> float:
    """Variance of dV/dt over variance of V; infinite after delta-shaped events."""
    m = tau_m_ms
    if not poles_ms:
        return math.inf
    if len(poles_ms) == 1:
        return 1 / (m * poles_ms[0])
    a, b = poles_ms
    return 1 / (a * b + b * m + a * m)


def upcrossing_Hz(variance_mV2, derivative_variance_mV2_per_ms2, level_above_mean_mV=0.0):
    """Rice's rate of upward crossings of a level by a stationary Gaussian voltage."""
    ratio = np.sqrt(derivative_variance_mV2_per_ms2 / variance_mV2)
    return 1e3 * ratio / (2 * np.pi) * np.exp(-(level_above_mean_mV**2) / (2 * variance_mV2))
