"""Membrane area and cable length by path distance."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from morphology.tree import CellTree

BIN_UM = 50.0


@dataclass(frozen=True)
class DistanceBin:
    """What lies between two path distances from the root's centre."""

    from_um: float
    to_um: float
    area_um2: float
    length_um: float


def area_by_distance(tree: CellTree, bin_um: float = BIN_UM) -> tuple[DistanceBin, ...]:
    """Cable length and membrane area between path distances; frusta are cut where the limits fall.

    The area of a spherical soma counts in the bin of its centre.
    """
    shape = tree.shape
    edge = np.flatnonzero(shape.length_um > 0)
    start = tree.path_um[tree.parent[edge]] + shape.near[edge] * tree.edge_length_um[edge]
    length = shape.length_um[edge]
    sphere = np.flatnonzero(shape.sphere_area_um2)
    reach = max(float((start + length).max(initial=0.0)), float(tree.path_um[sphere].max(initial=0.0)))
    n = max(1, int(np.ceil(reach / bin_um - 1e-12)))
    first = np.minimum((start / bin_um).astype(np.int64), n - 1)
    last = np.clip(np.ceil((start + length) / bin_um).astype(np.int64) - 1, first, n - 1)
    pieces = last - first + 1
    owner = np.repeat(np.arange(len(edge)), pieces)
    index = first[owner] + np.arange(len(owner)) - np.repeat(np.cumsum(pieces) - pieces, pieces)
    low = np.clip((index * bin_um - start[owner]) / length[owner], 0.0, 1.0)
    high = np.clip(((index + 1) * bin_um - start[owner]) / length[owner], 0.0, 1.0)
    high = np.where(index == last[owner], 1.0, high)
    near, far = shape.radius_near_um[edge][owner], shape.radius_far_um[edge][owner]
    # area from the near end grows as the integral of the linear radius along the slant
    area = shape.area_um2[edge][owner] * (high - low) * (2 * near + (far - near) * (low + high)) / (near + far)
    areas = np.bincount(index, area, n)
    lengths = np.bincount(index, (high - low) * length[owner], n)
    centre = np.minimum((tree.path_um[sphere] / bin_um).astype(np.int64), n - 1)
    areas = areas + np.bincount(centre, shape.sphere_area_um2[sphere], n)
    return tuple(DistanceBin(k * bin_um, (k + 1) * bin_um, float(areas[k]), float(lengths[k])) for k in range(n))
