"""Random cells said twice: as SWC rows with zones for the program, and as frusta with spans for the oracle."""

from __future__ import annotations

import numpy as np

from cable import Kernel, Membrane, MembraneZone, Placed, SynapticInput
from morphology import CellTree, Site, Zone
from oracles.cut_cells import Ball, Frustum, Synapses
from oracles.plain import event_area

SOMA_UM = 6.0
BASAL, APICAL = 3, 4
MEMBRANE = Membrane(
    axial_resistivity_ohm_cm=130.0,
    capacitance_uF_cm2=0.9,
    resistance_ohm_cm2=17000.0,
    rest_mV=-69.0,
    zones=(
        MembraneZone(where=Zone(kinds=("apical",)), resistance_ohm_cm2=9000.0, spine_factor=1.7),
        MembraneZone(
            where=Zone(kinds=("soma", "basal")),
            axial_resistivity_ohm_cm=190.0,
            capacitance_uF_cm2=1.2,
            rest_mV=-66.0,
        ),
    ),
)


class WholeCell:
    """A soma and a few random branches.

    Attributes:
        tree: for the program; frusta, balls: for the oracle.
        row: row of the tree that each node of the frusta is.
    """

    def __init__(self, seed: int, branches: int, tapering: bool) -> None:
        rng = np.random.default_rng(seed)
        kinds, xyz, radius, parent = [1], [np.zeros(3)], [SOMA_UM], [-1]
        self.row, self.kind, self.path, self.frusta = [0], [1], [SOMA_UM], list[Frustum]()
        for child in range(1, branches + 1):
            above = 0 if child < 3 else int(rng.integers(1, child))
            self.kind.append((BASAL, APICAL)[child - 1] if child < 3 else self.kind[above])
            length = rng.uniform(40, 160)
            near = rng.uniform(0.4, 1.3)
            far = near * rng.uniform(0.5, 0.9) if tapering else near
            direction = rng.normal(size=3)
            direction /= np.linalg.norm(direction)
            # a hair inside the soma's surface, lest rounding leave a cable between the two
            place = xyz[self.row[above]] + (SOMA_UM * (1 - 1e-13) * direction if above == 0 else 0.0)
            kinds += [self.kind[child]] * 2
            xyz += [place, place + length * direction]
            radius += [near, far]
            parent += [self.row[above], len(parent)]
            self.row.append(len(parent) - 1)
            self.path.append(self.path[above] + length)
            basal = self.kind[child] == BASAL
            # the apical zone's spines are more membrane: less resistance, more capacitance per bare area
            specific = (17000.0, 190.0, 1.2, -66.0) if basal else (9000.0 / 1.7, 130.0, 0.9 * 1.7, -69.0)
            self.frusta.append(Frustum(above, child, float(length), near, far, *specific))
        self.tree = CellTree(
            np.arange(1, len(parent) + 1), np.array(kinds), np.array(xyz), np.array(radius), np.array(parent)
        )
        self.balls = [Ball(0, SOMA_UM, 17000.0, 1.2, -66.0)]

    def spans(self, kind: int | None, low_um: float, high_um: float) -> tuple[tuple[float, ...], tuple[float, ...]]:
        """Where on each frustum a zone of that kind between two path distances begins and ends."""
        first, last = [], []
        for f in self.frusta:
            start = self.path[f.parent]
            inside = kind is None or self.kind[f.child] == kind
            first.append(min(max(low_um - start, 0.0), f.length_um) if inside else 0.0)
            last.append(min(max(high_um - start, 0.0), f.length_um) if inside else 0.0)
        return tuple(first), tuple(last)

    def spread_by_length(self, **event: float) -> tuple[SynapticInput, Synapses]:
        """Basal synapses from 31 to 170 µm, correlated; two exponentials."""
        where = Zone(kinds=("basal",), path_um=(31.0, 170.0))
        one = SynapticInput(
            name="by length",
            where=where,
            density_per_um=0.7,
            rate_Hz=2.5,
            kernel=Kernel.two_exponential(0.4, 3.0),
            correlation=0.15,
            **event,
        )
        return one, self._plain(one, (0.4, 3.0), by_length=0.7, spans=self.spans(BASAL, 31.0, 170.0), correlation=0.15)

    def spread_by_area(self, **event: float) -> tuple[SynapticInput, Synapses]:
        """Synapses on soma and all dendrites up to 140 µm; alpha kernel."""
        where = Zone(kinds=("soma", "basal", "apical"), path_um=(0.0, 140.0))
        one = SynapticInput(
            name="by area", where=where, density_per_um2=0.05, rate_Hz=4.0, kernel=Kernel.alpha(2.0), **event
        )
        spans = self.spans(None, 0.0, 140.0)
        return one, self._plain(one, (2.0, 2.0), by_area=0.05, spans=spans, balls=(0,))

    def at_points(self, **event: float) -> tuple[SynapticInput, Synapses]:
        """Point synapses on the soma and at the end of branch 3; exponential kernel."""
        where = tuple(Placed(Site("", swc_id=self.row[node] + 1), k) for node, k in ((0, 30.0), (3, 5.0)))
        one = SynapticInput(name="points", at=where, rate_Hz=6.0, kernel=Kernel.exponential(1.5), **event)
        return one, self._plain(one, (1.5,), number_at=((0, 30.0), (3, 5.0)))

    def _plain(
        self,
        one: SynapticInput,
        poles: tuple[float, ...],
        spans: tuple[tuple[float, ...], tuple[float, ...]] = ((), ()),
        **more,
    ) -> Synapses:
        peak = one.current_pA if one.conductance_nS is None else one.conductance_nS
        area = event_area(float(peak), poles)
        return Synapses(one.rate_Hz * 1e-3, area, poles, one.reversal_mV, from_um=spans[0], to_um=spans[1], **more)
