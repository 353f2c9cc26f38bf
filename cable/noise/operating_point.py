"""The mean state: mean voltage and total conductance everywhere, and the noise that the inputs make around it.

The operating point is the zero-frequency network with all mean conductances, reversal potentials and mean
currents. Around it everything is linear: a conductance event at a place drives the current g·k(t)·(E - V̄)
there (effective-time-constant approximation; Richardson 2004, Phys Rev E 69:051918; from memory).
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from cable.network.assembly import Passive, passive, synapse_numbers
from cable.network.layout import Layout, lay_out
from cable.network.loads import Load
from cable.network.network import Network, Response
from cable.noise.population import Source
from cable.noise.smoothing import Smoothing
from cable.theory.cylinder import mean_square_along, spread_current
from cable.theory.synapse import SynapticInput

if TYPE_CHECKING:
    from cable.noise.model import CableModel

Floats = NDArray[np.float64]
LEAN_LIMIT = 0.28  # a noise covariance stays positive for centroids up to 1/√12; division brings them below


@dataclass(frozen=True, eq=False)
class OperatingPoint:
    """The mean state of a model on one layout.

    Attributes:
        layout: the pieces.
        passive: the cell without input.
        network: the cell with the inputs' mean conductances.
        steady: the network at zero frequency.
        numbers: per input, the synapses on pieces (E,) and at nodes (E + 1,).
        reference_mV: the voltage from which `deviation_mV` counts.
        deviation_mV: (E + 1,) mean voltage at nodes, from the reference.
        far_mV: (E,) mean voltage of each piece far from its ends, from the reference.
        smoothing: how spectra of regular spike trains are smoothed for an integral over frequency, if at all.
    """

    model: CableModel
    layout: Layout
    passive: Passive
    network: Network
    steady: Response
    numbers: tuple[tuple[Floats, Floats], ...]
    reference_mV: float
    deviation_mV: Floats
    far_mV: Floats
    smoothing: Smoothing | None = None

    @property
    def mean_mV(self) -> Floats:
        """(E + 1,) mean voltage at every node, mV."""
        return self.reference_mV + self.deviation_mV

    @cached_property
    def electrode_load_nS(self) -> Floats:
        """(E + 1,) steady conductance of seals and voltage clamps at every node."""
        load = np.zeros(len(self.layout.parent))
        for electrode, place in self.model.electrode_places:
            load[self.layout.node_at(place)] += electrode.steady_load_nS
        return load

    @cached_property
    def sources(self) -> tuple[Source, ...]:
        """The inputs as current noise around this mean state."""
        return tuple(self._source(one, *numbers) for one, numbers in zip(self.model.inputs, self.numbers, strict=True))

    def _source(self, one: SynapticInput, on_pieces: Floats, at_nodes: Floats) -> Source:
        rate = one.rate_per_ms
        lean = self.layout.lean_of_area if one.by_area else self.layout.lean_of_length
        if one.conductance_nS is None:
            mean = np.full(len(on_pieces), one.event_current_pA)
            square, node_mean = mean**2, np.full(len(at_nodes), one.event_current_pA)
            moment, square_lean = mean * lean, lean
        else:
            assert one.reversal_mV is not None
            peak, reversal = one.conductance_nS, one.reversal_mV - self.reference_mV
            near, far = (
                reversal - self.deviation_mV[self.network.parent[1:]],
                reversal - self.deviation_mV[1:],
            )
            still = reversal - self.far_mV
            share = self.steady.share[:, 0].real
            force = still + share * (near + far - 2 * still)
            covariances = self.steady.noise_self[:, 0], self.steady.noise_cross[:, 0]
            force_square = mean_square_along(share, *covariances, near, far, still)
            with np.errstate(divide="ignore", invalid="ignore"):
                square_lean = np.where(force_square > 0, (far**2 - near**2) / (12 * force_square), 0.0)
            # synapses and driving force that lean the same way meet: the mean of their product is larger
            mean = peak * (force + lean * (far - near))
            square = peak**2 * force_square * (1 + 12 * lean * square_lean)
            node_mean = peak * (reversal - self.deviation_mV)
            moment = peak * (force * lean + (far - near) / 12)
            square_lean = square_lean + lean
        return Source(
            population=one,
            piece_strength=rate * on_pieces * square,
            piece_lean=np.clip(square_lean, -LEAN_LIMIT, LEAN_LIMIT),
            node_strength=rate * at_nodes * node_mean**2,
            piece_amplitude=np.sqrt(rate) * on_pieces * mean,
            piece_moment=np.sqrt(rate) * on_pieces * moment,
            node_amplitude=np.sqrt(rate) * at_nodes * node_mean,
            smoothing=self.smoothing,
        )

    def needs_division(self) -> NDArray[np.bool_]:
        """(E,) pieces that stand for something that is not even along them: a taper, or a driving force."""
        uneven = self.layout.tapers.copy()
        for one, (on_pieces, _) in zip(self.model.inputs, self.numbers, strict=True):
            if one.conductance_nS is not None:
                uneven |= on_pieces > 0
        return uneven

    def unevenness(self, omega_per_ms: float) -> Floats:
        """(E,) size of what the first moments leave out, relative to the piece's own effect.

        These are the second moments of taper and driving force times the squared electrotonic length, and the
        first moments times its cube; either falls with the fourth power of the number of divisions.
        """
        first, last = self.layout.radii_um
        network = self.network
        x2 = network.resistance_GOhm * np.hypot(network.conductance_nS, omega_per_ms * network.capacitance_pF)
        slope = np.abs(first - last) / (first + last)
        step = np.abs(self.deviation_mV[1:] - self.deviation_mV[network.parent[1:]])
        for one, (on_pieces, _) in zip(self.model.inputs, self.numbers, strict=True):
            if one.reversal_mV is not None:
                force = np.abs(one.reversal_mV - self.mean_mV[1:]) + step
                share = np.divide(step, force, out=np.zeros_like(step), where=force > 0)
                slope = np.where(on_pieces > 0, np.maximum(slope, share), slope)
        return slope * x2 * (slope + np.sqrt(x2))


def operating_point(model: CableModel, divide: NDArray[np.int64] | None = None) -> OperatingPoint:
    """The mean state of `model`, with each stretch between cuts divided as `divide` (segments,) says."""
    layout = lay_out(model.tree, model.parts, model.places, divide)
    cell = passive(layout, model.membrane, model.membrane_parts)
    conductance, node_conductance = cell.leak_nS.copy(), cell.node_leak_nS.copy()
    along = np.zeros_like(conductance)
    reference = model.reference_mV
    drive = cell.leak_nS * (cell.rest_mV - reference)
    node_drive = cell.node_leak_nS * (cell.node_rest_mV - reference)
    moment = drive * layout.lean_of_area
    numbers = []
    for one, part, places in zip(model.inputs, model.input_parts, model.input_places, strict=True):
        on_pieces, at_nodes = synapse_numbers(layout, one, part, places)
        numbers.append((on_pieces, at_nodes))
        mean = one.mean_conductance_nS
        per_synapse = one.mean_current_pA if one.reversal_mV is None else mean * (one.reversal_mV - reference)
        conductance += mean * on_pieces
        node_conductance += mean * at_nodes
        drive += per_synapse * on_pieces
        node_drive += per_synapse * at_nodes
        moment += per_synapse * on_pieces * (layout.lean_of_area if one.by_area else layout.lean_of_length)
        along += 0.0 if one.by_area else mean * on_pieces
    loads = []
    for electrode, place in model.electrode_places:
        node = layout.node_at(place)
        node_conductance[node] += electrode.steady_load_nS
        node_drive[node] += electrode.steady_current_pA(reference)
        if electrode.pipette_capacitance_pF > 0:
            loads.append(Load(node, electrode.resistance_GOhm, electrode.pipette_capacitance_pF))
    share = spread_current(np.asarray(cell.resistance_GOhm * conductance, dtype=np.complex128)).real
    network = Network(
        parent=layout.parent,
        resistance_GOhm=cell.resistance_GOhm,
        conductance_nS=conductance,
        capacitance_pF=cell.capacitance_pF,
        node_conductance_nS=node_conductance,
        node_capacitance_pF=cell.node_capacitance_pF,
        lean=layout.lean_of_area,
        tilt_nS=2 * share * along * (layout.lean_of_length - layout.lean_of_area),
        loads=tuple(loads),
    )
    steady = network.at(np.zeros(1))
    deviation = steady.voltages(drive, moment, node_drive)[:, 0].real
    return OperatingPoint(
        model, layout, cell, network, steady, tuple(numbers), reference, deviation, drive / conductance
    )
