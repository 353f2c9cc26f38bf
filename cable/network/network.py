"""A passive tree as one linear network at any frequency: admittances, elimination, sources spread on pieces.

A piece that tapers, or whose sources are uneven along it, is the even cylinder of the same totals with its
first moments put right: with m the centroid of what is spread along it, measured from the middle in units
of its axial resistance, the near end gets the share 1 - 2m of an admittance or current and the far end
1 + 2m (1 - 3m and 1 + 3m of a noise covariance). What is left then falls with the fourth power of the
number of pieces instead of the second (derived here; a test asserts the order).
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property

import numpy as np
from numpy.typing import NDArray
from scipy import sparse

from cable.network.elimination import Factors, Impedances, eliminate, impedances, solve, variances
from cable.network.loads import Load
from cable.network.plan import Plan, plan_elimination
from cable.theory.cylinder import cylinder_form

Floats = NDArray[np.float64]
Complexes = NDArray[np.complex128]
Ints = NDArray[np.int64]
ROWS = 1600  # pieces at a time: their arrays stay in cache, and below the size that malloc maps anew


@dataclass(frozen=True, eq=False)
class Network:
    """E pieces and E + 1 nodes with conductances and capacitances; piece i joins node i + 1 to its parent.

    Attributes:
        parent: (E + 1,) parent node, -1 for the root.
        resistance_GOhm: (E,) axial resistance of each piece.
        conductance_nS, capacitance_pF: (E,) membrane of each piece, tonic synaptic conductance included.
        node_conductance_nS, node_capacitance_pF: (E + 1,) what is lumped at nodes (spheres, point synapses).
        lean: (E,) the centroid m of the piece's membrane, -1/2 to 1/2.
        tilt_nS: (E,) conductance to move from the near to the far end, for what is not spread like membrane.
        loads: branches of resistance and capacitance at nodes.
    """

    parent: Ints
    resistance_GOhm: Floats
    conductance_nS: Floats
    capacitance_pF: Floats
    node_conductance_nS: Floats
    node_capacitance_pF: Floats
    lean: Floats
    tilt_nS: Floats
    loads: tuple[Load, ...] = ()

    @cached_property
    def plan(self) -> Plan:
        """The order of elimination."""
        return plan_elimination(self.parent)

    @cached_property
    def _near_ends(self) -> sparse.csr_array:
        """(E + 1, E) of ones: adds to each node what the pieces that begin there give to their near ends."""
        pieces = np.arange(len(self.parent) - 1)
        return sparse.csr_array(
            (np.ones(len(pieces)), (self.parent[1:], pieces)), shape=(len(self.parent), len(pieces))
        )

    def to_nodes(self, near: NDArray, far: NDArray) -> NDArray:
        """Sum at the nodes (E + 1, F) of what each piece gives to its near end and to its far end (E, F)."""
        nodes = (self._near_ends @ np.ascontiguousarray(near).view(np.float64)).view(near.dtype)
        nodes[1:] += far
        return nodes

    def at(self, omega_per_ms: Floats, added_nS: tuple[Complexes, Complexes] | None = None) -> Response:
        """The network eliminated at the angular frequencies ω (F,), rad/ms.

        Args:
            omega_per_ms: (F,) angular frequencies.
            added_nS: (E, F) and (E + 1, F) admittances to add to the membrane of pieces and at nodes.
        """
        omega = np.asarray(omega_per_ms, dtype=float)
        shape = len(self.resistance_GOhm), len(omega)
        near, far, coupling, share = (np.empty(shape, dtype=np.complex128) for _ in range(4))
        noise_self, noise_cross = np.empty(shape), np.empty(shape)
        for start in range(0, shape[0], ROWS):
            rows = slice(start, start + ROWS)
            resistance = self.resistance_GOhm[rows, None]
            membrane = self.conductance_nS[rows, None] + 1j * omega * self.capacitance_pF[rows, None]
            x2 = resistance * (membrane if added_nS is None else membrane + added_nS[0][rows])
            form = cylinder_form(x2)
            coupling[rows] = form.coupling / resistance
            even = form.shunt / resistance
            uneven = even * (2 * self.lean[rows, None]) + self.tilt_nS[rows, None]
            near[rows], far[rows] = even - uneven, even + uneven
            noise_self[rows], noise_cross[rows] = form.noise_self, form.noise_cross
            share[rows] = form.shunt / x2
        shunt = self.to_nodes(near, far)
        shunt += self.node_conductance_nS[:, None] + 1j * omega * self.node_capacitance_pF[:, None]
        if added_nS is not None:
            shunt += added_nS[1]
        for load in self.loads:
            shunt[load.node] += load.admittance_nS(1j * omega)
        factors = eliminate(self.plan, shunt, coupling)
        return Response(self, omega, noise_self, noise_cross, share, factors)

    def columns_at(self, s_per_ms: NDArray[np.complexfloating], nodes: list[int]) -> Columns:
        """Transfer impedances from a few nodes to all, at complex Laplace frequencies s (F,), 1/ms."""
        x2, share, factors = self._eliminated_at(s_per_ms)
        impedance = []
        for node in nodes:
            unit = np.zeros(factors.inverse.shape, dtype=np.complex128)
            unit[node] = 1.0
            impedance.append(solve(factors, unit))
        return Columns(x2, share, np.array(impedance))

    def input_impedance_at(
        self, s_per_ms: NDArray[np.complexfloating], added_nS: tuple[Complexes, Complexes] | None = None
    ) -> Complexes:
        """(E + 1, F) input impedance of each node, GΩ, at complex Laplace frequencies s (F,), 1/ms.

        Args:
            s_per_ms: (F,) frequencies.
            added_nS: as in `at`.
        """
        return impedances(self._eliminated_at(s_per_ms, added_nS)[2]).point[self.plan.node]

    def _eliminated_at(
        self, s_per_ms: NDArray[np.complexfloating], added_nS: tuple[Complexes, Complexes] | None = None
    ) -> tuple[Complexes, Complexes, Factors]:
        s = np.asarray(s_per_ms, dtype=np.complex128)
        axial = self.resistance_GOhm[:, None]
        membrane: Complexes = self.conductance_nS[:, None] + s * self.capacitance_pF[:, None]
        if added_nS is not None:
            membrane = membrane + added_nS[0]
        x2 = (axial * membrane).astype(complex, copy=False)
        form = cylinder_form(x2)
        even = form.shunt / axial
        uneven = even * (2 * self.lean[:, None]) + self.tilt_nS[:, None]
        shunt = self.to_nodes(even - uneven, even + uneven)
        shunt += self.node_conductance_nS[:, None] + s * self.node_capacitance_pF[:, None]
        if added_nS is not None:
            shunt += added_nS[1]
        for load in self.loads:
            shunt[load.node] += load.admittance_nS(s)
        return x2, form.shunt / x2, eliminate(self.plan, shunt, form.coupling / axial)

    @cached_property
    def slowest_rate_per_ms(self) -> float:
        """A lower bound of all relaxation rates: the least conductance per capacitance of any part, 1/ms.

        Half of every conductance is set aside to discharge the k loads: V² at a load's node costs at least 1/Z of
        the input resistance Z there, so that its capacitance relaxes no slower than 1/(C(R + 2kZ)) (derived here).
        """
        ratios = [self.conductance_nS / self.capacitance_pF]
        lumped = self.node_capacitance_pF > 0
        ratios.append(self.node_conductance_nS[lumped] / self.node_capacitance_pF[lumped])
        bound = float(np.concatenate(ratios).min())
        charged = [load for load in self.loads if load.capacitance_pF > 0]
        if not charged:
            return bound
        steady = self.at(np.zeros(1)).input_impedance_GOhm()[:, 0].real
        through = [one.resistance_GOhm + 2 * len(charged) * steady[one.node] for one in charged]
        return min([bound / 2, *(1 / (one.capacitance_pF * r) for one, r in zip(charged, through, strict=True))])


@dataclass(frozen=True, eq=False)
class Columns:
    """What a few nodes hear of every place, at F complex frequencies.

    Attributes:
        x2: (E, F) squared electrotonic length of the pieces.
        share: (E, F) tanh(x/2)/x.
        impedance_GOhm: (nodes, E + 1, F) transfer impedances.
    """

    x2: Complexes
    share: Complexes
    impedance_GOhm: Complexes


@dataclass(frozen=True, eq=False)
class Response:
    """A network at one block of F frequencies.

    Attributes:
        noise_self, noise_cross: (E, F) covariances of the noise that a piece injects at its ends, over its own
            (see `cable.theory.cylinder.CylinderForm`).
        share: (E, F) tanh(x/2)/x, what each end gets of an evenly spread current.
        factors: the eliminated network.
    """

    network: Network
    omega_per_ms: Floats
    noise_self: Floats
    noise_cross: Floats
    share: Complexes
    factors: Factors

    @cached_property
    def impedances(self) -> Impedances:
        """Input and edge impedances in the plan's order."""
        return impedances(self.factors)

    def input_impedance_GOhm(self) -> Complexes:
        """(E + 1, F) input impedance of each node, GΩ."""
        return self.impedances.point[self.network.plan.node]

    def spectra(self, piece_strength: Floats, piece_moment: Floats, node_strength: Floats) -> Floats:
        """(E + 1, F) voltage spectra for independent white current sources.

        Args:
            piece_strength: (E, 1 or F) spectrum of the current of each piece, spread over it, white in space.
            piece_moment: (E, 1 or F) its first moment along the piece, strength times centroid.
            node_strength: (E + 1, 1 or F) spectrum of the currents at nodes.
        """
        own, uneven = self.noise_self, 3 * piece_moment
        self_noise = self.network.to_nodes(own * (piece_strength - uneven), own * (piece_strength + uneven))
        self_noise += node_strength
        return variances(self.factors, self.impedances, self_noise, piece_strength * self.noise_cross)

    def voltages(self, piece_current: Floats, piece_moment: Floats, node_current: Floats) -> Complexes:
        """(E + 1, F) voltages for currents in step.

        Args:
            piece_current: (E,) current spread over each piece.
            piece_moment: (E,) its first moment, current times centroid.
            node_current: (E + 1,) currents at nodes.
        """
        near, far = piece_current - 2 * piece_moment, piece_current + 2 * piece_moment
        current = self.network.to_nodes(near[:, None] * self.share, far[:, None] * self.share)
        current += node_current[:, None]
        return solve(self.factors, current)

    def column(self, node: int) -> Complexes:
        """(E + 1, F) transfer impedance between every node and `node`, GΩ."""
        current = np.zeros((len(self.network.parent), len(self.omega_per_ms)), dtype=np.complex128)
        current[node] = 1.0
        return solve(self.factors, current)
