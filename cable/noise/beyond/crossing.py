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
        flat = [one.reshape(len(mu), -1) for one in self.couplings]
        heard = [_heard(mu, *one) for one in self.covariances]
        for a, one in enumerate(self.covariances):
            inner = _turned(mu, relaxed, one)
            for c, (b, p) in enumerate(self.covariances):
                colour = (b * 2 * p / (p**2 + omega[:, None] ** 2)).sum(axis=1).real
                third = _contracted(flat[a], inner, flat[c]) / both * colour[:, None, None]
                result += third + third.swapaxes(1, 2).conj()
                agreed = _agreed(mu, heard[a], heard[c], one, (b, p), omega)
                result += _contracted(flat[a], agreed, flat[c]).swapaxes(1, 2) / both
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


def _turned(mu: Floats, relaxed: Complexes, one: tuple[Complexes, Complexes]) -> Complexes:
    """(F, K, K) what a fluctuation at rest inside the memory of another one is turned into, Σ b/((μ+p+iω)(μ'+p))."""
    return sum(
        (b / (relaxed[:, :, None] + p) / (mu + p) for b, p in zip(*one, strict=True)),
        np.zeros((len(relaxed), len(mu), len(mu)), dtype=np.complex128),
    )


def _contracted(first: Floats, between: Complexes, second: Floats) -> Complexes:
    """(F, K, K) Σ_kl D_mkl between_kl D'_nkl from couplings (K, K²): one product for all frequencies."""
    frequencies, count, _ = between.shape
    turned = first * between.reshape(frequencies, 1, -1)
    found = turned.reshape(frequencies * count, -1) @ second.T
    return np.asarray(found.reshape(frequencies, count, count))


def _agreed(
    mu: Floats,
    heard_a: tuple[Complexes, Complexes],
    heard_c: tuple[Complexes, Complexes],
    one: tuple[Complexes, Complexes],
    other: tuple[Complexes, Complexes],
    omega: Floats,
) -> Complexes:
    """(F, K, K) ∫ κ_k(τ) κ'_l(-τ) e^{-iωτ} dτ with κ as heard; before, at τ < 0, a mode has heard b e^{pτ}/(p + μ)."""
    (b_a, p_a), (b_c, p_c) = one, other
    shift = 1j * omega[:, None]
    total = np.zeros((len(omega), len(mu), len(mu)), dtype=np.complex128)
    for b, p in zip(b_c, p_c, strict=True):
        after = heard_a[0] / (mu + p + shift) + (heard_a[1] / (p_a + p + shift[:, :, None])).sum(axis=2)
        total += after[:, :, None] * (b / (p + mu))
    for b, p in zip(b_a, p_a, strict=True):
        after = heard_c[0] / (mu + p - shift) + (heard_c[1] / (p_c + p - shift[:, :, None])).sum(axis=2)
        total += (b / (p + mu))[:, None] * after[:, None, :]
    return total


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
        busy = number > 0
        here = shapes[busy]
        pairs = (here[:, :, None] * here[:, None, :]).reshape(len(here), -1)
        couplings.append((weighted[busy].T @ pairs).reshape(count := len(rates), count, count))
        covariances.append(conductance_covariance(one))
    return Crossing(shapes, rates, tuple(couplings), tuple(covariances))


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
