"""Cells of one or two parts with electrodes, for which a pencil is enough."""

from __future__ import annotations

import math

from cable import CableModel, Kernel, Membrane, SynapticInput
from cable.theory.electrode import Electrode
from morphology import CellTree, Site, Zone

MEMBRANE = Membrane(axial_resistivity_ohm_cm=150.0, capacitance_uF_cm2=1.0, resistance_ohm_cm2=20000.0, rest_mV=0.0)
CABLE = "1 3 0 0 0 1 -1\n2 3 500 0 0 1 1\n3 3 1000 0 0 1 2\n"
BALL_AND_STICK = "1 1 0 0 0 10 -1\n2 3 10 0 0 1 1\n3 3 1010 0 0 1 2\n"
CAPACITANCE_PF, RESISTANCE_GOHM, CHARGE_FC, RATE_PER_MS = 4e-2 * math.pi * 100, 1 / (0.2 * math.pi), 10.0, 1.0


def sphere(*electrodes: Electrode, decay_ms: float = 2.0, sites: tuple[str, ...] = ()) -> CableModel:
    """A sphere of 20 µm with 1 event of 10 fC per ms, exponential."""
    one = SynapticInput(
        name="current",
        where=Zone(),
        count=200,
        spread="area",
        rate_Hz=5.0,
        current_pA=CHARGE_FC / decay_ms,
        kernel=Kernel.exponential(decay_ms),
    )
    tree = CellTree.from_text("1 1 0 0 0 10 -1\n")
    places = tuple(Site(name, swc_id=1) for name in sites)
    return CableModel(tree, MEMBRANE, (one,), sites=places, electrodes=electrodes)


def spread(text: str, *electrodes: Electrode, membrane: Membrane = MEMBRANE) -> CableModel:
    """A cell with current synapses in proportion to its area, and its third row as the site "tip"."""
    one = SynapticInput(
        name="current",
        where=Zone(),
        density_per_um2=0.08,
        rate_Hz=1.0,
        current_pA=10.0,
        kernel=Kernel.exponential(2.0),
    )
    tree = CellTree.from_text(text)
    return CableModel(tree, membrane, (one,), sites=(Site("tip", swc_id=3),), electrodes=electrodes)
