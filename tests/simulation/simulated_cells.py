"""Small cells for the simulation, and the fewest compartments they make."""

from __future__ import annotations

import numpy as np

from cable import CableModel, Kernel, Membrane, SynapticInput
from cable.noise.operating_point import OperatingPoint, operating_point
from cable.simulation.compartments import Compartments, compartments
from morphology import CellTree, Site, Zone

PLAIN = Membrane(axial_resistivity_ohm_cm=150.0, capacitance_uF_cm2=1.0, resistance_ohm_cm2=20000.0, rest_mV=-70.0)
SPHERE = CellTree.from_text("1 1 0 0 0 10 -1\n")
BALL_AND_STICK = CellTree.from_text("1 1 0 0 0 10 -1\n2 3 10 0 0 1 1\n3 3 1010 0 0 0.6 2\n")
TIP = Site("tip", swc_id=3)
EXCITATION = SynapticInput(
    name="excitation",
    where=Zone(path_um=(200.0, float("inf"))),
    density_per_um=0.3,
    rate_Hz=2.0,
    conductance_nS=0.6,
    reversal_mV=0.0,
    kernel=Kernel.two_exponential(0.5, 3.0),
)
INHIBITION = SynapticInput(
    name="inhibition",
    where=Zone(),
    density_per_um2=0.01,
    rate_Hz=4.0,
    conductance_nS=0.8,
    reversal_mV=-75.0,
    kernel=Kernel.exponential(6.0),
)


def stick(*inputs: SynapticInput) -> CableModel:
    """A tapering ball and stick, driven unevenly unless other inputs are given."""
    return CableModel(BALL_AND_STICK, PLAIN, inputs or (EXCITATION, INHIBITION), (TIP,))


def divided(model: CableModel, pieces: int) -> tuple[OperatingPoint, Compartments]:
    """The model with every stretch in so many pieces."""
    point = operating_point(model, np.full(model.refined.point.layout.segments, pieces))
    return point, compartments(point)
