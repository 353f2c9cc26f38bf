"""How finely tapering cylinders and varying driving forces are divided, and how far that is from converged.

The error falls with the fourth power of the number of pieces, so the difference between a layout and the
one with twice as many pieces is, to a fifteenth, the layout's own error. Stretches without taper and without
conductance input are exact in one piece, however long.
"""

from __future__ import annotations

from concurrent.futures import ThreadPoolExecutor
from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from cable.network.quadrature import NotConverged
from cable.noise.operating_point import OperatingPoint, operating_point
from cable.noise.population import total_spectrum

if TYPE_CHECKING:
    from cable.noise.model import CableModel

Floats = NDArray[np.float64]
TARGET = 1e-6  # of the variance at any point
LOCAL = 2e-6  # of a piece's own effect, which is a small part of the whole
ALLOWANCE = 4 / 3  # on the measured difference; 16/15 for a clean fourth power
PROBE_STEP, PROBES = 2.6, 2  # probes at ω = 0 and ω₀ sinh(2.6): a crude variance, for comparison only
MOST_PIECES, MOST_PER_STRETCH = 15_000, 4  # beyond both, division is given up: no cell, but a wrong unit needs more


@dataclass(frozen=True, eq=False)
class Refined:
    """An operating point whose division has converged, and the certified relative error that is left."""

    point: OperatingPoint
    relative_error: float


def refine(model: CableModel) -> Refined:
    """Divide until means and a crude variance have converged to `TARGET` at every point.

    Raises:
        NotConverged: cylinders so long for their radius, or tapering so steeply, that it would take too many pieces.
    """
    point = operating_point(model)
    uneven = np.zeros(point.layout.segments, dtype=bool)
    uneven[point.layout.segment[point.needs_division()]] = True
    if not uneven.any():
        return Refined(point, 0.0)
    lost = np.zeros(len(uneven))
    np.maximum.at(lost, point.layout.segment, point.unevenness(4 * point.network.slowest_rate_per_ms))
    local = LOCAL
    while True:
        wanted = np.where(uneven, np.maximum(1, np.ceil((lost / local) ** 0.25)), 1.0)
        _check_number(wanted, point)
        divide = wanted.astype(np.int64)
        if (divide > 1).any():
            point = operating_point(model, divide)
        finer = operating_point(model, np.where(uneven, 2 * divide, divide))
        error = ALLOWANCE * _difference(point, finer)
        if error <= TARGET:
            return Refined(point, error)
        local *= min(0.5 * TARGET / error, 0.25)


def _check_number(wanted: Floats, point: OperatingPoint) -> None:
    """Raise NotConverged where the wanted divisions of stretches are too many to be made."""
    if wanted.sum() <= max(MOST_PIECES, MOST_PER_STRETCH * len(wanted)):
        return
    layout, tree = point.layout, point.layout.tree
    worst = layout.row[layout.segment == int(np.argmax(wanted))][0]
    raise NotConverged(
        f"the cylinder that ends at SWC id {tree.ids[worst]} ({tree.edge_length_um[worst]:.3g} µm long, radius "
        f"{tree.radius_um[tree.parent[worst]]:.3g} to {tree.radius_um[worst]:.3g} µm) would have to be divided into "
        f"{wanted.max():.2g} pieces for an exact answer, {wanted.sum():.2g} in the whole cell; check the unit of "
        "positions and radii (µm) and the membrane's values"
    )


def _difference(coarse: OperatingPoint, fine: OperatingPoint) -> float:
    """Largest relative difference of mean or crude variance between two layouts, at the tree's points."""
    one, other = coarse.layout.row_node, fine.layout.row_node
    size = np.abs(fine.deviation_mV).max() or 1.0
    mean = float(np.abs(coarse.deviation_mV[one] - fine.deviation_mV[other]).max() / size)
    u = PROBE_STEP * np.arange(PROBES)
    omega0 = coarse.network.slowest_rate_per_ms
    weights = np.cosh(u) * np.r_[0.5, np.ones(PROBES - 1)]

    def crude_variance(point: OperatingPoint) -> Floats:
        response = point.network.at(omega0 * np.sinh(u))
        return total_spectrum(point.sources, response)[point.layout.row_node] @ weights

    with ThreadPoolExecutor(2) as pool:
        crude = list(pool.map(crude_variance, (coarse, fine)))
    with np.errstate(divide="ignore", invalid="ignore"):
        variance = np.where(crude[1] > 0, np.abs(crude[0] / crude[1] - 1), 0.0)
    return max(mean, float(variance.max(initial=0.0)))
