"""The crossing terms of the expansion: two places whose conductances fluctuate while either hears of the other.

With v = Z[γF - γv] the variance to the next order holds four factors γ, joined in pairs. Where the pairs do not cross
one event acts on its own voltage or on the voltage around it, and everything is local (see `next_order`).
Where they cross, places y and y' are joined by Z_yy', over all of the cell:
  (a) in ⟨v₃v₁⟩: Z γ_y Z γ_y' Z γ_y F, with the outer γ_y joined and γ_y' joined with v₁ = Z γ_y' F;
  (b) in ⟨v₂v₂⟩: ⟨γ_y v_y'⟩⟨γ_y' v_y⟩, by which the sources γ_y v_y and γ_y' v_y' at two places agree.
Kernels must overlap in time for that, so only relaxations as slow as the kernels count; with the cell's slow modes,
Z_yy'(t) = Σ φ_k(y) φ_k(y') e^{-μ_k t}, both are sums over modes of D_mkl = Σ_y φ_m φ_k φ_l F G and of rational
functions of the rates (derived here). On a sphere there is one mode, and they are exact.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy import sparse

from cable.noise.beyond.events import conductance_covariance
from cable.noise.beyond.sinc_rule import SincRule
from cable.noise.operating_point import OperatingPoint

Floats = NDArray[np.float64]
Complexes = NDArray[np.complex128]
NUDGE = 1e-7  # relative distance kept between the rates of modes and kernels, where a difference of both is divided by
PLACES = 500  # handled at once
DENSE = 120  # nodes up to which all modes are computed by a dense method


@dataclass(frozen=True, eq=False)
class Crossing:
    """What the crossing terms add to the spectra.

    Attributes:
        shapes: (E + 1, K) the modes at the nodes, 1/√pF.
        rates_per_ms: (K,) their rates.
        couplings: per conductance input, (K, K, K) the D.
        covariances: per conductance input, the b and p of Σ b e^{-p|τ|}, over the number of synapses.
    """

    shapes: Floats
    rates_per_ms: Floats
    couplings: tuple[Floats, ...]
    covariances: tuple[tuple[Complexes, Complexes], ...]

    def by_mode(self, omega_per_ms: Floats) -> Complexes:
        """(F, K, K) cross-spectra E[α_m α_n*] of the modes' amplitudes."""
        mu, omega = self.rates_per_ms, np.asarray(omega_per_ms, dtype=float)
        relaxed = mu + 1j * omega[:, None]
        both = relaxed[:, :, None] * relaxed[:, None, :].conj()
        result = np.zeros(both.shape, dtype=np.complex128)
        for one, first in zip(self.covariances, self.couplings, strict=True):
            heard = _heard(mu, *one)
            for other, second in zip(self.covariances, self.couplings, strict=True):
                b, p = other
                # sums over one of the two inner modes, which no frequency enters
                sums = [_summed(first, size / (mu + rate), second) for size, rate in zip(b, p, strict=True)]
                # (a), of inputs c and a: a fluctuation at rest inside the memory of another one
                colour = (one[0] * 2 * one[1] / (one[1] ** 2 + omega[:, None] ** 2)).sum(axis=1).real
                third = _joined([1 / (relaxed + rate) for rate in p], sums).swapaxes(1, 2)
                third = third / both * colour[:, None, None]
                result += third + third.swapaxes(1, 2).conj()
                # (b), of a and c: ∫ κ_k(τ) κ'_l(-τ) e^{-iωτ} dτ with κ as heard for τ > 0; before, a mode has heard
                # b e^{pτ}/(p + μ) of a fluctuation. The half τ < 0 is the other half of c and a
                later = [_spectrum(mu, heard, one[1], rate, omega) for rate in p]
                agreed = _joined(later, sums)
                result += (agreed.swapaxes(1, 2) + agreed.conj()) / both
        return result

    def spectra(self, by_mode: Complexes) -> Floats:
        """(E + 1, F) what they add to the spectrum at every node, mV²·ms."""
        frequencies, count, _ = by_mode.shape
        heard = self.shapes @ by_mode.real.transpose(1, 0, 2).reshape(count, -1)
        return np.asarray(np.einsum("nfk,nk->nf", heard.reshape(-1, frequencies, count), self.shapes))

    def variance(self, rule: SincRule, nodes: NDArray[np.int64]) -> Floats:
        """(nodes,) what they add to the variance at some nodes, mV²."""
        amplitudes = np.tensordot(rule.weights, self.by_mode(rule.omega_per_ms).real, axes=1)
        here = self.shapes[nodes]
        return np.asarray(np.einsum("nk,nk->n", here @ amplitudes, here))

    def slowest(self, count: int) -> Crossing:
        """The same by the `count` slowest modes alone."""
        few = slice(count)
        couplings = tuple(one[few, few, few] for one in self.couplings)
        return Crossing(self.shapes[:, few], self.rates_per_ms[few], couplings, self.covariances)


def _heard(mu: Floats, b: Complexes, p: Complexes) -> tuple[Complexes, Complexes]:
    """What mode k hears of a fluctuation: ⟨γ(t)α(t + τ)⟩ = A e^{-μτ} + Σ B e^{-pτ} for τ > 0; A (K,) and B (K, R)."""
    apart = p - mu[:, None]
    apart = np.where(np.abs(apart) < NUDGE * np.abs(p), NUDGE * p, apart)
    return (b * (1 / apart + 1 / (p + mu[:, None]))).sum(axis=1), -b / apart


def _summed(first: Floats, weight: Complexes, second: Floats) -> Complexes:
    """(K, K²) Σ_l D_mkl w_l D'_nkl, by k and mn: one product of matrices for every k."""
    return np.asarray(np.matmul((first * weight).swapaxes(0, 1), second.transpose(1, 2, 0)).reshape(len(weight), -1))


def _joined(inner: list[Complexes], sums: list[Complexes]) -> Complexes:
    """(F, K, K) Σ_k inner_k · sums_k,mn, over all exponentials at once."""
    frequencies, count = inner[0].shape
    return np.asarray((np.concatenate(inner, axis=1) @ np.concatenate(sums)).reshape(frequencies, count, count))


def _spectrum(mu: Floats, heard: tuple[Complexes, Complexes], rates: Complexes, p: complex, omega: Floats) -> Complexes:
    """(F, K) ∫₀^∞ of what is heard times e^{-(p + iω)τ}."""
    shift = 1j * omega[:, None]
    return np.asarray(heard[0] / (mu + p + shift) + (heard[1] / (rates + p + shift[:, :, None])).sum(axis=2))


def crossing(point: OperatingPoint, mean_mV: Floats, count: int) -> Crossing:
    """The crossing terms by the `count` slowest modes; `mean_mV` (E + 1,) gives the driving forces."""
    shapes, rates = slow_modes(point, count)
    parent = point.network.parent[1:]
    couplings, covariances = [], []
    for one, (on_pieces, at_nodes) in zip(point.model.inputs, point.numbers, strict=True):
        if one.reversal_mV is None or one.rate_Hz == 0:
            continue
        number = at_nodes + 0.0
        np.add.at(number, parent, on_pieces / 2)
        number[1:] += on_pieces / 2
        weighted = shapes * (number * (one.reversal_mV - mean_mV))[:, None]
        couplings.append(_triples(weighted[number > 0], shapes[number > 0]))
        covariances.append(conductance_covariance(one))
    return Crossing(shapes, rates, tuple(couplings), tuple(covariances))


def _triples(weighted: Floats, shapes: Floats) -> Floats:
    """(K, K, K) Σ over places of three modes' product, one of them weighted; some places at a time."""
    count = shapes.shape[1]
    total = np.zeros((count, count * count))
    for start in range(0, len(shapes), PLACES):
        here = shapes[start : start + PLACES]
        total += weighted[start : start + PLACES].T @ (here[:, :, None] * here[:, None, :]).reshape(len(here), -1)
    return total.reshape(count, count, count)


def slow_modes(point: OperatingPoint, count: int) -> tuple[Floats, Floats]:
    """(E + 1, K) shapes and (K,) rates, 1/ms, of the slowest relaxations; the membrane is lumped at the nodes.

    The shapes are orthogonal, and of size one, in the capacitance. Pieces must be short.
    """
    network, parent = point.network, point.network.parent[1:]
    far = np.arange(1, len(network.parent))
    lumped = []
    for spread, here in (
        (network.conductance_nS, network.node_conductance_nS),
        (network.capacitance_pF, network.node_capacitance_pF),
    ):
        values = here.copy()
        np.add.at(values, parent, spread / 2)
        values[1:] += spread / 2
        lumped.append(values)
    ground, capacitance = lumped
    coupling = 1 / network.resistance_GOhm
    np.add.at(ground, parent, coupling)
    ground[1:] += coupling
    # in the variables √C v the capacitance is the identity
    root = np.sqrt(capacitance)
    off = -coupling / (root[parent] * root[far])
    nodes = len(root)
    matrix = sparse.coo_array(
        (np.r_[ground / capacitance, off, off], (np.r_[0:nodes, parent, far], np.r_[0:nodes, far, parent])),
        shape=(nodes, nodes),
    ).tocsc()
    if nodes <= max(DENSE, 2 * count):
        rates, vectors = np.linalg.eigh(matrix.toarray())
        rates, vectors = rates[:count], vectors[:, :count]
    else:
        from scipy.sparse.linalg import eigsh

        rates, vectors = eigsh(matrix, count, sigma=0.0, v0=root)
        order = np.argsort(rates)
        rates, vectors = rates[order], vectors[:, order]
    return vectors / root[:, None], rates
