"""Closed forms of shot noise on one RC cell and of noise on uniform cables, against tables and quadrature.

Cable P: 2 um, Rm 20 000 ohm cm2, Ri 150 ohm cm, Cm 1 uF/cm2.
"""

import math

import pytest
from scipy.integrate import quad

from . import infinite_cable, shot_noise
from .plain import event_area

P = infinite_cable.Cable()


def digits12(value, typed_value):
    """Equal to within the twelfth typed digit."""
    assert float(value) == pytest.approx(typed_value, rel=1e-11, abs=0.0)


def test_white_noise_tables():
    # Setting of Wan & Tuckwell 1979 Biol Cybern 33:39 (from memory); values derived, verified by two
    # computations.
    digits12(infinite_cable.white_covariance_infinite(1.0, 0.0), 0.0919698602929)
    digits12(infinite_cable.white_covariance_infinite(0.0, 1.0), 0.0393248017626)
    digits12(infinite_cable.white_covariance_infinite(1.0, 0.5), 0.0614452477139)
    digits12(infinite_cable.white_covariance_infinite(0.5, 2.0), 0.0111129637324)
    digits12(infinite_cable.white_covariance_sealed(0.0, 0.0, 1.0), 0.65651764275)
    digits12(infinite_cable.white_covariance_sealed(1.0, 1.0, 2.0), 0.328258821375)
    digits12(infinite_cable.white_covariance_sealed(0.0, 1.0, 1.0) / 0.6565176427496657, 0.648054273664)
    for Omega, value in ((0, 0.25), (0.1, 0.24844970087), (1, 0.160898563226), (10, 0.0105831664048)):
        digits12(infinite_cable.white_spectrum_infinite(Omega), value)

    def power(v):
        return infinite_cable.white_spectrum_infinite(math.sinh(v)) * math.cosh(v) / math.pi

    assert quad(power, 0, 60, limit=400)[0] == pytest.approx(0.25, rel=1e-8)


def test_poisson_noise_on_the_infinite_cable():
    # Derived, verified by two computations.
    digits12(infinite_cable.distributed_covariance_mV2(P, 0.5, 1e-3, 20.0, 2.0), 0.216693183356)
    digits12(math.sqrt(infinite_cable.distributed_covariance_mV2(P, 0.5, 1e-3, 20.0, 0.0)), 0.556984290688)
    apart = infinite_cable.distributed_covariance_mV2(P, 0.5, 1e-3, 20.0, 2.0, P.lambda_um)
    digits12(apart / infinite_cable.distributed_covariance_mV2(P, 0.5, 1e-3, 20.0, 2.0), 0.511020609846)
    digits12(infinite_cable.point_variance_delta_mV2(P, 0.1, 20.0, P.lambda_um), 0.00550987823807)
    slow, equal = (infinite_cable.point_variance_at_site_mV2(P, 0.1, 20.0, tau) for tau in (40.0, 20.0))
    digits12(slow / equal, 0.604599788078)


# Campbell 1909 and Rice 1944/45 (from memory); exponential form also in Zerlaut et al. 2018 J Comput
# Neurosci. Events of 20 fC, 1/ms, on 200 MOhm and 20 ms: kernel, variance, upcrossing rate of the mean
# level.
CAMPBELL = [
    ((), 0.4, None),
    ((2.0,), 0.363636363636, 25.1646060522),
    ((2.0, 2.0), 0.347107438017, 17.3652279511),
    ((0.5, 5.0), 0.319290465632, 15.005271936),
]


@pytest.mark.parametrize(("poles", "variance", "rate"), CAMPBELL)
def test_campbell(poles, variance, rate):
    RC = (1.0, 20.0, 0.2, 20.0, poles)
    digits12(shot_noise.mean_mV(*RC[:3]), 4.0)
    digits12(shot_noise.variance_mV2(*RC), variance)
    assert shot_noise.cumulant(1, *RC) == pytest.approx(4.0, rel=1e-10)
    assert shot_noise.cumulant(2, *RC) == pytest.approx(shot_noise.variance_mV2(*RC), rel=1e-10)

    def power(v):
        return shot_noise.psd_one_sided_mV2_per_Hz(math.sinh(v), *RC) * math.cosh(v)

    assert quad(power, 0, 40, limit=400)[0] == pytest.approx(variance, rel=1e-8)
    ratio = shot_noise.derivative_ratio_per_ms2(20.0, poles)
    if rate is None:
        assert math.isinf(ratio)
    else:
        digits12(shot_noise.upcrossing_Hz(variance, ratio * variance), rate)


def test_campbell_higher_orders_and_spectrum():
    RC = (1.0, 20.0, 0.2, 20.0, (2.0,))
    digits12(shot_noise.cumulant(3, *RC), 0.042328042328)
    digits12(shot_noise.cumulant(4, *RC), 0.00541394089781)
    digits12(shot_noise.skewness(*RC), 0.193031072455)
    digits12(shot_noise.excess_kurtosis(*RC), 0.0409429280397)
    digits12(shot_noise.skewness(1.0, 20.0, 0.2, 20.0, ()), 0.210818510678)
    for frequency, value in ((0.0, 0.032), (10.0, 0.0122143707637), (100.0, 7.80754251227e-5)):
        digits12(shot_noise.psd_one_sided_mV2_per_Hz(frequency, *RC), value)
    for lag, rho in ((5.0, 0.85621364801), (20.0, 0.408749890198), (50.0, 0.091205554025)):
        digits12(shot_noise.autocorrelation_exponential(lag, 20.0, 2.0), rho)
    # Rice 1944/45 (from memory).
    digits12(shot_noise.upcrossing_Hz(1.0, 1 / 40, 2.0), 3.40565908762)
    digits12(shot_noise.upcrossing_Hz(16.0, 16 / 40, 10.0), 1.10565562578)
    # Peak 1 gives area 6.45774832507 (0.5, 5 ms) and 5.43656365692 (alpha 2 ms); derived.
    digits12(event_area(1.0, (0.5, 5.0)), 6.45774832507)
    digits12(event_area(1.0, (2.0, 2.0)), 5.43656365692)
