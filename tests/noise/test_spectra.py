"""One electrode by frequency: published impedances, worked spectra, Parseval, slopes."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from numpy.testing import assert_allclose
from scipy.integrate import quad

from cable import CableModel, Kernel, Membrane, SpikeTrain, SynapticInput
from morphology import CellTree, Site, Zone
from noise.cells import EXCITATION, arbor, model
from oracles import worked
from oracles.shot_noise import psd_one_sided_mV2_per_Hz
from tolerances import ALGEBRA, EXACT, IDENTITY, ROUND_OFF, TYPED

PLAIN = Membrane(axial_resistivity_ohm_cm=150, capacitance_uF_cm2=1, resistance_ohm_cm2=20000, rest_mV=0)
CABLE = "1 3 0 0 0 1 -1\n2 3 1000 0 0 1 1\n"
# |Z| (MΩ) and phase (deg) at the end of a sealed cable, |V(l)/V(0)|: Rall & Rinzel 1973, Koch & Poggio 1985
# (from memory), derived, verified by two computations
SEALED = {
    1.0: (460.376310283, -5.09853657946, 0.540329957387),
    10.0: (316.000687814, -32.5606690592, 0.486760122912),
    100.0: (110.143604948, -42.6532131696, 0.0818497428828),
    1000.0: (34.7763463227, -44.7720323331, 0.000116959089703),
}


def test_published_impedance_of_a_sealed_cable() -> None:
    cell = CableModel(CellTree.from_text(CABLE), PLAIN, (), (Site("tip", swc_id=2),))
    found = cell.spectrum("soma", np.array([0.0, *SEALED]), to="tip")
    assert found.transfer_impedance_MOhm is not None
    assert abs(found.input_impedance_MOhm[0]) == pytest.approx(463.526791954, rel=TYPED)
    for k, (size, degrees, attenuation) in enumerate(SEALED.values(), start=1):
        z = found.input_impedance_MOhm[k]
        assert abs(z) == pytest.approx(size, rel=TYPED)
        assert np.degrees(np.angle(z)) == pytest.approx(degrees, rel=TYPED)
        assert abs(found.transfer_impedance_MOhm[k] / z) == pytest.approx(attenuation, rel=TYPED)


def test_worked_spectra() -> None:
    one = SynapticInput(
        name="a", rate_Hz=1, kernel=Kernel.exponential(2.0), where=Zone(), density_per_um2=0.08, current_pA=10
    )
    tree = CellTree.from_text("1 1 0 0 0 10 -1\n2 3 10 0 0 1 1\n3 3 1010 0 0 1 2\n")
    cell = CableModel(tree, PLAIN, (one,), (Site("tip", swc_id=3),))
    want = worked.ball_and_stick()
    frequency = np.array([0.0, 1.0, 10.0, 100.0])
    soma, tip = (cell.spectrum(site, frequency).psd_mV2_per_Hz for site in ("soma", "tip"))
    assert_allclose(soma, [float(want[f"psd_soma_{f}Hz_mV2_per_Hz"]) for f in (0, 1, 10, 100)], rtol=EXACT)
    # the cross-spectrum from what a person sees of it; it is real, and has changed its sign by 100 Hz
    pair = cell.pair("soma", "tip", np.zeros(1), frequency)
    shared = np.sqrt(pair.coherence * soma * tip) * np.cos(pair.phase_rad)
    typed = [float(want[f"psd_soma_tip_{f}Hz_mV2_per_Hz"]) for f in (1, 10, 100)]
    assert_allclose(shared[1:], typed, rtol=IDENTITY)
    assert typed[2] < 0


def test_spectra_of_separate_inputs_add() -> None:
    tree = arbor(21, 40)
    halves = [
        replace(EXCITATION, name=kind, where=Zone(kinds=(kind,)), conductance_nS=None, reversal_mV=None, current_pA=3.0)
        for kind in ("basal", "apical")
    ]
    frequency = np.array([0.0, 3.0, 40.0, 900.0])
    both = model(tree, *halves).spectrum("soma", frequency)
    for half in halves:
        alone = model(tree, half).spectrum("soma", frequency)
        assert_allclose(both.psd_by_input_mV2_per_Hz[half.name], alone.psd_mV2_per_Hz, rtol=ALGEBRA)
    assert_allclose(sum(both.psd_by_input_mV2_per_Hz.values()), both.psd_mV2_per_Hz, rtol=ROUND_OFF)


def test_frequencies_unless_given_and_where_wrong() -> None:
    cell = CableModel(CellTree.from_text(CABLE), PLAIN)
    assert_allclose(cell.spectrum("soma").frequency_Hz, np.geomspace(0.1, 1000, 61))
    with pytest.raises(ValueError, match="at least 0"):
        cell.spectrum("soma", np.array([1.0, -1.0]))
    with pytest.raises(KeyError, match="the sites are soma"):
        cell.spectrum("tip")


@pytest.mark.parametrize("train", [SpikeTrain.gamma(6), SpikeTrain.dead_time(4.0)])
def test_regular_trains_keep_their_digits_at_low_frequency(train: SpikeTrain) -> None:
    """A regular train has little power at low frequency; what is left, rate·CV², is a small difference."""
    rate_Hz = 240.0
    one = SynapticInput(
        name="a",
        rate_Hz=rate_Hz,
        kernel=Kernel.exponential(2.0),
        where=Zone(),
        density_per_um=1,
        current_pA=1,
        spike_train=train,
    )
    tree = CellTree.from_text(CABLE)
    poisson = replace(one, spike_train=SpikeTrain.poisson())
    frequency = np.array([0.0, 1e-6, 1e-4, 1e-2])
    regular, plain = (CableModel(tree, PLAIN, (i,)).spectrum("soma", frequency).psd_mV2_per_Hz for i in (one, poisson))
    square = 1 / 6 if train.process == "gamma" else (1 - 4e-3 * rate_Hz) ** 2
    assert_allclose(regular[:3] / plain[:3], square, rtol=EXACT)
    assert regular[3] / plain[3] == pytest.approx(square, rel=1e-5)


def test_sphere_is_filtered_shot_noise() -> None:
    one = SynapticInput(
        name="a", rate_Hz=5, kernel=Kernel.exponential(2.0), where=Zone(), count=200, spread="area", current_pA=5
    )
    cell = CableModel(CellTree.from_text("1 1 0 0 0 10 -1\n"), PLAIN, (one,))
    frequency = np.array([0.1, 10.0, 300.0])
    want = [psd_one_sided_mV2_per_Hz(f, 1.0, 10.0, 1.59154943091895, 20.0, (2.0,)) for f in frequency]
    found = cell.spectrum("soma", frequency)
    assert_allclose(found.psd_mV2_per_Hz, [float(v) for v in want], rtol=EXACT)
    assert cell.spectrum("soma", np.geomspace(1e3, 1e5, 30)).slope == pytest.approx(-4.0, abs=1e-3)
    assert found.falls_as == 4.0
    # S(0) over twice the variance of an RC cell with exponential events: the sum of the two time constants
    assert cell.fluctuations().correlation_time_ms[0] == pytest.approx(22.0, rel=EXACT)


def test_spectra_integrate_to_variances_input_by_input() -> None:
    tree = arbor(21, 40)
    cell = model(tree, sites=(Site("far", swc_id=int(tree.ids[39])),))
    for site in cell.site_names:

        def density(log_f: float, name: str, site: str = site) -> float:
            f = np.array([np.exp(log_f)])
            return float(cell.spectrum(site, f).psd_by_input_mV2_per_Hz[name][0] * f[0])

        for name, variance in cell.fluctuations().at(site).variance_by_input_mV2.items():
            total = sum(quad(density, a, a + 2, args=(name,), epsrel=1e-9)[0] for a in range(-10, 12, 2))
            low = np.exp(-10) * cell.spectrum(site, np.zeros(1)).psd_by_input_mV2_per_Hz[name][0]
            assert total + low == pytest.approx(variance, rel=1e-7)


def test_slope_of_synapses_spread_on_a_neurite() -> None:
    """On a long cable the spectrum falls with the power 3/2 + 2n for a kernel that falls with n."""
    for kernel, power in ((Kernel.exponential(2.0), 3.5), (Kernel.alpha(2.0), 5.5)):
        one = SynapticInput(name="a", where=Zone(), density_per_um=1.0, rate_Hz=1.0, current_pA=5.0, kernel=kernel)
        found = CableModel(CellTree.from_text(CABLE), PLAIN, (one,)).spectrum("soma", np.geomspace(1e4, 1e6, 20))
        assert found.falls_as == power
        assert found.slope == pytest.approx(-power, abs=0.01)
