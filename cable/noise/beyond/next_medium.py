"""A cell to the next order: corrected mean, corrected admittances, corrected sources, at any real frequency.

Beyond linear order conductance fluctuations γ multiply voltage fluctuations v: with A the network at the mean
conductances and F = E - V̄, A v = γF - γv. To the next order in the fluctuating part there are (derived here):
  1. saturating events: an event of time course h drives î(ω) instead of ĥ(ω) (`cable.noise.beyond.events`), which also
     shifts the mean;
  2. a multiplicative source: γv has the covariance C_g(τ) C_v(τ) at each place, where C_v is that of v there;
  3. a fluctuating admittance: events scatter v as the admittance r T(ω) - r ĥ(0);
  4. the crossing terms (`cable.noise.beyond.crossing`).
The driving force E - m is that at the corrected mean. 1 to 3 are local and cost further sweeps of the same network.
The source 2 is taken once, from v without it: carried on, it would bring a part of the order after the next, whose
crossing terms mostly cancel it.
"""

from __future__ import annotations

from dataclasses import dataclass, replace
from functools import cached_property

import numpy as np
from numpy.typing import NDArray

from cable.network.network import Response
from cable.noise.beyond.crossing import Crossing, crossing
from cable.noise.beyond.crossing_nearby import nearby
from cable.noise.beyond.events import Scattering, conductance_covariance, fastest_rate_per_ms, scattering
from cable.noise.beyond.local_impedance import LocalImpedance, local_impedance
from cable.noise.beyond.sinc_rule import SincRule
from cable.noise.operating_point import OperatingPoint
from cable.noise.population import Source, total_spectrum
from cable.theory.synapse import SynapticInput

Floats = NDArray[np.float64]
Complexes = NDArray[np.complex128]
OUTER_TILT, INNER_TILT = 1.05, 0.5


@dataclass(frozen=True, eq=False)
class Sources:
    """White current noise at F frequencies: strengths of pieces and their first moments (E, F), of nodes (E + 1, F)."""

    piece_strength: Floats
    piece_moment: Floats
    node_strength: Floats


@dataclass(frozen=True, eq=False)
class NextMedium:
    """The cell to the next order around one operating point.

    Attributes:
        point: the mean state of the linear theory.
        bare, local: its input impedances, without and with the fluctuating admittance.
        mean_shift_mV: (E + 1,) what the mean is shifted by.
        seen: the rule and the spectra (E + 1, M) of the voltage at its nodes without the multiplicative source,
            or None while they are not known.
        crossed: the crossing terms, or None without.
    """

    point: OperatingPoint
    bare: LocalImpedance
    local: LocalImpedance
    mean_shift_mV: Floats
    seen: tuple[SincRule, Floats] | None = None
    crossed: Crossing | None = None

    @cached_property
    def _parent(self) -> NDArray[np.int64]:
        return self.point.network.parent[1:]

    def on_pieces(self, at_nodes: NDArray) -> NDArray:
        """(E, ...) means over the pieces' ends of values at nodes (E + 1, ...)."""
        return 0.5 * (at_nodes[self._parent] + at_nodes[1:])

    def _conductances(self) -> list[tuple[SynapticInput, Source, Floats, Floats]]:
        """The conductance inputs that are active, with source and synapse numbers."""
        model, point = self.point.model, self.point
        return [
            (one, source, *numbers)
            for one, source, numbers in zip(model.inputs, point.sources, point.numbers, strict=True)
            if one.reversal_mV is not None and one.rate_Hz > 0
        ]

    def admittances_nS(
        self, s_per_ms: NDArray[np.complexfloating]
    ) -> tuple[tuple[Complexes, Complexes], list[Scattering]]:
        """The fluctuating admittance of pieces (E, F) and nodes (E + 1, F), and the events of conductance inputs."""
        events = [scattering(one, self.local, s_per_ms) for one, *_ in self._conductances()]
        nodes = len(self.point.network.parent)
        pieces_nS = np.zeros((nodes - 1, len(s_per_ms)), dtype=np.complex128)
        nodes_nS = np.zeros((nodes, len(s_per_ms)), dtype=np.complex128)
        for (one, _, on_pieces, at_nodes), event in zip(self._conductances(), events, strict=True):
            admittance = one.rate_per_ms * event.admittance_nS_ms
            pieces_nS += on_pieces[:, None] * self.on_pieces(admittance)
            nodes_nS += at_nodes[:, None] * admittance
        return (pieces_nS, nodes_nS), events

    def response(self, omega_per_ms: Floats) -> tuple[Response, list[Scattering]]:
        """The network with the fluctuating admittance, and the events of each conductance input."""
        added, events = self.admittances_nS(1j * omega_per_ms)
        return self.point.network.at(omega_per_ms, added), events

    def sources(self, omega_per_ms: Floats, events: list[Scattering]) -> Sources:
        """The noise of all independent synapses at ω (F,): that of linear order changed, and the multiplicative one."""
        s, point = 1j * omega_per_ms, self.point
        shape = len(self._parent), len(s)
        strength, moment = np.zeros(shape), np.zeros(shape)
        at_nodes = np.zeros((shape[0] + 1, shape[1]))
        conductances = {id(source): k for k, (_, source, *_) in enumerate(self._conductances())}
        for one, source, numbers in zip(point.model.inputs, point.sources, point.numbers, strict=True):
            alone = source.alone(s).real
            pieces, nodes = source.piece_strength[:, None] * alone, source.node_strength[:, None] * alone
            if id(source) in conductances:
                assert one.reversal_mV is not None
                assert one.conductance_nS is not None
                force = one.reversal_mV - point.mean_mV
                gained = self._mean_square(force - self.mean_shift_mV) - self._mean_square(force)
                square = one.rate_per_ms * one.conductance_nS**2
                spread = np.maximum(source.piece_strength + square * numbers[0] * gained, 0.0)
                lumped = square * numbers[1] * (force - self.mean_shift_mV) ** 2
                left = np.abs(events[conductances[id(source)]].relative) ** 2
                pieces = spread[:, None] * alone * self.on_pieces(left)
                nodes = lumped[:, None] * alone * left
            strength += pieces
            moment += pieces * source.piece_lean[:, None]
            at_nodes += nodes
        for extra_pieces, extra_nodes in self._multiplicative(s, events):
            strength += extra_pieces
            at_nodes += extra_nodes
        return Sources(np.maximum(strength + self._nearby(omega_per_ms), 0.0), moment, at_nodes)

    def _mean_square(self, at_nodes: Floats) -> Floats:
        """(E,) mean square along pieces of what varies evenly between values at nodes."""
        near, far = at_nodes[self._parent], at_nodes[1:]
        return np.asarray((near**2 + near * far + far**2) / 3)

    def _nearby(self, omega_per_ms: Floats) -> Floats | float:
        """(E, F) what the crossing terms between near places add to the strengths of pieces."""
        if self.crossed is None:
            return 0.0
        slow = self.crossed

        def left(s: Complexes) -> Complexes:
            return np.asarray(self.bare.at(s) - slow.shapes**2 @ (1 / (s + slow.rates_per_ms[:, None])))

        mean = self.point.mean_mV + self.mean_shift_mV
        total = np.zeros((len(self._parent), len(omega_per_ms)))
        active = [
            (conductance_covariance(one), on_pieces * self.on_pieces((one.reversal_mV or 0.0) - mean))
            for one, _, on_pieces, _ in self._conductances()
        ]
        for one, amount in active:
            for other, second in active:
                density = amount * second / self.point.network.capacitance_pF
                if density.any():
                    total += density[:, None] * self.on_pieces(nearby(left, one, other, omega_per_ms))
        return total

    def _multiplicative(self, s: NDArray[np.complexfloating], events: list[Scattering]) -> list[tuple[Floats, Floats]]:
        """Per conductance input what γv adds to the strengths of pieces and nodes."""
        if self.seen is None:
            return []
        rule, spectra = self.seen
        found = []
        for (one, _, on_pieces, at_nodes), event in zip(self._conductances(), events, strict=True):
            b, p = conductance_covariance(one)
            kernel = sum(2 * bk * rule.half_line(s + pk) for bk, pk in zip(b, p, strict=True))
            # an event meets v as it meets the mean: it saturates
            extra = (spectra @ kernel).real * np.abs(event.relative) ** 2
            found.append((on_pieces[:, None] * self.on_pieces(extra), at_nodes[:, None] * extra))
        return found

    def spectra(self, omega_per_ms: Floats, across: bool = True) -> Floats:
        """(E + 1, F) two-sided spectrum of the voltage at every node, mV²·ms.

        Without `across`, what the slow modes bring by places that hear of each other is left out.
        """
        response, events = self.response(omega_per_ms)
        sources = self.sources(omega_per_ms, events)
        found = response.spectra(sources.piece_strength, sources.piece_moment, sources.node_strength)
        for common, voltage in self.in_step(response):
            found = found + common * np.abs(voltage) ** 2
        if self.crossed is not None and across:
            found = found + self.crossed.spectra(self.crossed.by_mode(omega_per_ms))
        return found

    def in_step(self, response: Response) -> list[tuple[Floats, Complexes]]:
        """Per correlated population of currents, the spectrum (F,) of what is in step and the voltages (E + 1, F)."""
        s = 1j * response.omega_per_ms
        correlated = [one for one in self.point.sources if one.population.correlation > 0]
        return [(one.population.correlation * one.common(one, s).real, one.in_step(response)) for one in correlated]


def bare_medium(point: OperatingPoint) -> NextMedium:
    """The medium with the mean's shift, before the voltage's own spectra are known."""
    fastest = max(fastest_rate_per_ms(point.model.inputs), point.network.slowest_rate_per_ms)
    none = np.zeros(len(point.network.parent))
    bare = local_impedance(point.network, fastest, OUTER_TILT)
    first = NextMedium(point, bare, bare, none)
    local = local_impedance(point.network, fastest, INNER_TILT, lambda s: first.admittances_nS(s)[0])
    return NextMedium(point, bare, local, _mean_shift_mV(NextMedium(point, bare, local, none)))


def _mean_shift_mV(medium: NextMedium) -> Floats:
    """(E + 1,) the voltage of the current that saturation takes away, in the network without that conductance."""
    point = medium.point
    response, events = medium.response(np.zeros(1))
    nodes = len(point.network.parent)
    pieces, moment, at_nodes_pA = np.zeros(nodes - 1), np.zeros(nodes - 1), np.zeros(nodes)
    for (one, _, on_pieces, at_nodes), event in zip(medium._conductances(), events, strict=True):
        assert one.reversal_mV is not None
        current = one.rate_per_ms * event.admittance_nS_ms[:, 0].real * (one.reversal_mV - point.mean_mV)
        near, far = on_pieces * current[medium._parent], on_pieces * current[1:]
        pieces += (near + far) / 2
        moment += (far - near) / 12
        at_nodes_pA += at_nodes * current
    return response.voltages(pieces, moment, at_nodes_pA)[:, 0].real


def with_multiplicative(medium: NextMedium, rule: SincRule, spectra: Floats, modes: int) -> NextMedium:
    """The medium once the spectra of the voltage are known at the rule's nodes, with the crossing terms."""
    crossed = crossing(medium.point, medium.point.mean_mV + medium.mean_shift_mV, modes)
    return replace(medium, seen=(rule, spectra), crossed=crossed)


def linear_spectra(point: OperatingPoint, omega_per_ms: Floats) -> Floats:
    """(E + 1, F) the same in linear order."""
    return total_spectrum(point.sources, point.network.at(omega_per_ms))
