"""From pieces and specific constants to the conductances, capacitances and synapse numbers of a network."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from cable.network.layout import Layout
from cable.theory.membrane import MEMBRANE_VALUES, Membrane
from cable.theory.synapse import SynapticInput
from cable.theory.units import capacitance_pF_per_um2, conductance_nS_per_um2, resistivity_GOhm_um
from morphology import Place, ZonePart

Floats = NDArray[np.float64]


@dataclass(frozen=True, eq=False)
class Passive:
    """The cell without input: (E,) values of pieces, (E + 1,) values of what is lumped at nodes (spheres)."""

    resistance_GOhm: Floats
    leak_nS: Floats
    capacitance_pF: Floats
    rest_mV: Floats
    node_leak_nS: Floats
    node_capacitance_pF: Floats
    node_rest_mV: Floats


def passive(layout: Layout, membrane: Membrane, parts: list[ZonePart]) -> Passive:
    """Leak, capacitance and axial resistance of every piece and sphere; `parts` are the membrane's zones, resolved."""
    pieces = {name: np.full(len(layout.row), float(getattr(membrane, name))) for name in MEMBRANE_VALUES}
    nodes = {name: np.full(len(layout.parent), float(getattr(membrane, name))) for name in MEMBRANE_VALUES}
    for zone, part in zip(membrane.zones, parts, strict=True):
        inside, spheres = layout.inside(part), layout.spheres_inside(part)
        for name in MEMBRANE_VALUES:
            value = getattr(zone, name)
            if value is not None:
                pieces[name][inside] = value
                nodes[name][spheres] = value
    area, sphere = (
        area * values["spine_factor"] for area, values in ((layout.area_um2, pieces), (layout.sphere_area_um2, nodes))
    )
    return Passive(
        resistance_GOhm=resistivity_GOhm_um(pieces["axial_resistivity_ohm_cm"]) * layout.axial_per_um,
        leak_nS=area * conductance_nS_per_um2(pieces["resistance_ohm_cm2"]),
        capacitance_pF=area * capacitance_pF_per_um2(pieces["capacitance_uF_cm2"]),
        rest_mV=pieces["rest_mV"],
        node_leak_nS=sphere * conductance_nS_per_um2(nodes["resistance_ohm_cm2"]),
        node_capacitance_pF=sphere * capacitance_pF_per_um2(nodes["capacitance_uF_cm2"]),
        node_rest_mV=nodes["rest_mV"],
    )


def synapse_numbers(
    layout: Layout, population: SynapticInput, part: ZonePart | None, places: list[Place]
) -> tuple[Floats, Floats]:
    """How many synapses of a population sit on each piece (E,) and at each node (E + 1,).

    Args:
        layout: the pieces; the zone's limits and the places are among its cuts.
        population: the synapses.
        part: its zone, resolved, where it has one.
        places: its places, where it has those, in the order of `population.at`.
    """
    pieces, nodes = np.zeros(len(layout.row)), np.zeros(len(layout.parent))
    if part is None:
        for placed, place in zip(population.at, places, strict=True):
            nodes[layout.node_at(place)] += placed.number
        return pieces, nodes
    inside, spheres = layout.inside(part), layout.spheres_inside(part)
    by_area = population.by_area
    pieces[inside] = (layout.area_um2 if by_area else layout.length_um)[inside]
    if by_area:
        nodes[spheres] = layout.sphere_area_um2[spheres]
    if population.count is not None:
        density = population.count / (pieces.sum() + nodes.sum() or 1.0)
    else:
        density = population.density_per_um2 or population.density_per_um or 0.0
    return pieces * density, nodes * density
