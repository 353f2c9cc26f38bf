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

from cable.noise.operating_point import OperatingPoint, operating_point
from cable.noise.population import total_spectrum

if TYPE_CHECKING:
    from cable.noise.model import CableModel

Floats = NDArray[np.float64]
TARGET = 1e-6  # of the variance at any point
LOCAL = 2e-6  # of a piece's own effect, which is a small part of the whole
ALLOWANCE = 4 / 3  # on the measured difference; 16/15 for a clean fourth power
PROBE_STEP, PROBES = 2.6, 2  # probes at ω = 0 and ω₀ sinh(2.6): a crude variance, for comparison only
MAX_PIECES = 2_000_000


@dataclass(frozen=True, eq=False)
class Refined:
    """An operating point whose division has converged, and the certified relative error that is left."""

    point: OperatingPoint
    relative_error: float


def refine(model: CableModel) -> Refined:
    """Divide until means and a crude variance have converged to `TARGET` at every point."""
    point = operating_point(model)
    uneven = np.zeros(point.layout.segments, dtype=bool)
    uneven[point.layout.segment[point.needs_division()]] = True
    if not uneven.any():
        return Refined(point, 0.0)
    lost = np.zeros(len(uneven))
    np.maximum.at(lost, point.layout.segment, point.unevenness(4 * point.network.slowest_rate_per_ms))
    local = LOCAL
    while True:
        divide = np.where(uneven, np.maximum(1, np.ceil((lost / local) ** 0.25)), 1).astype(np.int64)
        if (divide > 1).any():
            point = operating_point(model, divide)
        finer = operating_point(model, np.where(uneven, 2 * divide, divide))
        error = ALLOWANCE * _difference(point, finer)
        if error <= TARGET or finer.layout.row.size > MAX_PIECES:
            return Refined(point, error)
        local *= min(0.5 * TARGET / error, 0.25)


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
