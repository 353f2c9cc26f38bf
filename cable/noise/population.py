"""A population of synapses as a source of current noise, alone and in step with others, and the spectra it makes."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from cable.network.network import Response
from cable.noise.smoothing import Smoothing
from cable.theory.synapse import SynapticInput

Floats = NDArray[np.float64]
Complexes = NDArray[np.complex128]


@dataclass(frozen=True, eq=False)
class Source:
    """One population as a source of current noise around the operating point.

    The spectrum of the current of a piece or node is its strength times `alone`. Where spike trains are correlated,
    what they have in common drives all synapses in step, with amplitudes of which strength is the square sum; its
    spectrum is the correlation times `common`.

    Attributes:
        population: the synapses.
        piece_strength, node_strength: (E,), (E + 1,) sums of rate·amplitude² over the synapses, pA²/ms.
        piece_lean: (E,) centroid of that strength along the piece, from its middle.
        piece_amplitude, node_amplitude: (E,), (E + 1,) sums of √rate·amplitude, pA/√ms.
        piece_moment: (E,) first moment of the amplitude along the piece.
        smoothing: how spectra of regular trains are smoothed for an integral over frequency; None for the spectra.
    """

    population: SynapticInput
    piece_strength: Floats
    piece_lean: Floats
    node_strength: Floats
    piece_amplitude: Floats
    piece_moment: Floats
    node_amplitude: Floats
    smoothing: Smoothing | None = None

    def alone(self, s_per_ms: NDArray[np.complexfloating], dead_times: bool = True) -> Complexes:
        """(F,) k̂(s)k̂(-s) times what a synapse does by itself: its train's own share and the sizes of events.

        Without `dead_times`, trains that have one count as Poisson trains of events of one size.
        """
        own = (1 - self.population.correlation) * self.common(self, s_per_ms, dead_times)
        alike = self.population.spike_train.dead_time_ms > 0 and not dead_times
        return own if alike else own + self.sizes(s_per_ms)

    def sizes(self, s_per_ms: NDArray[np.complexfloating]) -> Complexes:
        """(F,) k̂(s)k̂(-s) times the squared coefficient of variation of the events' sizes."""
        kernel, s = self.population.kernel, np.asarray(s_per_ms, dtype=complex)
        return self.population.size_cv**2 * kernel.laplace(s) * kernel.laplace(-s)

    def common(self, other: Source, s_per_ms: NDArray[np.complexfloating], dead_times: bool = True) -> Complexes:
        """(F,) k̂(s)k̂'(-s) times the spectrum of one spike train over its rate, for trains in step with `other`'s."""
        s = np.asarray(s_per_ms, dtype=complex)
        events = self.population.kernel.laplace(s) * other.population.kernel.laplace(-s)
        return events * self._train(s, dead_times)

    def _train(self, s_per_ms: Complexes, dead_times: bool) -> Complexes | Floats:
        one = self.population
        if one.spike_train.dead_time_ms > 0 and not dead_times:
            return np.ones_like(s_per_ms)
        if self.smoothing is not None and one.spike_train.process != "poisson":
            return self.smoothing.spectrum_over_rate(one.spike_train, s_per_ms.imag, one.rate_Hz)
        if not s_per_ms.real.any():  # the closed form for real frequencies keeps its digits near 0
            return one.spike_train.spectrum_over_rate(s_per_ms.imag, one.rate_Hz)
        return one.spike_train.spectrum_over_rate_at(s_per_ms, one.rate_Hz)

    def in_step(self, response: Response) -> Complexes:
        """(E + 1, F) voltages where all synapses act in step, before `common`."""
        return response.voltages(self.piece_amplitude, self.piece_moment, self.node_amplitude)

    def spectrum(self, response: Response) -> Floats:
        """(E + 1, F) two-sided spectrum of the voltage that this population makes at every node, mV²·ms."""
        return total_spectrum((self,), response)


def couplings(sources: tuple[Source, ...]) -> list[tuple[int, int, float]]:
    """(i, j, c) for every two of `sources`, i < j, that share spikes, with the correlation of their trains."""
    names = [source.population.name for source in sources]
    found = {
        (min(i, names.index(shared.input)), max(i, names.index(shared.input))): shared.fraction
        for i, source in enumerate(sources)
        for shared in source.population.shares
        if shared.input in names and shared.fraction > 0
    }
    return [(i, j, c) for (i, j), c in sorted(found.items())]


def shared_spectrum(sources: tuple[Source, ...], response: Response) -> Floats:
    """(E + 1, F) what shared spikes add to the spectra of the populations by themselves, Σ 2c Re(U_i U_j*), mV²·ms."""
    s = 1j * response.omega_per_ms
    total = np.zeros((len(response.network.parent), len(s)))
    pairs = couplings(sources)
    voltage = {k: sources[k].in_step(response) for pair in pairs for k in pair[:2]}
    for i, j, correlation in pairs:
        total += 2 * correlation * (voltage[i] * voltage[j].conj() * sources[i].common(sources[j], s)).real
    return total


def total_spectrum(sources: tuple[Source, ...], response: Response) -> Floats:
    """(E + 1, F) two-sided voltage spectrum of populations together, in one sweep, mV²·ms."""
    s = 1j * response.omega_per_ms
    pieces, nodes = len(response.network.resistance_GOhm), len(response.network.parent)
    strength, moment, at_nodes = np.zeros((pieces, 1)), np.zeros((pieces, 1)), np.zeros((nodes, 1))
    in_step = shared_spectrum(sources, response)
    for source in sources:
        alone = source.alone(s).real
        on_pieces = source.piece_strength[:, None] * alone
        strength = strength + on_pieces
        moment = moment + on_pieces * source.piece_lean[:, None]
        at_nodes = at_nodes + source.node_strength[:, None] * alone
        if source.population.correlation > 0:
            in_step += (
                source.population.correlation * source.common(source, s).real * np.abs(source.in_step(response)) ** 2
            )
    if not strength.any() and not at_nodes.any():
        return in_step
    return response.spectra(strength, moment, at_nodes) + in_step
