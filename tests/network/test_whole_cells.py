"""Whole random cells, zones cut where they fall, against dense matrices that are put together from the raw rows."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from numpy.testing import assert_allclose

from cable import CableModel, SynapticInput
from cable.noise.operating_point import OperatingPoint
from network.whole_cells import MEMBRANE, WholeCell
from noise.cells import EXCITATION, INHIBITION, arbor, model
from oracles.compartments import convergence_order, richardson
from oracles.cut_cells import Synapses, spectra, state
from oracles.dense import impedance_and_covariance, nodal_matrices
from tolerances import ALGEBRA, REFINED

OMEGA = np.array([0.0, 0.04, 0.6, 7.0])


def by_program(cell: WholeCell, inputs: tuple[SynapticInput, ...]) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
    """Spectra (inputs, nodes, F), impedances (nodes, nodes, F) and means (nodes,) at the nodes of the frusta."""
    point = CableModel(cell.tree, MEMBRANE, inputs).refined.point
    response = point.network.at(OMEGA)
    nodes = point.layout.row_node[cell.row]
    found = np.array([source.spectrum(response)[nodes] for source in point.sources])
    columns = np.array([response.column(int(node))[nodes] for node in nodes])
    assert_allclose(columns[np.arange(len(nodes)), np.arange(len(nodes))], response.input_impedance_GOhm()[nodes])
    return found, columns, point.mean_mV[nodes]


def by_oracle(cell: WholeCell, inputs: tuple[Synapses, ...], n: int) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
    nodes = len(cell.row)
    at = state(cell.frusta, cell.balls, list(inputs), n)
    parts = [spectra(at, list(inputs), float(omega)) for omega in OMEGA]
    found = np.stack([part[0][:, :nodes] for part in parts], axis=-1)
    return found, np.stack([part[1][:nodes, :nodes] for part in parts], axis=-1), at.mean_mV[:nodes]


@pytest.mark.parametrize("seed", [1, 2, 3, 4])
def test_current_synapses_on_even_cylinders_are_exact(seed: int) -> None:
    cell = WholeCell(seed, branches=14, tapering=False)
    said = [
        cell.spread_by_length(current_pA=4.0),
        cell.spread_by_area(current_pA=-3.0),
        cell.at_points(current_pA=8.0),
    ]
    inputs, plain = zip(*said, strict=True)
    got, want = by_program(cell, inputs), by_oracle(cell, plain, 1)
    for one, other in zip(got, want, strict=True):
        assert_allclose(one, other, rtol=ALGEBRA)


@pytest.mark.parametrize("seed", [5, 6])
def test_conductance_synapses_on_tapers_converge_to_the_same(seed: int) -> None:
    cell = WholeCell(seed, branches=6, tapering=True)
    said = [
        cell.spread_by_length(conductance_nS=0.9, reversal_mV=0.0),
        cell.spread_by_area(conductance_nS=0.7, reversal_mV=-80.0),
        cell.at_points(conductance_nS=0.5, reversal_mV=-20.0),
    ]
    inputs, plain = zip(*said, strict=True)
    runs = [by_oracle(cell, plain, n) for n in (2, 4, 8, 16)]
    order = convergence_order([run[0].sum() for run in runs[1:]])
    assert order == pytest.approx(2.0, abs=0.1)
    got = list(by_program(cell, inputs))
    for k, what in enumerate(("spectra", "impedances", "means")):
        want = richardson([run[k].view(float) for run in runs]).view(runs[0][k].dtype)
        if what != "means":  # 7 rad/ms carries 1e-7 of the variance, which is what division is carried to
            want, got[k] = want[..., :-1], got[k][..., :-1]
        assert_allclose(got[k], want, rtol=REFINED, err_msg=what)


def dense_spectra(point: OperatingPoint, omega: float) -> np.ndarray:
    """Spectra (E + 1,) from the pieces' own numbers by naive loops; first moments go to the ends as 1 ± 2m, 1 ± 3m."""
    net, pieces = point.network, len(point.network.resistance_GOhm)
    edges = [(int(net.parent[i + 1]), i + 1) for i in range(pieces)]
    ports, noise = np.zeros((2, pieces, 2, 2), dtype=complex)
    node_noise, in_step = np.zeros(pieces + 1), np.zeros(pieces + 1)
    s, weight = np.polynomial.legendre.leggauss(24)
    s, weight = (s + 1) / 2, weight / 2
    currents = [np.zeros(pieces + 1, dtype=complex) for _ in point.sources]
    colours = [abs(complex(source.population.kernel.transform(omega))) ** 2 for source in point.sources]
    for e in range(pieces):
        R = net.resistance_GOhm[e]
        x = np.sqrt(R * (net.conductance_nS[e] + 1j * omega * net.capacitance_pF[e]))
        ground, across = x * np.tanh(x / 2) / R, x / np.sinh(x) / R
        tilt = 2 * net.lean[e] * ground + net.tilt_nS[e]
        ports[e] = [[across + ground - tilt, -across], [-across, across + ground + tilt]]
        to_near, to_far = np.sinh(x * (1 - s)) / np.sinh(x), np.sinh(x * s) / np.sinh(x)
        own, cross = weight @ np.abs(to_near) ** 2, (weight @ (to_near * to_far.conj())).real
        for k, source in enumerate(point.sources):
            q = source.piece_strength[e] * (1 - source.population.correlation) * colours[k]
            lean = 3 * source.piece_lean[e]
            noise[e] += q * np.array([[own * (1 - lean), cross], [cross, own * (1 + lean)]])
            total, moment = source.piece_amplitude[e], 2 * source.piece_moment[e]
            for end, current in zip(edges[e], (total - moment, total + moment), strict=True):
                currents[k][end] += current * (weight @ to_far)
    for k, source in enumerate(point.sources):
        node_noise += source.node_strength * (1 - source.population.correlation) * colours[k]
        currents[k] += source.node_amplitude
    shunt = net.node_conductance_nS + 1j * omega * net.node_capacitance_pF
    A, W = nodal_matrices([shunt], edges, [ports], [noise], [node_noise])
    Z, P = (matrix[0] for matrix in impedance_and_covariance(A, W))
    for source, current, colour in zip(point.sources, currents, colours, strict=True):
        in_step += source.population.correlation * colour * np.abs(Z @ current) ** 2
    return np.diag(P).real + in_step


@pytest.mark.parametrize("correlation", [0.0, 0.2])
@pytest.mark.parametrize("seed", [7, 8])
def test_tapers_zones_and_conductances_piece_by_piece(seed: int, correlation: float) -> None:
    point = model(arbor(seed, 60), replace(EXCITATION, correlation=correlation), INHIBITION).refined.point
    response = point.network.at(OMEGA)
    got = sum(source.spectrum(response) for source in point.sources)
    for k, omega in enumerate(OMEGA):
        assert_allclose(got[:, k], dense_spectra(point, float(omega)), rtol=ALGEBRA)
