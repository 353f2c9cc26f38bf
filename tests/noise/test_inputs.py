"""Kinds of input: sizes that vary, charge at once, spike trains, and spikes shared between populations."""

from __future__ import annotations

from dataclasses import replace
from typing import Any

import numpy as np
import pytest
from numpy.testing import assert_allclose
from scipy.integrate import quad

from cable import CableModel, Electrode, Kernel, Membrane, Placed, Shared, SpikeTrain, SynapticInput
from cable.network.quadrature import NotConverged
from morphology import CellTree, Site, Zone
from noise.cells import EXCITATION, INHIBITION, arbor
from oracles import shot_noise
from tolerances import EXACT, IDENTITY, REFINED, TYPED

PLAIN = Membrane(axial_resistivity_ohm_cm=150, capacitance_uF_cm2=1, resistance_ohm_cm2=20000, rest_mV=-70)
RC = CellTree.from_text(f"1 1 0 0 0 {(1e4 / (4 * np.pi)) ** 0.5!r} -1\n")  # 100 pF, 200 MOhm, 20 ms
LONG = "1 3 0 0 0 1 -1\n2 3 12000 0 0 1 1\n"  # 14.7 length constants
MIDDLE = Site("middle", swc_id=2, fraction=0.5)


def on_sphere(**values: Any) -> SynapticInput:
    return SynapticInput(**{"name": "a", "where": Zone(), "count": 200.0, "spread": "area", "rate_Hz": 5.0} | values)


def variance(*inputs: SynapticInput, tree: CellTree = RC, site: str = "soma", **extra: Any) -> float:
    return CableModel(tree, PLAIN, inputs, **extra).fluctuations().at(site).variance_mV2


def cell(*inputs: SynapticInput) -> CableModel:
    tree = arbor(61, 40, untapered=True)
    return CableModel(tree, PLAIN, inputs, (Site("far", swc_id=int(tree.ids[35]), fraction=0.3),))


# ---- charge that comes at once


def test_charge_at_once_on_an_rc_cell() -> None:
    """Campbell's theorem: ν (Q/C)² τ/2 (Campbell 1909, from memory; derived)."""
    field = CableModel(RC, PLAIN, (on_sphere(charge_fC=20.0),), threshold_mV=-60.0).fluctuations()
    assert field.at("soma").variance_mV2 == pytest.approx(0.4, rel=EXACT)
    assert field.at("soma").mean_mV == pytest.approx(-66.0, rel=EXACT)
    assert field.variance_note == ""
    assert np.isnan(field.at("soma").upcrossing_Hz)
    assert "charge comes at once" in field.upcrossing_note


@pytest.mark.parametrize(
    ("train", "want"), [(SpikeTrain.gamma(2.0), 0.00553846153846), (SpikeTrain.dead_time(10.0), 0.00565457065693)]
)
def test_regular_trains_of_jumps(train: SpikeTrain, want: float) -> None:
    """One synapse of 20/s, jumps of 0.2 mV: renewal theory, derived, verified by event simulation."""
    assert variance(on_sphere(count=1.0, rate_Hz=20.0, charge_fC=20.0, spike_train=train)) == pytest.approx(
        want, rel=EXACT
    )


def test_charge_at_once_is_half_the_input_resistance() -> None:
    """Var = (D/2) Z_xx(0), D = rate·density·Q²/c, where density goes with capacitance, on any tree (derived)."""
    one = SynapticInput(name="a", where=Zone(), density_per_um2=0.08, rate_Hz=1.0, charge_fC=20.0)
    field = cell(one).fluctuations()
    strength = 1e-3 * 0.08 * 20.0**2 / 0.01
    assert_allclose(field.variance_mV2, strength / 2 * field.input_resistance_MOhm * 1e-3, rtol=IDENTITY)


def test_charge_with_a_kernel_is_its_peak_current() -> None:
    slow, peak = on_sphere(charge_fC=20.0, kernel=Kernel.alpha(2.0)), on_sphere(kernel=Kernel.alpha(2.0), current_pA=1)
    assert variance(slow) == pytest.approx(0.347107438017, rel=TYPED)  # ν (QR)² (a + 2τ)/(4 (a + τ)²), derived
    assert variance(slow) == pytest.approx((20 / (2 * np.e)) ** 2 * variance(peak), rel=EXACT)


@pytest.fixture
def point_charges() -> CableModel:
    """One synapse whose charge comes at once in the middle of a long cable."""
    one = SynapticInput(name="a", at=(Placed(MIDDLE),), rate_Hz=100.0, charge_fC=20.0)
    off = MIDDLE.fraction + PLAIN.length_constant_um(2.0) / 12000
    return CableModel(CellTree.from_text(LONG), PLAIN, (one,), (MIDDLE, Site("off", swc_id=2, fraction=off)))


def test_point_charges_have_no_variance_where_they_sit(point_charges: CableModel) -> None:
    field = point_charges.fluctuations()
    here, off = field.at("middle"), field.at("off")
    assert np.isnan(here.sd_mV) and np.isnan(here.variance_mV2) and np.isnan(here.correlation_time_ms)
    assert "the variance is infinite there" in field.variance_note
    # ν τ (Q/(c λ))² K0(2X)/(2π) at X = 1 on an infinite cable (derived, verified by two computations)
    assert off.variance_mV2 == pytest.approx(0.00550987823807, rel=REFINED)  # its ends are 7 length constants off
    assert field.certificate.quadrature_relative_error < 1e-9
    assert np.isfinite(here.mean_mV) and np.isfinite(field.sd_mV).all()


def test_other_answers_refuse_an_infinite_variance(point_charges: CableModel) -> None:
    for ask in (
        lambda: point_charges.sources("middle"),
        lambda: point_charges.recording("middle"),
        lambda: point_charges.pair("middle", "off", np.zeros(1), np.ones(1)),
        lambda: point_charges.modes(2),
    ):
        with pytest.raises(NotConverged, match="the variance is infinite at a place asked for"):
            ask()
    spectrum = point_charges.spectrum("middle", np.array([1e4, 1e6]))
    assert (spectrum.psd_mV2_per_Hz[0] / spectrum.psd_mV2_per_Hz[1]) == pytest.approx(100.0, rel=0.01)
    shared = point_charges.correlation_map("off")
    assert np.isfinite(shared.correlation).all()
    assert np.isnan(point_charges.correlation_map("middle").correlation).all()
    assert point_charges.sources("off").variance_share.sum() == pytest.approx(1.0)


def test_spread_charges_are_rough_but_finite() -> None:
    """Uniform white noise on a long cable: SD 0.556984290688 mV (derived, verified by two computations)."""
    one = SynapticInput(name="a", where=Zone(), density_per_um=0.5, rate_Hz=1.0, charge_fC=20.0)
    field = CableModel(CellTree.from_text(LONG), PLAIN, (one,), (MIDDLE,), threshold_mV=-60.0).fluctuations()
    assert field.at("middle").sd_mV == pytest.approx(0.556984290688, rel=1e-6)  # the ends are 7 length constants off
    assert np.isnan(field.upcrossing_Hz).all()


# ---- sizes that vary


def test_sizes_of_two_values_are_a_thinned_train() -> None:
    """Sizes 0 and 2a, half of the events each, have CV 1 and are a train of half the rate and size 2a.

    Thinning halves the correlation of two trains, and takes off part of what is regular about one.
    """
    for correlation in (0.0, 0.3):
        one = replace(EXCITATION, conductance_nS=None, reversal_mV=None, current_pA=3.0, correlation=correlation)
        two = replace(one, rate_Hz=one.rate_Hz / 2, current_pA=6.0, correlation=correlation / 2)
        assert_allclose(
            cell(replace(one, size_cv=1.0)).fluctuations().variance_mV2,
            cell(two).fluctuations().variance_mV2,
            rtol=EXACT,
        )


@pytest.mark.parametrize("train", [SpikeTrain.gamma(3.0), SpikeTrain.dead_time(8.0)])
def test_sizes_add_a_white_part(train: SpikeTrain) -> None:
    """Independent sizes add rate·cv² at every frequency, whatever the train; means stay."""
    regular = replace(EXCITATION, spike_train=train, rate_Hz=40.0, correlation=0.02)
    poisson = replace(regular, spike_train=SpikeTrain.poisson(), correlation=0.0)
    varied, plain, white = (
        cell(one, INHIBITION).fluctuations() for one in (replace(regular, size_cv=0.7), regular, poisson)
    )
    for name, factor in (("excitation", 0.49), ("inhibition", 0.0)):
        parts = [field.variance_by_input_mV2[name] for field in (varied, plain, white)]
        assert_allclose(parts[0], parts[1] + factor * parts[2], rtol=10 * EXACT)
    assert_allclose(varied.mean_mV, plain.mean_mV, rtol=1e-14)


# ---- spikes shared between populations


def test_two_halves_that_share_all_they_can_are_one_population() -> None:
    """Sharing c between two equal populations of correlation c is one population of double the count."""
    whole = replace(INHIBITION, density_per_um2=0.04, correlation=0.05, size_cv=0.4, name="w")
    half = replace(whole, density_per_um2=0.02)
    halves = replace(half, name="a", shares=(Shared("b", 0.05),)), replace(half, name="b")
    electrode = (Electrode(site="far", mode="current clamp", pipette_capacitance_pF=3.0),)
    one = replace(cell(whole, EXCITATION), electrodes=electrode)
    two = replace(cell(*halves, EXCITATION), electrodes=electrode)
    assert two.part_names == ("a", "b", "excitation", "shared")
    field, both = one.fluctuations(), two.fluctuations()
    assert_allclose(both.variance_mV2, field.variance_mV2, rtol=EXACT)
    parts = both.variance_by_input_mV2
    assert_allclose(sum(parts.values()), both.variance_mV2, rtol=1e-14)
    # each half alone: (1 - c) v + c u, together 2(1 - c) v + 4c u, so shared is 2c u
    alone = (1 + 0.4**2) * cell(replace(half, correlation=0.0, size_cv=0.0)).fluctuations().variance_mV2
    assert (parts["shared"] > 0).all() and alone.shape == parts["a"].shape
    lag, hertz = np.array([-7.0, 0.0, 3.0]), np.array([2.0, 60.0])
    pairs = [m.pair("soma", "far", lag, hertz) for m in (one, two)]
    assert_allclose(pairs[1].covariance_mV2, pairs[0].covariance_mV2, rtol=IDENTITY)
    assert_allclose(pairs[1].coherence, pairs[0].coherence, rtol=IDENTITY)
    spectra = [m.spectrum("far", hertz).psd_mV2_per_Hz for m in (one, two)]
    assert_allclose(spectra[1], spectra[0], rtol=IDENTITY)
    maps = [m.correlation_map("far").correlation for m in (one, two)]
    assert_allclose(maps[1], maps[0], rtol=1e-6)
    sources = [m.sources("soma") for m in (one, two)]
    assert_allclose(sources[1].variance_mV2, sources[0].variance_mV2, rtol=IDENTITY, atol=1e-12)
    records = [m.recording("far").recorded for m in (one, two)]
    assert records[1].variance == pytest.approx(records[0].variance, rel=IDENTITY)
    assert records[1].square == pytest.approx(records[0].square, rel=IDENTITY)
    clamps = [
        replace(m, electrodes=(Electrode(site="soma", mode="voltage clamp", holding_mV=-65, series_resistance_MOhm=8),))
        for m in (one, two)
    ]
    shares = [m.clamp_shares("soma").noise_share for m in clamps]
    assert shares[1] == pytest.approx(shares[0], rel=IDENTITY)


def test_shared_part_is_the_product_of_the_responses() -> None:
    """Two correlated populations on an RC cell: 2 f √(ν_a ν_b) n_a n_b ∫h_a h_b dt (Campbell's theorem; derived)."""
    a = on_sphere(correlation=0.3, kernel=Kernel.exponential(2.0), charge_fC=20.0, shares=(Shared("b", 0.25),))
    b = on_sphere(name="b", correlation=0.5, kernel=Kernel.exponential(7.0), charge_fC=-9.0, count=80.0, rate_Hz=3.0)
    field = CableModel(RC, PLAIN, (a, b)).fluctuations()

    def product(t: float) -> float:
        return float(
            shot_noise.response_mV(t, 20.0, 0.2, 20.0, (2.0,)) * shot_noise.response_mV(t, -9.0, 0.2, 20.0, (7.0,))
        )

    overlap = quad(product, 0, 40, epsrel=1e-12)[0] + quad(product, 40, 600, epsrel=1e-12)[0]
    want = 2 * 0.25 * np.sqrt(5e-3 * 3e-3) * 200 * 80 * overlap
    assert field.at("soma").variance_by_input_mV2["shared"] == pytest.approx(want, rel=EXACT)
    assert want < 0  # excitation and inhibition in common cancel
    without = CableModel(RC, PLAIN, (replace(a, shares=()), b)).fluctuations().at("soma").variance_by_input_mV2
    for name, value in without.items():
        assert field.at("soma").variance_by_input_mV2[name] == pytest.approx(value, rel=EXACT)


def test_shared_variance_goes_half_to_the_places_of_either() -> None:
    a = replace(EXCITATION, correlation=0.1, shares=(Shared("inhibition", 0.08),))
    model = cell(a, replace(INHIBITION, correlation=0.1, rate_Hz=EXCITATION.rate_Hz))
    found, at = model.sources("far"), model.fluctuations().at("far")
    for name, part in found.variance_by_input_mV2.items():
        assert part.sum() == pytest.approx(at.variance_by_input_mV2[name], rel=REFINED)
    kind, shared = model.tree.shape.kind, found.variance_by_input_mV2["shared"]
    sphere = shared[model.tree.shape.soma]
    assert sphere != 0  # only inhibition sits there
    apical = shared[kind == 4].sum()  # only excitation
    both = shared[kind == 3].sum()
    assert sphere + apical + both == pytest.approx(at.variance_by_input_mV2["shared"], rel=REFINED)
    # all that inhibition contributes is half: silence it everywhere but on the soma and its half is the soma's
    on_soma = replace(INHIBITION, where=Zone(kinds=("soma",)), correlation=0.1, rate_Hz=EXCITATION.rate_Hz)
    shared = cell(a, on_soma).sources("far").variance_by_input_mV2["shared"]
    assert shared[0] == pytest.approx(shared.sum() / 2, rel=IDENTITY)


def test_everything_in_common_reaches_every_place_alike() -> None:
    """What is fully in step on a uniform tree is the same everywhere: 232.727272727 mV² (derived, two ways)."""
    text = "1 1 0 0 0 10 -1\n2 3 10 0 0 1 1\n3 3 1010 0 0 1 2\n"
    half = SynapticInput(
        name="a",
        where=Zone(),
        density_per_um2=0.04,
        rate_Hz=1.0,
        current_pA=10.0,
        kernel=Kernel.exponential(2.0),
        correlation=1.0,
        shares=(Shared("b", 1.0),),
    )
    field = CableModel(CellTree.from_text(text), PLAIN, (half, replace(half, name="b", shares=()))).fluctuations()
    assert_allclose(field.variance_mV2, 232.727272727, rtol=EXACT)
    assert_allclose(field.variance_by_input_mV2["shared"], 232.727272727 / 2, rtol=EXACT)


@pytest.mark.parametrize("train", [SpikeTrain.gamma(2.0), SpikeTrain.dead_time(9.0)])
def test_lagged_covariances_of_regular_trains_that_share(train: SpikeTrain) -> None:
    """The parts at lag 0 against the variances, and a lag against a plain cosine integral of the spectrum."""
    common: dict[str, Any] = {"spike_train": train, "rate_Hz": 60.0, "correlation": 0.2, "size_cv": 0.8}
    a = replace(EXCITATION, **common, shares=(Shared("inhibition", 0.15),))
    model = cell(a, replace(INHIBITION, **common))
    lagged = model.pair("far", "far", np.array([11.0]), np.ones(1))
    at = model.fluctuations().at("far")
    zero = lagged.covariances.at_zero_mV2[:, 0, 0]
    assert_allclose(zero, list(at.variance_by_input_mV2.values()), rtol=10 * EXACT)
    hertz = np.linspace(0.0, 4000.0, 40001)
    found = model.spectrum("far", hertz)
    for name, psd in found.psd_by_input_mV2_per_Hz.items():
        want = np.trapezoid(psd * np.cos(2e-3 * np.pi * hertz * 11.0), hertz)
        assert lagged.covariance_by_input_mV2[name] == pytest.approx(want, abs=1e-5 * at.variance_mV2)
