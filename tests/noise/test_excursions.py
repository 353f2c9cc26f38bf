"""Skewness, kurtosis and excursions against closed forms, compartments, and published rates of crossing."""

from __future__ import annotations

import math
from dataclasses import replace
from typing import Any

import numpy as np
import pytest
from numpy.testing import assert_allclose
from scipy import stats
from scipy.integrate import quad

from cable import CableModel, Kernel, Membrane, Placed, Shared, SpikeTrain, SynapticInput
from cable.noise.cumulants import _between, cumulants
from cable.noise.excursions import Excursions, cornish_fisher, edgeworth_density, edgeworth_tail
from morphology import CellTree, Site, Zone
from noise.cells import EXCITATION, INHIBITION, arbor, model
from oracles import compartments, shot_noise
from oracles.plain import Cell, Cylinder, Input, Sphere
from tolerances import COMPARTMENTS, EXACT, IDENTITY, REFINED

PLAIN = Membrane(axial_resistivity_ohm_cm=150, capacitance_uF_cm2=1, resistance_ohm_cm2=20000, rest_mV=-70)
RC = CellTree.from_text(f"1 1 0 0 0 {(1e4 / (4 * np.pi)) ** 0.5!r} -1\n")  # 100 pF, 200 MOhm, 20 ms
STICK = "1 1 0 0 0 10 -1\n2 3 10 0 0 1 1\n3 3 410 0 0 1 2\n"


def on_sphere(**values: Any) -> SynapticInput:
    usual = {"name": "a", "where": Zone(), "count": 200.0, "spread": "area", "rate_Hz": 5.0, "charge_fC": 20.0}
    return SynapticInput(**usual | values)


def rc(**values: Any) -> CableModel:
    return CableModel(RC, PLAIN, (on_sphere(**values),))


# ---- cumulants


@pytest.mark.parametrize(
    ("kernel", "skewness", "kurtosis"),
    [
        (Kernel.exponential(2.0), 0.193031072455, 0.0409429280397),
        (Kernel.impulse(), 0.210818510678, 0.05),
    ],
)
def test_published_shot_noise(kernel: Kernel, skewness: float, kurtosis: float) -> None:
    """Campbell 1909 and Rice 1944 (from memory); values derived, verified by time-domain and spectral quadrature."""
    (found,) = rc(kernel=kernel).excursions()
    assert found.skewness == pytest.approx(skewness, rel=IDENTITY)
    assert found.excess_kurtosis == pytest.approx(kurtosis, rel=IDENTITY)
    assert found.cumulant_relative_error < EXACT


@pytest.mark.parametrize(
    ("kernel", "poles"),
    [
        (Kernel.alpha(2.0), (2.0, 2.0)),
        (Kernel.two_exponential(0.5, 5.0), (0.5, 5.0)),
        (Kernel.two_exponential(0.05, 300.0), (0.05, 300.0)),
    ],
)
def test_rc_cell_against_the_definition(kernel: Kernel, poles: tuple[float, ...]) -> None:
    point = rc(kernel=kernel).refined.point
    found = cumulants(point, 0)
    want = [shot_noise.cumulant(n, 1.0, 20.0, 0.2, 20.0, poles) for n in (2, 3, 4)]
    assert_allclose(found.by_input[0], want, rtol=EXACT)
    assert (found.relative_error < EXACT).all()


def test_a_ringing_kernel_keeps_its_digits() -> None:
    (found,) = rc(kernel=Kernel.expression("exp(-t/4)*(1 + 0.5*cos(2*t))")).excursions()
    assert found.cumulant_relative_error < EXACT


def compartment_cumulants(site: int, n: int) -> np.ndarray:
    """(3,) κ_n at a node of a ball and stick with both inputs, in compartments, by their eigenvectors.

    The response of node b to an event of area 1 and decay τ at i is Σ_k φ_bk φ_ik (e^{-λ_k t} - e^{-t/τ})/(1 - λ_k τ).
    """
    area = 4 * np.pi * 100.0
    cell = Cell((Cylinder(0, 1, 400.0, 2.0),), (Sphere(0, area),))
    inputs = [
        Input(rate_per_ms=2e-3, event_area=2.0 * 0.5, poles_ms=(2.0,), density_per_um=(0.3,), reversal_mV=70.0),
        Input(rate_per_ms=3e-3, event_area=6.0 * 0.8, poles_ms=(6.0,), number_at=((0, 0.05 * area),), reversal_mV=-5.0),
        Input(rate_per_ms=20e-3, event_area=40.0, poles_ms=(3.0,), number_at=((1, 2.0),)),
    ]
    parts = compartments.discretise(cell, n)
    mean, conductance = compartments.operating_point(parts, inputs)
    root = np.sqrt(parts.capacitance_pF)
    rate, vector = np.linalg.eigh(conductance / np.outer(root, root))
    mode = vector / root[:, None]
    t = np.exp(np.arange(-16.0, 6.5, 0.1))
    total = np.zeros(3)
    for one in inputs:
        tau = one.poles_ms[0]
        curve = (np.exp(-rate[:, None] * t) - np.exp(-t / tau)) / (1 - rate * tau)[:, None]
        size = one.event_area * (1.0 if one.reversal_mV is None else one.reversal_mV - mean)
        response = (mode * size * np.ones(len(mean))[:, None] if np.ndim(size) == 0 else mode * size[:, None]) @ (
            mode[site][:, None] * curve
        )
        events = compartments.synapses(parts, one) * one.rate_per_ms
        total += [events @ (response**order @ t) * 0.1 for order in (2, 3, 4)]
    return total


@pytest.mark.parametrize(("site", "node"), [("soma", 0), ("tip", 1)])
def test_ball_and_stick_against_compartments(site: str, node: int) -> None:
    one = SynapticInput(
        name="e",
        where=Zone(kinds=("basal",)),
        density_per_um=0.3,
        rate_Hz=2.0,
        conductance_nS=0.5,
        reversal_mV=0.0,
        kernel=Kernel.exponential(2.0),
    )
    two = SynapticInput(
        name="i",
        where=Zone(kinds=("soma",)),
        density_per_um2=0.05,
        rate_Hz=3.0,
        conductance_nS=0.8,
        reversal_mV=-75.0,
        kernel=Kernel.exponential(6.0),
    )
    three = SynapticInput(
        name="p",
        at=(Placed(Site("", swc_id=3), 2.0),),
        rate_Hz=20.0,
        charge_fC=40.0,
        kernel=Kernel.exponential(3.0),
    )
    cell = CableModel(CellTree.from_text(STICK), PLAIN, (one, two, three), (Site("tip", swc_id=3),))
    found = cumulants(cell.refined.point, cell.node_of(site)).by_input.sum(axis=0)
    want = compartments.richardson([compartment_cumulants(node, n) for n in (40, 80, 160)])
    assert_allclose(found, want, rtol=3 * COMPARTMENTS)


def test_second_cumulant_is_the_variance_by_another_route() -> None:
    """Time and space against frequency, on trees that taper, with events of several sizes and volleys."""
    tree = arbor(71, 60)
    sites = (Site("far", swc_id=int(tree.ids[55]), fraction=0.4),)
    volleys = replace(EXCITATION, correlation=0.05, size_cv=0.5)
    for inputs in ((EXCITATION, INHIBITION), (volleys, INHIBITION)):
        cell = model(tree, *inputs, sites=sites)
        for site in cell.site_names:
            found = cumulants(cell.refined.point, cell.node_of(site))
            variance = cell.fluctuations().at(site).variance_by_input_mV2
            assert_allclose(found.by_input[:, 0], list(variance.values()), rtol=REFINED)
            assert (found.relative_error < REFINED).all()


@pytest.mark.parametrize("x", [1e-9, 3e-5, 0.99e-4, 1.01e-4, 0.2 + 0.1j, 30 + 40j, 3e3 + 2e3j])
def test_voltage_between_the_ends(x: complex) -> None:
    """Weights sinh x(1 - w)/sinh x and sinh xw/sinh x, against 30 digits."""
    import mpmath as mp

    where = np.array([[0.1, 0.35, 0.8]])
    for near, far in ((1.0, 0.0), (0.0, 1.0)):
        found = _between(np.array([[complex(x)]]), where, np.array([[near]]), np.array([[far]]))[0, :, 0]
        with mp.workdps(30):
            want = [mp.sinh(x * (1 - w if near else mp.mpf(w))) / mp.sinh(x) for w in map(mp.mpf, where[0])]
        assert_allclose(found, [complex(value) for value in want], rtol=1e-11, atol=1e-200)


def test_error_says_how_far_off_a_rule_is(monkeypatch: pytest.MonkeyPatch) -> None:
    """With too few points on a long cylinder the estimate covers the error."""
    one = SynapticInput(
        name="a",
        where=Zone(kinds=("basal",)),
        density_per_um=1,
        rate_Hz=1,
        current_pA=5,
        kernel=Kernel.exponential(0.3),
    )
    cell = CableModel(CellTree.from_text(STICK), PLAIN, (one,))
    exact = cumulants(cell.refined.point, 0)
    monkeypatch.setattr("cable.noise.cumulants.GAUSS", ((5.0, 2),))
    rough = cumulants(cell.refined.point, 0)
    off = np.abs(rough.by_input / exact.by_input - 1)[0]
    assert (off > 1e-6).any() and (off <= rough.relative_error).all()


def test_sizes_are_gamma_numbers() -> None:
    """Campbell's theorem with marks: κ_n times E[aⁿ]/E[a]ⁿ, here of gamma numbers by quadrature."""
    one, varied = (cumulants(rc(size_cv=cv).refined.point, 0).by_input[0] for cv in (0.0, 0.7))
    sizes = stats.gamma(1 / 0.49, scale=0.49)
    assert_allclose(varied / one, [sizes.moment(n) for n in (2, 3, 4)], rtol=1e-12)


def test_volleys_are_events_of_all_who_copy() -> None:
    """Two synapses of correlation c: both at the rate c·r, either alone at (1 - c)·r."""
    tree = CellTree.from_text(STICK)
    here, there = Placed(Site("", swc_id=2)), Placed(Site("", swc_id=3))
    pair = SynapticInput(
        name="a", at=(here, there), rate_Hz=8.0, charge_fC=30.0, correlation=0.3, kernel=Kernel.alpha(1.0)
    )
    both = replace(pair, name="b", rate_Hz=0.3 * 8.0, correlation=1.0)
    alone = [
        replace(pair, name=name, at=(at,), rate_Hz=0.7 * 8.0, correlation=0.0)
        for name, at in zip("cd", pair.at, strict=True)
    ]
    whole, parts = (CableModel(tree, PLAIN, inputs).refined.point for inputs in ((pair,), (both, *alone)))
    found = cumulants(whole, 0).by_input.sum(axis=0)
    assert_allclose(found, cumulants(parts, 0).by_input.sum(axis=0), rtol=1e-11)
    # all in step are one synapse of their summed charge
    step = cumulants(rc(correlation=1.0).refined.point, 0).by_input
    one = cumulants(rc(count=1.0, charge_fC=200 * 20.0).refined.point, 0).by_input
    assert_allclose(step, one, rtol=1e-11)


# ---- levels and rates


@pytest.mark.parametrize(
    ("kernel", "distance_sd", "rate_Hz"),
    [
        (Kernel.exponential(2.0), 0.0, 25.1646060522),
        (Kernel.exponential(2.0), 2.0, 3.40565908762),
        (Kernel.exponential(2.0), 3.0, 0.279553521521),
        (Kernel.alpha(2.0), 0.0, 17.3652279511),
        (Kernel.two_exponential(0.5, 5.0), 0.0, 15.005271936),
    ],
)
def test_published_upcrossings(kernel: Kernel, distance_sd: float, rate_Hz: float) -> None:
    """Rice 1945 (from memory) on an RC cell of 20 ms; values derived, verified by two computations."""
    cell = rc(kernel=kernel)
    at = cell.fluctuations().at("soma")
    (found,) = cell.excursions(level_mV=at.mean_mV + distance_sd * at.sd_mV)
    assert found.upcrossing_Hz == pytest.approx(rate_Hz, rel=EXACT)
    assert found.between_upcrossings_s == pytest.approx(1 / rate_Hz, rel=EXACT)
    assert found.share_above == pytest.approx(stats.norm.sf(distance_sd), rel=EXACT)


def test_upcrossings_of_a_ball_and_stick() -> None:
    """37.3753365578 and 48.5831397932 /s at the mean level (impedance identity and quadrature of ω²S; derived)."""
    one = SynapticInput(
        name="a", where=Zone(), density_per_um2=0.08, rate_Hz=1.0, current_pA=10.0, kernel=Kernel.exponential(2.0)
    )
    tree = CellTree.from_text("1 1 0 0 0 10 -1\n2 3 10 0 0 1 1\n3 3 1010 0 0 1 2\n")
    cell = CableModel(tree, PLAIN, (one,), (Site("tip", swc_id=3),), threshold_mV=-70 + 3.2)
    rates = [found.upcrossing_Hz for found in cell.excursions()]
    assert_allclose(rates, [37.3753365578, 48.5831397932], rtol=EXACT)


@pytest.mark.parametrize("z", [-2.0, 0.5, 2.0, 3.0])
def test_series_are_those_of_the_gamma_distribution(z: float) -> None:
    """A gamma number of shape k has skewness 2/√k and excess kurtosis 6/k; what is left falls as k^{-3/2}."""
    left = []
    for shape in (400.0, 1600.0):
        exact = stats.gamma(shape, loc=-(shape**0.5), scale=shape**-0.5)
        skewness, kurtosis = 2 / shape**0.5, 6 / shape
        tail = edgeworth_tail(z, skewness, kurtosis)
        assert abs(tail - exact.sf(z)) < 0.02 * abs(stats.norm.sf(z) - exact.sf(z))
        value = cornish_fisher(z, skewness, kurtosis)
        assert value == pytest.approx(exact.isf(stats.norm.sf(z)), abs=1e-3 * 400 / shape)
        left.append([abs(tail - exact.sf(z)), abs(value - exact.isf(stats.norm.sf(z)))])
    assert (np.array(left[0]) / np.array(left[1]) > 6.5).all()  # 8 for a clean power


def test_shares_and_levels_undo_each_other() -> None:
    (found,) = rc(kernel=Kernel.exponential(2.0)).excursions(level_mV=-64.5)
    level = found.exceeded_mV(found.share_above)
    assert level == pytest.approx(-64.5, rel=1e-12)
    corrected = found.exceeded_corrected_mV(found.share_above_corrected)
    assert corrected == pytest.approx(-64.5, abs=0.03 * found.sd_mV)
    assert abs(found.share_above_corrected / found.share_above - 1) > 0.1


def test_share_of_time_in_a_simulation() -> None:
    """Exact steps between jumps of an RC cell; the corrected share fits, the Gaussian one does not."""
    (found,) = rc(count=1.0, rate_Hz=250.0).excursions(level_mV=-70 + 1.0 + 2 * 0.2**0.5 * 0.5**0.5)
    rng = np.random.default_rng(5)
    gaps = rng.exponential(4.0, 400_000)
    voltage, above = 0.0, 0.0
    level = found.level_mV + 70
    blocks = np.zeros(200)
    for k, gap in enumerate(gaps):
        voltage += 0.2
        if voltage > level:
            above = min(gap, 20 * math.log(voltage / level))
            blocks[k // 2000] += above / (2000 * 4.0)
        voltage *= math.exp(-gap / 20)
    mean, error = blocks.mean(), blocks.std(ddof=1) / len(blocks) ** 0.5
    assert abs(mean - found.share_above_corrected) < 4 * error
    assert abs(mean - found.share_above) > 4 * error


# ---- what cannot be known, and what is doubtful


def refusal(*inputs: SynapticInput, tree: CellTree = RC, site: str = "soma", **extra: Any) -> Excursions:
    (found,) = CableModel(tree, PLAIN, inputs, **extra).excursions((site,), -60.0)
    assert math.isnan(found.skewness) and math.isnan(found.share_above_corrected)
    assert math.isnan(found.exceeded_corrected_mV(0.01))
    return found


@pytest.mark.parametrize(
    ("changes", "words"),
    [
        ({"spike_train": SpikeTrain.gamma(2.0)}, "its spike trains are no Poisson trains (gamma)"),
        ({"spike_train": SpikeTrain.dead_time(5.0)}, "no Poisson trains (dead time)"),
        ({"correlation": 0.1, "shares": (Shared("b", 0.1),)}, "its spikes are shared with another input"),
    ],
)
def test_only_poisson_trains_have_cumulants(changes: dict[str, Any], words: str) -> None:
    other = on_sphere(name="b", correlation=0.1, kernel=Kernel.alpha(2.0))
    found = refusal(on_sphere(**changes, kernel=Kernel.alpha(2.0)), other)
    assert words in found.warnings[0] and "of 'a'" in found.warnings[0]
    assert found.upcrossing_Hz > 0 and found.share_above > 0 and found.exceeded_mV(0.01) > found.mean_mV


def test_silent_inputs_do_not_matter() -> None:
    silent = on_sphere(name="b", rate_Hz=0.0, kernel=Kernel.alpha(2.0), spike_train=SpikeTrain.gamma(2.0))
    cell = CableModel(RC, PLAIN, (on_sphere(kernel=Kernel.alpha(2.0)), silent))
    assert cell.excursions()[0].skewness == pytest.approx(rc(kernel=Kernel.alpha(2.0)).excursions()[0].skewness)


def test_density_has_the_moments_it_was_made_from() -> None:
    """By adaptive quadrature (scipy), and its tail is the integral above z."""
    skewness, kurtosis = 0.4, 0.3
    moments = [
        quad(lambda z, n=n: z**n * float(edgeworth_density(z, skewness, kurtosis)), -14, 14, limit=200)[0]
        for n in range(5)
    ]
    assert np.allclose(moments, [1, 0, 1, skewness, 3 + kurtosis], rtol=EXACT, atol=EXACT)
    above = quad(lambda z: float(edgeworth_density(z, skewness, kurtosis)), 1.3, 14)[0]
    assert abs(edgeworth_tail(1.3, skewness, kurtosis) - above) < EXACT


def test_charges_at_once_on_a_neurite() -> None:
    tree = CellTree.from_text("1 3 0 0 0 1 -1\n2 3 500 0 0 1 1\n")
    sites = (Site("middle", swc_id=2, fraction=0.5),)
    spread = SynapticInput(name="a", where=Zone(), density_per_um=1.0, rate_Hz=2.0, charge_fC=5.0)
    found = refusal(spread, tree=tree, site="middle", sites=sites)
    assert "the third cumulant is infinite" in found.warnings[0] and found.sd_mV > 0
    point = replace(spread, where=None, density_per_um=None, at=(Placed(sites[0]),))
    found = refusal(point, tree=tree, site="middle", sites=sites)
    assert "the variance is infinite there" in found.warnings[0] and math.isnan(found.sd_mV)
    assert math.isnan(found.share_above) and math.isnan(found.upcrossing_Hz)
    ends = CableModel(tree, PLAIN, (point,), (*sites, Site("end", swc_id=2))).excursions(("end",), -69.0)
    assert ends[0].skewness > 0 and ends[0].cumulant_relative_error < EXACT


def test_nothing_fluctuates() -> None:
    (found,) = CableModel(RC, PLAIN).excursions(level_mV=-75.0)
    assert (found.upcrossing_Hz, found.between_upcrossings_s, found.share_above) == (0.0, math.inf, 1.0)
    assert found.warnings == ("nothing fluctuates here",)


def test_no_level() -> None:
    (found,) = rc(kernel=Kernel.alpha(2.0)).excursions()
    assert found.level_mV is None and math.isnan(found.upcrossing_Hz) and math.isnan(found.share_above)
    assert found.skewness > 0 and found.exceeded_corrected_mV(0.01) > found.exceeded_mV(0.01)


def test_doubts() -> None:
    event = {"charge_fC": None, "conductance_nS": 0.5, "reversal_mV": 0.0, "kernel": Kernel.exponential(2.0)}
    one = on_sphere(**event)
    two = replace(one, name="b", reversal_mV=-60.0)
    (found,) = CableModel(RC, PLAIN, (one, two)).excursions(level_mV=5.0)
    assert any("beyond every reversal potential (the highest is 0 mV)" in w for w in found.warnings)
    assert any("reversal potential of 'b' is" in w for w in found.warnings)
    (found,) = CableModel(RC, PLAIN, (one, on_sphere(name="c", charge_fC=1.0))).excursions(level_mV=5.0)
    assert not any("beyond" in w for w in found.warnings)  # a current may bring it there
    (found,) = rc(count=1.0, charge_fC=200.0).excursions(level_mV=-68.9)
    assert found.skewness > 0.5 and any("the skewness 3 is large" in w for w in found.warnings)
    assert any("the corrected density is negative at the level" in w for w in found.warnings)
    assert math.isnan(found.share_above_corrected)
    (found,) = rc(correlation=0.05).excursions(level_mV=-60.0)
    assert any("copied from one common train" in w for w in found.warnings)
    (found,) = rc().excursions(level_mV=-64.0)
    assert found.warnings == ()


def test_messages() -> None:
    with pytest.raises(KeyError, match="no site 'x'"):
        rc().excursions(("x",))
    with pytest.raises(ValueError, match="level_mV: expected a finite number"):
        rc().excursions(level_mV=math.inf)
