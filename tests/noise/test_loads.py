"""What electrodes do to the cell: against a dense nodal solve in which each is a node more, and in its limits."""

from __future__ import annotations

import math
from dataclasses import replace

import numpy as np
import pytest
from scipy import constants
from scipy.integrate import quad
from scipy.linalg import eigh

from cable import CableModel, Membrane, ModelError
from cable.theory.electrode import Electrode
from morphology import CellTree, Site
from noise.cells import arbor, model
from noise.electrode_cells import BALL_AND_STICK, MEMBRANE, sphere, spread
from oracles.dense import cylinder_noise_mp, cylinder_two_port_mp, impedance_and_covariance, nodal_matrices
from tolerances import ALGEBRA, IDENTITY

HZ = 2e-3 * math.pi
AT_SOMA = Electrode(site="soma", series_resistance_MOhm=12.0, pipette_capacitance_pF=6.0)
AT_TIP = Electrode(site="tip", series_resistance_MOhm=45.0, pipette_capacitance_pF=9.0, seal_GOhm=3.0)


def dense(frequency_Hz: float) -> tuple[np.ndarray, np.ndarray]:
    """Impedances and one-sided spectra of soma, tip and the inputs of the amplifiers at soma and tip."""
    s = 1j * HZ * frequency_Hz
    area, per_um2, colour = (
        (400 * math.pi, 2000 * math.pi),
        5e-4 + s * 0.01,
        0.08e-3 * 400 / (1 + (HZ * frequency_Hz * 2) ** 2),
    )
    axial = 1000 * 150 / (1e5 * math.pi)
    y11, y12 = (complex(v) for v in cylinder_two_port_mp(axial, per_um2 * area[1]))
    aa, bb, ab = cylinder_noise_mp(np.sqrt(axial * per_um2 * area[1]))
    noise = colour * area[1] * np.array([[complex(aa), complex(ab)], [np.conj(complex(ab)), complex(bb)]])
    edges, ports, edge_noise = [(0, 1)], [np.array([[y11, y12], [y12, y11]])], [noise]
    for cell_node, own, one in ((0, 2, AT_SOMA), (1, 3, AT_TIP)):
        g = 1e3 / one.series_resistance_MOhm
        edges.append((cell_node, own))
        ports.append(np.array([[g, -g], [-g, g]]))
        edge_noise.append(np.zeros((2, 2)))
    shunt = [per_um2 * area[0], 1 / 3.0, s * 6.0, s * 9.0]
    a, w = nodal_matrices([shunt], edges, [ports], [edge_noise], [[colour * area[0], 0, 0, 0]])
    z, p = impedance_and_covariance(a, w)
    return z[0], 2e-3 * p[0]


@pytest.mark.parametrize("frequency_Hz", [0.0, 8.0, 150.0, 2500.0])
def test_electrodes_are_nodes_more(frequency_Hz: float) -> None:
    cell = spread(BALL_AND_STICK, AT_SOMA, AT_TIP)
    impedance, spectra = dense(frequency_Hz)
    f = np.array([frequency_Hz])
    for site, node in (("soma", 0), ("tip", 1)):
        found = cell.spectrum(site, f, to="soma")
        assert found.input_impedance_MOhm[0] == pytest.approx(1e3 * impedance[node, node], rel=ALGEBRA)
        assert found.transfer_impedance_MOhm[0] == pytest.approx(1e3 * impedance[node, 0], rel=ALGEBRA)
        record = cell.recording(site).spectrum(f)
        assert record.loaded[0] == pytest.approx(spectra[node, node].real, rel=1e-9)
        assert record.recorded[0] == pytest.approx(spectra[2 + node, 2 + node].real, rel=1e-9)


def test_the_sweep_hears_the_same_load_as_the_columns() -> None:
    """The map at all points and the spectra at one site are two ways through the network."""
    cell = spread(BALL_AND_STICK, AT_SOMA, AT_TIP)
    field = cell.fluctuations()
    for site in ("soma", "tip"):
        assert field.at(site).variance_mV2 == pytest.approx(cell.recording(site).loaded.variance, rel=IDENTITY)
        assert field.at(site).mean_mV == pytest.approx(cell.recording(site).loaded.mean, rel=IDENTITY)
    bare = spread(BALL_AND_STICK)
    assert field.at("tip").sd_mV < 0.9 * bare.fluctuations().at("tip").sd_mV


@pytest.mark.parametrize(
    "one",
    [
        Electrode(site="soma"),
        Electrode(site="soma", series_resistance_MOhm=50.0),
        Electrode(site="soma", series_resistance_MOhm=50.0, bridge_balance=0.2),
    ],
)
def test_without_capacitance_and_leak_the_cell_is_the_same(one: Electrode) -> None:
    tree = arbor(5, 40)
    bare, with_it = model(tree).fluctuations(), model(tree, electrodes=(one,)).fluctuations()
    assert np.array_equal(bare.mean_mV, with_it.mean_mV)
    assert np.array_equal(bare.variance_mV2, with_it.variance_mV2)
    assert np.array_equal(bare.input_resistance_MOhm, with_it.input_resistance_MOhm)


def test_small_loads_change_little_and_in_proportion() -> None:
    bare = spread(BALL_AND_STICK).fluctuations().at("soma").variance_mV2
    loss = [
        1
        - spread(BALL_AND_STICK, Electrode(site="soma", pipette_capacitance_pF=c)).recording("soma").loaded.variance
        / bare
        for c in (1e-2, 1e-3)
    ]
    assert loss[0] == pytest.approx(10 * loss[1], rel=1e-2)
    assert 0 < loss[0] < 1e-3


def test_without_series_resistance_the_pipette_is_more_membrane() -> None:
    """A sphere with C_p at R_s = 0 is the sphere of capacitance C + C_p, with the same leak."""
    extra = 5.0
    loaded = sphere(Electrode(site="soma", pipette_capacitance_pF=extra)).recording("soma")
    c, r = 4 * math.pi + extra, 5 / math.pi
    want = 1.0 * (10.0 * r) ** 2 / (2 * (r * c + 2.0))  # Campbell's theorem; from memory
    assert loaded.loaded.variance == pytest.approx(want, rel=1e-9)
    assert loaded.recorded.variance == pytest.approx(want, rel=1e-9)


def test_seal_shifts_the_mean_towards_the_bath() -> None:
    cell = CableModel(
        CellTree.from_text("1 1 0 0 0 10 -1\n"),
        Membrane(axial_resistivity_ohm_cm=150, capacitance_uF_cm2=1, resistance_ohm_cm2=20000, rest_mV=-70.0),
        electrodes=(Electrode(site="soma", seal_GOhm=2.0),),
    )
    leak = 0.2 * math.pi
    assert cell.recording("soma").loaded.mean == pytest.approx(-70 * leak / (leak + 0.5), rel=1e-12)
    assert cell.recording("soma").true.mean == pytest.approx(-70.0, rel=1e-12)
    assert cell.recording("soma").input_resistance_MOhm == pytest.approx(1e3 / (leak + 0.5), rel=1e-12)


@pytest.mark.parametrize("resistance_MOhm", [0.0, 1.0, 30.0, 1000.0])
@pytest.mark.parametrize("capacitance_pF", [0.1, 10.0, 500.0])
def test_slowest_rate_is_a_lower_bound(resistance_MOhm: float, capacitance_pF: float) -> None:
    """Against the eigenvalues of the sphere with two pipettes, three nodes."""
    many = [
        Electrode(site=name, series_resistance_MOhm=resistance_MOhm * k, pipette_capacitance_pF=capacitance_pF / k)
        for k, name in ((1, "soma"), (2, "again"))
    ]
    network = sphere(*many, sites=("again",)).refined.point.network
    leak, own = 0.2 * math.pi, 4 * math.pi
    if resistance_MOhm == 0:
        slowest = leak / (own + 1.5 * capacitance_pF)
    else:
        g = np.array([1e3, 5e2]) / resistance_MOhm
        conductance = np.diag([leak + g.sum(), *g])
        conductance[0, 1:] = conductance[1:, 0] = -g
        slowest = eigh(conductance, np.diag([own, capacitance_pF, capacitance_pF / 2]), eigvals_only=True)[0]
    assert slowest / 8 < network.slowest_rate_per_ms <= slowest * (1 + 1e-12)


def test_thermal_noise_of_the_loaded_cell() -> None:
    """kT/C and 4kT Re Z at 37 °C (Johnson 1928, Nyquist 1928, Phys Rev 32:97 and 110; values derived, verified
    by two computations): 100 pF has 6.54376258241 µV, 200 MΩ have 3.4256662988e-12 V²/Hz."""
    kT = constants.k * 310.15
    for r_s, total in ((0.0, 100.0), (25.0, 4 * math.pi)):
        one = Electrode(site="soma", series_resistance_MOhm=r_s, pipette_capacitance_pF=100 - 4 * math.pi)
        network = sphere(one).refined.point.network

        def density(log_omega: float, network=network) -> float:
            omega = math.exp(log_omega)
            z = network.columns_at(np.array([1j * omega]), [0]).impedance_GOhm[0, 0, 0]
            return 2 * kT * z.real * omega / math.pi

        # GΩ/ms = 1e12 /F; variances in V², SD in µV
        variance = quad(density, -30, 25, epsabs=0, epsrel=1e-10, limit=400)[0] * 1e12
        assert variance == pytest.approx(kT / (total * 1e-12), rel=1e-8, abs=0)
        if r_s == 0:
            assert 1e6 * math.sqrt(variance) == pytest.approx(6.54376258241, rel=1e-8)
    membrane = Membrane(
        axial_resistivity_ohm_cm=150, capacitance_uF_cm2=1, resistance_ohm_cm2=0.2 * 400 * math.pi * 10, rest_mV=0
    )
    cell = CableModel(CellTree.from_text("1 1 0 0 0 10 -1\n"), membrane, electrodes=(AT_SOMA,))
    z = cell.spectrum("soma", np.zeros(1)).input_impedance_MOhm[0].real
    assert z == pytest.approx(200.0, rel=1e-12)
    assert 4 * kT * z * 1e6 == pytest.approx(3.4256662988e-12, rel=1e-10, abs=0)


def test_how_steeply_a_spectrum_falls_beside_a_pipette() -> None:
    """A capacitance right at the end of a neurite is a lump there; behind a resistance it is not."""
    f = np.geomspace(1e8, 1e9, 5)
    for one, power in (
        (Electrode(site="tip"), 3.5),
        (Electrode(site="tip", pipette_capacitance_pF=20.0), 4.5),
        (Electrode(site="tip", pipette_capacitance_pF=20.0, series_resistance_MOhm=10.0), 3.5),
    ):
        found = spread(BALL_AND_STICK, one).spectrum("tip", f)
        assert found.falls_as == power
        if one.series_resistance_MOhm == 0:
            assert found.slope == pytest.approx(-power, abs=0.01)


def test_means_by_source_are_those_of_the_loaded_cell() -> None:
    tree = arbor(5, 40)
    sites = (Site("d", swc_id=int(tree.ids[25])),)
    held = Electrode(site="soma", mode="voltage clamp", holding_mV=-75.0, series_resistance_MOhm=30.0)
    loaded = model(tree, sites=sites, electrodes=(held, Electrode(site="d", seal_GOhm=1.0)))
    shift = loaded.recording("d").loaded.mean - replace(loaded, inputs=()).recording("d").loaded.mean
    parts = loaded.sources("d").mean_by_input_mV
    assert sum(float(part.sum()) for part in parts.values()) == pytest.approx(shift, rel=1e-5)


CLAMP = {"mode": "voltage clamp", "holding_mV": -60.0}


@pytest.mark.parametrize(
    ("electrodes", "key", "said"),
    [
        (
            [Electrode(site="somma")],
            "electrode[0].site",
            "found 'somma', expected a site: soma, tip, again; correct it",
        ),
        ([Electrode(site="tip"), Electrode(site="tip")], "electrode[1].site", "found a second electrode at 'tip'"),
        (
            [Electrode(site="tip", **CLAMP), Electrode(site="again", **CLAMP)],
            "electrode[1].site",
            "found a voltage clamp where 'tip' is one already, expected one clamp a place",
        ),
    ],
)
def test_electrodes_that_do_not_fit(electrodes: list[Electrode], key: str, said: str) -> None:
    sites = Site("tip", swc_id=3), Site("again", swc_id=3)
    with pytest.raises(ModelError) as caught:
        CableModel(CellTree.from_text(BALL_AND_STICK), MEMBRANE, sites=sites, electrodes=tuple(electrodes))
    assert caught.value.key == key
    assert said in caught.value.message


def test_a_clamp_and_a_second_pipette_may_share_a_place() -> None:
    sites = (Site("again", swc_id=1),)
    pair = Electrode(site="soma", **CLAMP, series_resistance_MOhm=5.0), Electrode(site="again")
    cell = CableModel(CellTree.from_text(BALL_AND_STICK), MEMBRANE, sites=sites, electrodes=pair)
    assert cell.recording("again").recorded.mean == pytest.approx(-60 * 358.977342903 / (358.977342903 + 5), rel=1e-9)
