"""How fast the spectrum at each place falls at high frequency, from what sits there.

At high frequency a place hears only its own neighbourhood. On a bare neurite |Z_xx|² falls as 1/ω, and the
sources within a length constant, which shrinks as ω^{-1/2}, count; where a sphere sits, |Z_xx|² falls as
1/ω². With a kernel falling as ω^{-n} the power of 1/ω is 2n plus: 1 for a point synapse on a neurite, 3/2 for
synapses spread along it, 2 for those on a sphere, 5/2 for those spread on a neurite that leaves a sphere.
n is 0 where the charge of an event comes at once.
Places without a source at hand fall faster than any power.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from cable.noise.operating_point import OperatingPoint


def falls_as(point: OperatingPoint) -> NDArray[np.float64]:
    """(E + 1,) the power p of S ~ ω^{-p} at each node; infinite where no source is at hand."""
    lumped = point.network.node_capacitance_pF > 0
    lumped[[load.node for load in point.network.loads if load.resistance_GOhm == 0]] = True
    parent = point.network.parent[1:]
    power = np.full(len(lumped), np.inf)
    for source in point.sources:
        base = 2.0 * source.population.kernel.falls_as
        spread = np.zeros(len(lumped), dtype=bool)
        spread[1:] |= source.piece_strength > 0
        spread[parent[source.piece_strength > 0]] = True
        power[spread] = np.minimum(power[spread], base + np.where(lumped, 2.5, 1.5)[spread])
        here = source.node_strength > 0
        power[here] = np.minimum(power[here], base + np.where(lumped, 2.0, 1.0)[here])
    return power
