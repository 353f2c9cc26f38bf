"""Cells twice, as models of ours and as the oracle's compartments, driven by conductances that jump and decay."""

from __future__ import annotations

import numpy as np

from cable import CableModel, Kernel, Membrane, SynapticInput
from cable.theory.synapse import Placed
from morphology import CellTree, Site, Zone
from oracles.compartments import discretise
from oracles.conductance_moments import Place, mean_and_covariance
from oracles.plain import Cell, Cylinder, Sphere

REST_MV = -70.0
# rate per ms, jump nS, decay per ms, reversal mV; means and decays as in Destexhe et al. 2001 (from memory)
IN_VIVO = (
    (12.1 / 1.2 / 2.728, 1.2, 1 / 2.728, 0.0),
    (57.3 / 0.6 / 10.49, 0.6, 1 / 10.49, -75.0),
)


def sphere_model(capacitance_pF: float, leak_nS: float, rest_mV: float, inputs, scale: float = 1.0) -> CableModel:
    """A sphere; events `scale` times as large and as much rarer."""
    area = 100 * capacitance_pF  # 1 uF/cm2 is 0.01 pF/um2
    tree = CellTree(
        np.array([1]), np.array([1]), np.zeros((1, 3)), np.array([np.sqrt(area / 4 / np.pi)]), np.array([-1])
    )
    populations = tuple(
        SynapticInput(
            name=f"input {k}",
            where=Zone(kinds=("soma",)),
            count=1,
            spread="area",
            rate_Hz=1e3 * rate / scale,
            conductance_nS=jump * scale,
            reversal_mV=reversal,
            kernel=Kernel.exponential(1 / decay),
        )
        for k, (rate, jump, decay, reversal) in enumerate(inputs)
    )
    membrane = Membrane(
        axial_resistivity_ohm_cm=150.0,
        capacitance_uF_cm2=1.0,
        resistance_ohm_cm2=10 * area / leak_nS,
        rest_mV=rest_mV,
    )
    return CableModel(tree, membrane, populations)


def sphere_exact(capacitance_pF: float, leak_nS: float, rest_mV: float, inputs, scale: float = 1.0, degree: int = 12):
    """Exact mean and SD of the same sphere."""
    places = [Place(0, rate / scale, jump * scale, decay, reversal - rest_mV) for rate, jump, decay, reversal in inputs]
    mean, covariance = mean_and_covariance([capacitance_pF], [[leak_nS]], places, degree)
    return float(mean[0]) + rest_mV, float(np.sqrt(covariance[0, 0]))


TREE_INPUTS = (  # SWC id, synapses' rate per ms together, jump nS, decay ms, reversal mV
    (3, 0.6, 0.5, 2.0, -2.0),
    (4, 0.8, 0.4, 2.0, -2.0),
    (2, 0.3, 1.0, 6.0, -75.0),
)


def tree_model(scale: float, **extra) -> CableModel:
    """A soma, a trunk of 150 µm and branches of 120 and 200 µm, with synapses at the fork and at both tips."""
    xyz = np.array([[0, 0, 0], [157, 0, 0], [157 + 120, 0, 0], [157, 200, 0.0]])
    tree = CellTree(
        np.array([1, 2, 3, 4]), np.array([1, 3, 3, 3]), xyz, np.array([7, 0.5, 0.5, 0.5]), np.array([-1, 0, 1, 1])
    )
    inputs = tuple(
        SynapticInput(
            name=f"at {swc_id}",
            at=(Placed(Site(f"point {swc_id}", swc_id=swc_id), number=2),),
            rate_Hz=500 * rate / scale,
            conductance_nS=jump * scale,
            reversal_mV=reversal,
            kernel=Kernel.exponential(decay),
        )
        for swc_id, rate, jump, decay, reversal in TREE_INPUTS
    )
    membrane = Membrane(
        axial_resistivity_ohm_cm=150.0, capacitance_uF_cm2=1.0, resistance_ohm_cm2=15000.0, rest_mV=REST_MV
    )
    sites = tuple(Site(name, swc_id=swc_id) for name, swc_id in (("fork", 2), ("short tip", 3), ("long tip", 4)))
    return CableModel(tree, membrane, inputs, sites, **extra)


def tree_exact(scale: float, degree: int):
    """Exact mean (4,) and covariance (4, 4) at soma, fork, short and long tip, extrapolated in the compartments."""
    cell = Cell(
        tuple(Cylinder(a, b, length, 1.0, 15000.0) for a, b, length in ((0, 1, 150.0), (1, 2, 120.0), (1, 3, 200.0))),
        (Sphere(0, 4 * np.pi * 7.0**2, 15000.0),),
    )
    places = [
        Place(swc_id - 1, rate / scale, jump * scale, 1 / decay, reversal - REST_MV)
        for swc_id, rate, jump, decay, reversal in TREE_INPUTS
    ]
    found = []
    for n in (4, 8):
        parts = discretise(cell, n)
        mean, covariance = mean_and_covariance(parts.capacitance_pF, parts.conductance_nS, places, degree)
        found.append((mean[:4] + REST_MV, covariance[:4, :4]))
    return tuple((4 * fine - coarse) / 3 for coarse, fine in zip(*found, strict=True))
