"""A cell as compartments: what is spread along the pieces of an operating point, lumped at their ends.

A piece gives half of its membrane and of its synapses to either end, the halves shifted by the first moment of
what is spread along it; its axial resistance joins the ends. That errs by the square of the pieces' electrotonic
length, which `cable.simulation.discretisation` computes.
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property

import numpy as np
from numpy.typing import NDArray
from scipy import sparse
from scipy.sparse.linalg import splu

from cable.noise.operating_point import OperatingPoint
from cable.theory.synapse import SynapticInput

Floats = NDArray[np.float64]


@dataclass(frozen=True, eq=False)
class Population:
    """The synapses of one input in compartments.

    Attributes:
        source: the input.
        number: (n,) synapses in each compartment; need not be whole.
    """

    source: SynapticInput
    number: Floats

    @property
    def total(self) -> float:
        """All synapses."""
        return float(self.number.sum())


@dataclass(frozen=True, eq=False)
class Compartments:
    """n compartments joined to a tree, around their own mean state.

    Attributes:
        parent: (n,) parent compartment, -1 for the root; parents come first.
        axial_nS: (n - 1,) conductance between compartment i + 1 and its parent.
        conductance_nS: (n,) leak and mean synaptic conductance to ground.
        capacitance_pF: (n,).
        mean_mV: (n,) mean voltage that the mean conductances and currents hold.
        populations: the inputs.
    """

    parent: NDArray[np.int64]
    axial_nS: Floats
    conductance_nS: Floats
    capacitance_pF: Floats
    mean_mV: Floats
    populations: tuple[Population, ...]

    @cached_property
    def matrix_nS(self) -> sparse.csc_matrix:
        """(n, n) conductances: I = G·V for voltages V from the mean state."""
        n = len(self.parent)
        child, parent = np.arange(1, n), self.parent[1:]
        diagonal = self.conductance_nS + np.bincount(child, self.axial_nS, n) + np.bincount(parent, self.axial_nS, n)
        rows = np.r_[np.arange(n), child, parent]
        columns = np.r_[np.arange(n), parent, child]
        return sparse.csc_matrix((np.r_[diagonal, -self.axial_nS, -self.axial_nS], (rows, columns)), shape=(n, n))

    def force(self, one: SynapticInput) -> Floats:
        """(n,) current of one event at the kernel's peak in the mean state, pA (for an impulse its charge, fC)."""
        if one.conductance_nS is None or one.reversal_mV is None:
            return np.full(len(self.parent), one.event_current_pA)
        return one.conductance_nS * (one.reversal_mV - self.mean_mV)


def compartments(point: OperatingPoint) -> Compartments:
    """The pieces of an operating point as compartments, each node one."""
    layout, cell, network = point.layout, point.passive, point.network
    inputs = point.model.inputs

    def lumped(on_pieces: Floats, at_nodes: Floats, lean: Floats) -> Floats:
        return network.to_nodes(on_pieces * (0.5 - lean), on_pieces * (0.5 + lean)) + at_nodes

    populations = tuple(
        Population(one, lumped(*numbers, layout.lean_of_area if one.by_area else layout.lean_of_length))
        for one, numbers in zip(inputs, point.numbers, strict=True)
    )
    conductance = lumped(cell.leak_nS, cell.node_leak_nS, layout.lean_of_area)
    drive = lumped(
        cell.leak_nS * (cell.rest_mV - point.reference_mV),
        cell.node_leak_nS * (cell.node_rest_mV - point.reference_mV),
        layout.lean_of_area,
    )
    for one, population in zip(inputs, populations, strict=True):
        if one.reversal_mV is None:
            drive = drive + one.mean_current_pA * population.number
        else:
            mean = one.mean_conductance_nS * population.number
            conductance = conductance + mean
            drive = drive + mean * (one.reversal_mV - point.reference_mV)
    still = Compartments(
        parent=layout.parent,
        axial_nS=1 / cell.resistance_GOhm,
        conductance_nS=conductance,
        capacitance_pF=lumped(cell.capacitance_pF, cell.node_capacitance_pF, layout.lean_of_area),
        mean_mV=np.zeros(len(layout.parent)),
        populations=populations,
    )
    mean = splu(still.matrix_nS, permc_spec="COLAMD").solve(drive)
    return Compartments(
        still.parent,
        still.axial_nS,
        still.conductance_nS,
        still.capacitance_pF,
        point.reference_mV + mean,
        populations,
    )
