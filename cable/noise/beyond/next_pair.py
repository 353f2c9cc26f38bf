"""Spectra and covariances of a few sites to the next order, beside the linear ones."""

from __future__ import annotations

import math
from concurrent.futures import ThreadPoolExecutor
from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from cable.noise.beyond.next_medium import NextMedium
from cable.noise.beyond.next_order import NextOrder
from cable.noise.cross import by_frequency
from cable.noise.integral import block_for
from cable.noise.pairs import Pair
from cable.theory.units import OMEGA_PER_MS_PER_HZ, one_sided_per_Hz

if TYPE_CHECKING:
    from cable.noise.model import CableModel

Floats = NDArray[np.float64]
Complexes = NDArray[np.complex128]


@dataclass(frozen=True, eq=False)
class NextPair:
    """What two electrodes share, to the next order.

    Attributes:
        linear: the linear answer.
        correlation: at lag 0.
        covariance_mV2: (L,) E[V_a(t) V_b(t + lag)] about the means at the linear answer's lags.
        coherence: (F,) |S_ab|²/(S_aa S_bb) at the linear answer's frequencies.
        phase_rad: (F,) phase of b against a.
        relative_error: numerical error of the change of the two variances, relative to them.
    """

    linear: Pair
    correlation: float
    covariance_mV2: Floats
    coherence: Floats
    phase_rad: Floats
    relative_error: float


def next_pair(model: CableModel, linear: Pair) -> NextPair:
    """See `CableModel.next_pair`."""
    found = model.next_order()
    change = _change(found, linear.sites)
    lag = np.r_[0.0, linear.lag_ms]
    # S_ba at a lag is E[V_a(t) V_b(t + lag)]
    waves = found.rule.at_lags(lag)
    gained = (change.swapaxes(0, 1) @ waves).real
    zero = np.sum(linear.covariances.at_zero_mV2, axis=0) + gained[..., 0]
    size = math.sqrt(max(zero[0, 0] * zero[1, 1], 0.0))
    spectrum = cross_spectrum(found.medium, model, linear.sites, linear.frequency_Hz)
    with np.errstate(divide="ignore", invalid="ignore"):
        coherence = np.abs(spectrum[0, 1]) ** 2 / (spectrum[0, 0].real * spectrum[1, 1].real)
    return NextPair(
        linear=linear,
        correlation=float(zero[0, 1]) / size if size > 0 else math.nan,
        covariance_mV2=linear.covariance_mV2 + gained[0, 1, 1:],
        coherence=np.minimum(coherence, 1.0),
        phase_rad=np.angle(spectrum[1, 0]),
        relative_error=max(found.relative_error_at[site] for site in linear.sites),
    )


def next_psd(model: CableModel, site: str, frequency_Hz: Floats) -> Floats:
    """See `CableModel.next_psd`."""
    found = model.next_order()
    return one_sided_per_Hz(cross_spectrum(found.medium, model, (site,), frequency_Hz)[0, 0].real)


def cross_spectrum(medium: NextMedium, model: CableModel, sites: tuple[str, ...], frequency_Hz: Floats) -> Complexes:
    """(sites, sites, F) cross-spectra E[V_a V_b*] to the next order at frequencies (F,), Hz; two-sided per rad/ms."""
    return _in_blocks(medium, _nodes(medium, model, sites), OMEGA_PER_MS_PER_HZ * np.asarray(frequency_Hz, dtype=float))


def _change(found: NextOrder, sites: tuple[str, ...]) -> Complexes:
    """(sites, sites, M) what the next order changes in the cross-spectra at the rule's frequencies."""
    medium = found.at_rule
    nodes = _nodes(medium, found.linear.model, sites)
    omega = found.rule.omega_per_ms
    linear = by_frequency(medium.point, nodes, omega / OMEGA_PER_MS_PER_HZ).sum(axis=0)
    return _in_blocks(medium, nodes, omega) - linear


def _nodes(medium: NextMedium, model: CableModel, sites: tuple[str, ...]) -> list[int]:
    return [medium.point.layout.node_at(model.site_places[site]) for site in sites]


def _in_blocks(medium: NextMedium, nodes: list[int], omega_per_ms: Floats) -> Complexes:
    width = block_for(medium.point)
    parts = [omega_per_ms[k : k + width] for k in range(0, len(omega_per_ms), width)]
    with ThreadPoolExecutor(2) as pool:
        blocks = list(pool.map(lambda part: _cross(medium, nodes, part), parts))
    return np.concatenate([np.zeros((len(nodes), len(nodes), 0), dtype=np.complex128), *blocks], axis=-1)


def _cross(medium: NextMedium, nodes: list[int], omega_per_ms: Floats) -> Complexes:
    """(nodes, nodes, F) cross-spectra E[V_a V_b*] of a few nodes."""
    response, events = medium.response(omega_per_ms)
    noise = medium.sources(omega_per_ms, events)
    parent = medium.point.network.parent[1:]
    columns = np.array([response.column(node) for node in nodes])
    near, far = columns[:, parent], columns[:, 1:]
    own, uneven = response.noise_self, 3 * noise.piece_moment
    shared = response.noise_cross * noise.piece_strength
    at_near = own * (noise.piece_strength - uneven) * near + shared * far
    at_far = own * (noise.piece_strength + uneven) * far + shared * near
    found = np.einsum("aef,bef->abf", at_near, near.conj()) + np.einsum("aef,bef->abf", at_far, far.conj())
    found += np.einsum("anf,bnf->abf", noise.node_strength * columns, columns.conj())
    for population, voltage in medium.in_step(response):
        found += population * np.einsum("af,bf->abf", voltage[nodes], voltage[nodes].conj())
    if medium.crossed is not None:
        shapes = medium.crossed.shapes[nodes]
        found += np.einsum("ak,fkl,bl->abf", shapes, medium.crossed.by_mode(omega_per_ms), shapes)
    return found
