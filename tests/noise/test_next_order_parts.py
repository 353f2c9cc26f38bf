"""What the next order is made of, each against another way to the same number."""

from __future__ import annotations

import numpy as np
import pytest
from scipy.integrate import dblquad, quad
from scipy.interpolate import CubicSpline

from cable import Kernel
from cable.noise.beyond.crossing import slow_modes
from cable.noise.beyond.events import conductance_covariance, exponentials, scattering
from cable.noise.beyond.local_impedance import local_impedance
from cable.noise.beyond.sinc_rule import SincRule
from noise.beyond_linear import sphere_model
from noise.cells import EXCITATION, arbor, model
from tolerances import BENT_PATH, EXACT, IDENTITY, NEXT_ORDER, ON_A_PATH, REFINED, SPLIT_RATES


def test_spectra_known_at_nodes_have_their_transforms_anywhere() -> None:
    a, b = 0.11, 0.9
    rule = SincRule(0.1, 0.3, 33)
    omega = rule.omega_per_ms
    spectrum = 2 * a * b * (1 / (a * a + omega**2) - 1 / (b * b + omega**2))  # of b e^{-at} - a e^{-bt}
    s = np.array([0.5, 0.05 + 1j, 0.5 + 3j, 0.02 + 0.01j, 0.5 + 40j])
    assert spectrum @ rule.half_line(s) == pytest.approx(b / (s + a) - a / (s + b), rel=BENT_PATH)
    lag = np.array([0.0, 0.3, -3.0, 20.0, -50.0])
    expected = b * np.exp(-a * np.abs(lag)) - a * np.exp(-b * np.abs(lag))
    assert (spectrum @ rule.at_lags(lag)).real == pytest.approx(expected, abs=BENT_PATH)
    assert spectrum @ rule.weights == pytest.approx(b - a, rel=IDENTITY)


def test_a_cross_spectrum_keeps_its_sides() -> None:
    rates = 0.11, 0.9, 0.4
    rule = SincRule(0.1, 0.3, 33)
    causal = 1 / np.prod([1j * rule.omega_per_ms + p for p in rates], axis=0)
    lag = np.array([-4.0, 0.5, 7.0])
    after = sum(np.exp(-p * np.maximum(lag, 0)) / np.prod([q - p for q in rates if q != p]) for p in rates)
    assert (causal @ rule.at_lags(lag)).real == pytest.approx(np.where(lag > 0, after, 0.0), abs=BENT_PATH)
    with pytest.raises(ValueError, match="above zero"):
        SincRule(0.0, 0.3, 5)


def test_local_impedances_follow_from_one_path() -> None:
    point = model(arbor(11, 25)).refined.point
    s = np.array([0.0, 0.4, 0.5 + 2j, 3.3 + 8j, 1j, 40j])
    found = local_impedance(point.network, 3.0).at(s)
    expected = point.network.input_impedance_at(s)
    assert found == pytest.approx(expected, rel=ON_A_PATH)
    steady = point.steady.input_impedance_GOhm()[:, 0].real
    assert expected[:, 0].real == pytest.approx(steady, rel=IDENTITY)


@pytest.mark.parametrize(
    "kernel", [Kernel.exponential(2.0), Kernel.two_exponential(0.3, 2.5), Kernel.alpha(3.0)], ids=["e", "two", "alpha"]
)
def test_exponentials_are_the_kernel(kernel: Kernel) -> None:
    parts, t = exponentials(kernel), np.linspace(0.0, 20.0, 50)
    value = (parts.factors * np.exp(-parts.rates_per_ms * t[:, None])).sum(axis=1)
    assert value.real == pytest.approx(kernel.value(t), abs=SPLIT_RATES)
    area = quad(lambda u: kernel.value(u) * kernel.value(u + 1.5), 0, 80, limit=200)[0]
    covariance = (parts.covariance_factors * np.exp(-parts.rates_per_ms * 1.5)).sum()
    assert covariance.real == pytest.approx(area, rel=SPLIT_RATES)


def test_an_impulse_is_no_sum_of_exponentials() -> None:
    with pytest.raises(ValueError, match="impulse"):
        exponentials(Kernel.impulse())


def test_a_saturating_event_solves_its_volterra_equation() -> None:
    """Stepped in time on a sphere, where the event's own voltage obeys C v' = -G v + h(t)(1 - v), per mV."""
    cell = sphere_model(100.0, 10.0, -70.0, [(0.4, 5.0, 0.5, 0.0)])
    point = cell.refined.point
    total = 10.0 + 0.4 * 5.0 / 0.5
    step, count = 1e-3, 120_000
    h = 5.0 * np.exp(-0.5 * step * (np.arange(count) + 0.5))
    v, current = 0.0, np.empty(count)
    for k in range(count):  # the midpoint rule, implicit
        after = (v * (100 / step - (total + h[k]) / 2) + h[k]) / (100 / step + (total + h[k]) / 2)
        current[k] = h[k] * (1 - (v + after) / 2)
        v = after
    events = scattering(cell.inputs[0], local_impedance(point.network, 0.5), np.array([0.0, 0.3j]))
    t = step * (np.arange(count) + 0.5)
    for k, omega in enumerate((0.0, 0.3)):
        wave = np.exp(-1j * omega * t)
        expected = (current * wave).sum() / (h * wave).sum()
        assert abs(events.relative[0, k] - expected) < NEXT_ORDER / 10
        assert abs(events.relative[0, k] - 1) > 0.03
    lost = (current - h).sum() * step
    assert events.admittance_nS_ms[0, 0].real == pytest.approx(lost, rel=NEXT_ORDER)


def test_the_fluctuating_admittance_is_the_integral_of_covariance_and_impulse_response() -> None:
    """To lowest order -∫C_g z e^{-sτ}dτ: on a sphere z = e^{-μτ}/C; here by quadrature, for small events."""
    cell = sphere_model(100.0, 10.0, -70.0, [(400.0, 3e-3, 0.5, 0.0)])
    point = cell.refined.point
    slow, omega = (10.0 + 400 * 3e-3 / 0.5) / 100.0, 0.4
    b, p = conductance_covariance(cell.inputs[0])
    real, imag = (
        quad(lambda u, f=f: (b[0] * np.exp(-p[0] * u)).real * np.exp(-slow * u) / 100 * f(omega * u), 0, 60)[0]
        for f in (np.cos, np.sin)
    )
    found = scattering(cell.inputs[0], local_impedance(point.network, 0.5), np.array([1j * omega]))
    ours = cell.inputs[0].rate_per_ms * found.admittance_nS_ms[0, 0]
    assert ours == pytest.approx(-(real - 1j * imag), rel=NEXT_ORDER)


def test_slow_modes_are_those_of_a_sealed_cylinder() -> None:
    """τ_n = τ_m/(1 + (nπ/L)²) (Rall 1969, Biophys J 9:1483; from memory), here with L = 1.5."""
    from cable import CableModel, Membrane
    from morphology import CellTree

    membrane = Membrane(
        axial_resistivity_ohm_cm=150.0, capacitance_uF_cm2=1.0, resistance_ohm_cm2=20000.0, rest_mV=-70.0
    )
    length = 1.5 * 816.496580928
    x = np.linspace(0.0, length, 201)
    tree = CellTree(np.arange(1, 202), np.full(201, 3), np.c_[x, 0 * x, 0 * x], np.ones(201), np.arange(-1, 200))
    point = CableModel(tree, membrane).refined.point
    shapes, rates = slow_modes(point, 6)
    expected = (1 + (np.arange(6) * np.pi / 1.5) ** 2) / 20.0
    assert rates == pytest.approx(expected, rel=NEXT_ORDER)
    ends = shapes[0] * shapes[-1]
    assert np.sign(ends).tolist() == [1, -1, 1, -1, 1, -1]
    few, slowest = slow_modes(point, 3)
    assert slowest == pytest.approx(rates[:3], rel=IDENTITY)
    assert np.abs(few) == pytest.approx(np.abs(shapes[:, :3]), rel=REFINED, abs=EXACT)


def test_the_crossing_terms_converge_with_the_modes() -> None:
    found = model(arbor(3, 40), EXCITATION).next_order()
    crossed = found.medium.crossed
    assert crossed is not None
    nodes = found.medium.point.layout.row_node
    whole = crossed.variance(found.rule, nodes)
    off = [np.abs(crossed.slowest(k).variance(found.rule, nodes) / whole - 1).max() for k in (3, 8, 16)]
    assert (whole > 0).all()
    assert off[0] > off[1] > off[2]
    assert off[2] < 0.05


def test_near_places_stand_for_the_fast_modes() -> None:
    """With a few slow modes and what they leave, taken as local, the variance is nearer to that with many modes."""
    import cable.noise.beyond.next_order as next_order
    from cable.noise.beyond.next_medium import NextMedium

    found = {}
    for modes, nearby in ((40, True), (3, True), (3, False)):
        with pytest.MonkeyPatch.context() as patch:
            patch.setattr(next_order, "MODES", modes)
            if not nearby:
                patch.setattr(NextMedium, "_nearby", lambda self, omega: 0.0)
            found[modes, nearby] = model(arbor(5, 60), EXCITATION).next_order().variance_mV2
    whole = found[40, True]
    with_them, without = (np.abs(found[3, near] / whole - 1) for near in (True, False))
    assert np.sqrt((with_them**2).mean()) < 0.5 * np.sqrt((without**2).mean())


def test_near_places_by_quadrature() -> None:
    """The closed forms of both terms for Z = 1/(C (s + μ)), against integrals over time with z = e^{-μt}/C."""
    from cable.noise.beyond.crossing_nearby import nearby

    mu, capacitance, omega = 0.3, 2.0, 0.4
    one, other = (np.array([0.7 + 0j]), np.array([0.5 + 0j])), (np.array([0.2 + 0j]), np.array([0.9 + 0j]))

    def z(t: float) -> float:
        return np.exp(-mu * t) / capacitance

    def memory(covariance, t: float) -> float:
        return float((covariance[0] * np.exp(-covariance[1] * abs(t))).sum().real)

    turned = dblquad(lambda u, v: memory(one, u + v) * z(u + v) * np.cos(omega * u), 0, 40, 0, 40)[0]
    colour = 2 * 0.2 * 0.9 / (0.9**2 + omega**2)
    expected = 2 * turned * colour
    u = np.linspace(0, 30, 61)
    for (b_first, p_first), (b_second, p_second) in ((one, other), (other, one)):
        b, p, q = (b_first * b_second).real[0], p_first.real[0], p_second.real[0]
        # for lags τ > 0 the second factor is e^{-q(τ + v)}: with z(u + v) = z(u) z(v) C the integral over v is closed
        heard = [
            quad(lambda t, at=at, p=p, q=q: np.exp(-p * abs(t - at) - q * t) * np.cos(omega * t), 0, 30, points=[at])[0]
            for at in u
        ]
        expected += b / (mu + q) * CubicSpline(u, np.array(heard) * [z(at) for at in u]).integrate(0, 30)
    found = nearby(lambda s: 1 / (capacitance * (s + mu))[None], one, other, np.array([omega]))
    assert found[0, 0] == pytest.approx(expected, rel=NEXT_ORDER)
