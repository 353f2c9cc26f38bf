"""The next order against exact moments of the nonlinear system, on a sphere and on a branched tree."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest

from cable import CableModel, Kernel, SynapticInput
from cable.noise.beyond.next_order import NotKnown
from cable.theory.spiketrain import SpikeTrain
from noise.beyond_linear import IN_VIVO, sphere_exact, sphere_model, tree_exact, tree_model
from noise.cells import EXCITATION, INHIBITION, arbor, model
from tolerances import EXACT, NEXT_ORDER, ON_A_PATH, REFINED, SPLIT_RATES

POINT = (346.36, 15.5862, -80.0)
SMALL = (100.0, 10.0, -70.0)
CASES = {
    "in vivo like": (POINT, IN_VIVO, 1.0),
    "in vivo like, fewer and larger events": (POINT, IN_VIVO, 16.0),
    "excitation": (SMALL, [(3.0, 1.0, 0.5, 0.0)], 1.0),
    "excitation, large events": (SMALL, [(3.0, 1.0, 0.5, 0.0)], 8.0),
    "slow excitation and inhibition": (SMALL, [(0.5, 0.5, 0.1, 0.0), (1.0, 1.0, 0.1, -75.0)], 4.0),
}


@pytest.mark.parametrize("case", CASES)
def test_errors_on_a_sphere_fall_to_a_quarter_at_most(case: str) -> None:
    cell, inputs, scale = CASES[case]
    mean, sd = sphere_exact(*cell, inputs, scale)
    found = sphere_model(*cell, inputs, scale).next_order()
    assert abs(found.sd_mV[0] - sd) < abs(found.linear.sd_mV[0] - sd) / 4
    assert abs(found.mean_mV[0] - mean) < abs(found.linear.mean_mV[0] - mean) / 20
    assert found.relative_error < REFINED


def test_the_mean_of_many_small_events_has_the_published_second_order_shift() -> None:
    """-0.00956266032347 mV for the in-vivo-like point, by -Σσ²(E-V)τ_s/((τ_s+τ_eff)g²), with nothing beyond it."""
    scale = 1e-3
    found = sphere_model(*POINT, IN_VIVO, scale).next_order()
    shift = (found.mean_mV[0] - found.linear.mean_mV[0]) / scale
    assert shift == pytest.approx(-0.00956266032347, rel=ON_A_PATH)


def test_errors_on_a_branched_tree_fall_to_an_eighth_on_the_whole() -> None:
    """At the soma the linear error is small by cancellation; there it falls to a half or so."""
    for scale, degree in ((0.25, 6), (0.5, 8)):
        mean, covariance = tree_exact(scale, degree)
        sd = np.sqrt(np.diag(covariance))
        found = tree_model(scale).next_order()
        sites = [found.at_sites[name] for name in ("soma", "fork", "short tip", "long tip")]
        linear = [found.linear.at(name) for name in ("soma", "fork", "short tip", "long tip")]
        before = np.abs([one.sd_mV for one in linear] / sd - 1)
        after = np.abs([one[1] for one in sites] / sd - 1)
        assert (after < 0.6 * before).all()
        assert np.sqrt((after**2).mean()) < np.sqrt((before**2).mean()) / 8
        off = np.abs([one[0] for one in sites] - mean)
        assert (off < np.abs([one.mean_mV for one in linear] - mean) / 10).all()


def test_the_correlation_of_two_sites_is_corrected_too() -> None:
    _, covariance = tree_exact(0.5, 8)
    exact = covariance[0, 3] / np.sqrt(covariance[0, 0] * covariance[3, 3])
    cell = tree_model(0.5)
    linear = cell.pair("soma", "long tip", np.array([-5.0, 0.0, 5.0]), np.array([1.0, 30.0]))
    found = cell.next_pair(linear)
    assert abs(found.correlation - exact) < abs(linear.correlation - exact) / 4
    assert found.covariance_mV2[1] == pytest.approx(covariance[0, 3], rel=NEXT_ORDER)


def test_spectra_and_lags_have_the_variance_of_the_map() -> None:
    cell = model(arbor(3, 30))
    found = cell.next_order()
    far = next(iter(cell.site_names))
    pair = cell.next_pair(cell.pair(far, far, np.array([-1e-4, 0.0, 1e-4, 3.0]), np.array([1.0])))
    variance = found.at_sites[far][1] ** 2
    assert pair.covariance_mV2[1] == pytest.approx(variance, rel=EXACT)
    assert pair.covariance_mV2[0] == pytest.approx(pair.covariance_mV2[2], rel=EXACT)
    assert pair.covariance_mV2[2] == pytest.approx(variance, rel=SPLIT_RATES)
    # a rule of the test's own: the trapezoidal one, in the logarithm of frequency
    u = np.linspace(np.log(1e-3), np.log(1e5), 121)
    frequency = np.exp(u)
    psd = cell.next_psd(far, frequency)
    area = np.trapezoid(psd * frequency, u) + psd[0] * frequency[0]
    assert area == pytest.approx(variance, rel=ON_A_PATH)


def test_currents_alone_are_left_as_they_are() -> None:
    current = replace(EXCITATION, conductance_nS=None, reversal_mV=None, current_pA=3.0, correlation=0.01)
    cell = model(arbor(4, 25), current)
    found = cell.next_order()
    assert found.sd_mV == pytest.approx(found.linear.sd_mV, rel=EXACT)
    assert np.array_equal(found.mean_mV, found.linear.mean_mV)
    assert cell.small_fluctuation().only_currents
    assert not cell.small_fluctuation().sd_relative_error.any()


def test_currents_beside_conductances_are_heard_through_the_corrected_cell() -> None:
    """A current's own part falls as the fluctuating conductance raises the impedance: the parts do not add up."""
    current = replace(EXCITATION, name="current", conductance_nS=None, reversal_mV=None, current_pA=20.0)
    both = model(arbor(4, 25), INHIBITION, current).next_order()
    alone = model(arbor(4, 25), INHIBITION).next_order()
    gained = both.variance_mV2 - alone.variance_mV2
    linear = both.linear.variance_by_input_mV2["current"]
    # the multiplicative source of the current's own fluctuations, and less damping
    assert (gained > linear).all()


def test_splitting_an_input_in_two_changes_nothing() -> None:
    tree = arbor(5, 20)
    half = replace(EXCITATION, density_per_um=EXCITATION.density_per_um / 2)
    one = model(tree, EXCITATION, INHIBITION).next_order()
    two = model(tree, half, replace(half, name="other half"), INHIBITION).next_order()
    assert two.sd_mV == pytest.approx(one.sd_mV, rel=EXACT)
    assert two.mean_mV == pytest.approx(one.mean_mV, rel=EXACT)


@pytest.mark.parametrize("seed", [3, 9])
def test_the_error_says_what_modes_are_missing(seed: int, monkeypatch: pytest.MonkeyPatch) -> None:
    """Against all modes there are; the estimate of the largest error may be a few times too low, not a hundred."""
    import cable.noise.beyond.next_order as next_order

    cell = model(arbor(seed, 80), replace(EXCITATION, conductance_nS=1.5), INHIBITION)
    monkeypatch.setattr(next_order, "MODES", 10_000)
    exact = cell.next_order()
    for modes in (10, 20, 40):
        monkeypatch.setattr(next_order, "MODES", modes)
        few = cell.next_order()
        apart = np.abs(few.variance_mV2 / exact.variance_mV2 - 1)
        assert apart.max() < 4 * few.relative_error
    assert apart.max() < 1e-3 and np.abs(exact.sd_mV / exact.linear.sd_mV - 1).max() > 0.1


def test_dividing_a_cylinder_changes_next_to_nothing() -> None:
    coarse, fine = (model(arbor(6, 12, untapered=True)) for _ in range(2))
    import cable.noise.beyond.next_order as next_order

    with pytest.MonkeyPatch.context() as patch:
        a = coarse.next_order()
        patch.setattr(next_order, "PIECE", next_order.PIECE / 3)
        b = fine.next_order()
    change = a.sd_mV / a.linear.sd_mV - 1
    assert np.abs(b.sd_mV / b.linear.sd_mV - 1 - change).max() < NEXT_ORDER * np.abs(change).max()


def test_sizes_of_events_that_vary_count_by_their_moments() -> None:
    """Two sizes, half of the events each, are two inputs; a gamma distribution of little width is nearly that."""
    spread, tree = 0.05, arbor(7, 12)
    varied = model(tree, replace(EXCITATION, size_cv=spread)).next_order()
    halves = [
        replace(
            EXCITATION, name=name, rate_Hz=EXCITATION.rate_Hz / 2, conductance_nS=EXCITATION.conductance_nS * (1 + s)
        )
        for name, s in (("large", spread), ("small", -spread))
    ]
    two = model(tree, *halves).next_order()
    even = model(tree, EXCITATION).next_order()
    gained = varied.sd_mV / even.sd_mV - 1
    assert two.sd_mV / even.sd_mV - 1 == pytest.approx(gained, rel=0.02)


def test_regular_trains_are_taken_as_poisson_beyond_linear_order_and_that_is_said() -> None:
    tree = arbor(8, 15)
    poisson = model(tree, EXCITATION).next_order()
    for train in (SpikeTrain.gamma(3), SpikeTrain.dead_time(20.0)):
        regular = model(tree, replace(EXCITATION, spike_train=train)).next_order()
        assert "Poisson" in regular.warnings[0]
        change = regular.sd_mV / regular.linear.sd_mV
        assert change == pytest.approx(poisson.sd_mV / poisson.linear.sd_mV, rel=NEXT_ORDER)
        assert (np.abs(change - 1) > NEXT_ORDER).any()


def test_correlated_conductances_are_refused() -> None:
    cell = model(arbor(9, 10), INHIBITION, replace(EXCITATION, correlation=0.01))
    with pytest.raises(NotKnown, match="independent synapses"):
        cell.next_order()
    assert cell.small_fluctuation().sd_relative_error[0] > 0


def test_correlation_raises_the_conductance_seen() -> None:
    tree = arbor(9, 10)
    alone, together = (model(tree, replace(EXCITATION, correlation=c)).small_fluctuation() for c in (0.0, 0.1))
    assert together.relative_conductance[0] > 1.5 * alone.relative_conductance[0]


@pytest.mark.parametrize("case", CASES)
def test_the_index_bounds_the_error_on_a_sphere(case: str) -> None:
    cell, inputs, scale = CASES[case]
    _, sd = sphere_exact(*cell, inputs, scale)
    ours = sphere_model(*cell, inputs, scale)
    error = abs(ours.fluctuations().sd_mV[0] / sd - 1)
    bound = ours.small_fluctuation().sd_relative_error[0]
    assert error < bound < 15 * error
    left = abs(ours.next_order().sd_mV[0] / sd - 1)
    assert 100 * left < ours.next_order().left_over("soma")


def test_the_conductance_seen_is_that_of_the_sphere() -> None:
    """κ² = Σ σ_g²/G² · τ_s/(τ_s + τ_eff) by the closed form for exponentials, σ_g² = rate jump²/(2 decay)."""
    capacitance, leak, _ = SMALL
    inputs = CASES["slow excitation and inhibition"][1]
    total = leak + sum(rate * jump / decay for rate, jump, decay, _ in inputs)
    slow = total / capacitance
    expected = sum(rate * jump**2 / (2 * decay) * slow / (slow + decay) for rate, jump, decay, _ in inputs) / total**2
    found = sphere_model(*SMALL, inputs).small_fluctuation()
    assert found.relative_conductance[0] ** 2 == pytest.approx(expected, rel=EXACT)


def test_a_model_without_input_has_nothing_beyond() -> None:
    tree = arbor(2, 8)
    silent = CableModel(tree, model(tree).membrane).next_order()
    assert not silent.sd_mV.any()
    still = model(tree, replace(EXCITATION, rate_Hz=0.0))
    assert not still.next_order().sd_mV.any()
    assert still.small_fluctuation().sentence() == ""


def test_an_infinite_variance_stays_undefined() -> None:
    from cable.theory.synapse import Placed
    from morphology import Site

    tree = arbor(2, 8)
    tip = Site("tip", swc_id=int(tree.ids[-1]))
    charge = SynapticInput(name="charge", at=(Placed(tip),), rate_Hz=5.0, charge_fC=10.0)
    cell = model(tree, charge, INHIBITION, sites=(tip,))
    found = cell.next_order()
    assert np.isnan(found.at_sites["tip"][1])
    assert np.isfinite(found.at_sites["soma"][1])


def test_kernels_of_equal_rates_are_the_limit_of_unequal_ones() -> None:
    tree = arbor(1, 10)
    alpha = model(tree, replace(INHIBITION, kernel=Kernel.alpha(3.0))).next_order()
    near = replace(INHIBITION, kernel=Kernel.expression("t*exp(-t/3)*(1 + t/1e9)"))
    assert model(tree, near).next_order().sd_mV == pytest.approx(alpha.sd_mV, rel=SPLIT_RATES)
