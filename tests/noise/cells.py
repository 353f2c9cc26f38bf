"""Cells and inputs that several tests share: asymmetric on purpose."""

from __future__ import annotations

import numpy as np

from cable import CableModel, Kernel, Membrane, MembraneZone, SynapticInput
from morphology import CellTree, Zone

MEMBRANE = Membrane(
    axial_resistivity_ohm_cm=140.0,
    capacitance_uF_cm2=0.9,
    resistance_ohm_cm2=18000.0,
    rest_mV=-68.0,
    zones=(MembraneZone(where=Zone(kinds=("apical",)), resistance_ohm_cm2=11000.0, spine_factor=1.6),),
)
EXCITATION = SynapticInput(
    name="excitation",
    where=Zone(kinds=("basal", "apical")),
    density_per_um=0.4,
    rate_Hz=1.5,
    conductance_nS=0.4,
    reversal_mV=0.0,
    kernel=Kernel.two_exponential(0.3, 2.5),
)
INHIBITION = SynapticInput(
    name="inhibition",
    where=Zone(kinds=("soma", "basal")),
    density_per_um2=0.02,
    rate_Hz=4.0,
    conductance_nS=0.6,
    reversal_mV=-75.0,
    kernel=Kernel.alpha(3.0),
)


def arbor(seed: int, points: int, untapered: bool = False) -> CellTree:
    """An uneven random tree: a soma, basal and apical branches, unequal lengths and radii, rows in tree order."""
    rng = np.random.default_rng(seed)
    parent = np.r_[-1, 0, 0, [rng.integers(max(0, i - 6), i) for i in range(3, points)]].astype(np.int64)
    kinds = np.zeros(points, dtype=np.int64)
    kinds[0] = 1
    xyz, radius = np.zeros((points, 3)), np.full(points, 7.0)
    for i in range(1, points):
        at_soma = parent[i] == 0
        kinds[i] = 3 + np.count_nonzero(parent[1:i] == 0) % 2 if at_soma else kinds[parent[i]]
        step = rng.normal(size=3)
        xyz[i] = xyz[parent[i]] + step / np.linalg.norm(step) * (rng.uniform(8, 40) + 7.0 * at_soma)
        radius[i] = rng.uniform(0.6, 1.4) if at_soma else max(0.2, radius[parent[i]] * rng.uniform(0.75, 1.1))
    if untapered:
        radius[1:] = 0.5
    return CellTree(np.arange(points) * 3 + 5, kinds, xyz, radius, parent, name=f"arbor {seed}")


def model(tree: CellTree, *inputs: SynapticInput, membrane: Membrane = MEMBRANE, **extra) -> CableModel:
    """A model of `tree` with the two standard inputs unless others are given."""
    return CableModel(tree, membrane, inputs or (EXCITATION, INHIBITION), **extra)
