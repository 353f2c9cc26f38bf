"""From the solids of a cell to the pieces of the network: cuts, nodes, and what each piece holds.

A cylinder is cut at zone limits and at sites, exactly where they fall, and a piece that tapers or whose
driving force varies may be divided further. Every piece then is the cylinder with the frustum's axial
resistance R_i·l/(π r₁ r₂) and its lateral area π(r₁+r₂)√(l²+(r₁-r₂)²). Node 0 is the root; piece i ends at
node i + 1. Points that are electrically joined share a node.
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property

import numpy as np
from numpy.typing import NDArray

from morphology import CellTree, Place, ZonePart

Floats = NDArray[np.float64]
Ints = NDArray[np.int64]


@dataclass(frozen=True, eq=False)
class Layout:
    """The pieces of one cell.

    Attributes:
        tree: the cell, of N points.
        row: (E,) the tree edge (by its far point's row) that each piece is part of.
        low, high: (E,) the piece's ends as fractions of that edge.
        segment: (E,) the stretch between two cuts that the piece is part of.
        segments: how many such stretches there are.
        parent: (E + 1,) the network's parent node of each node.
        row_node: (N,) the node of each tree point.
    """

    tree: CellTree
    row: Ints
    low: Floats
    high: Floats
    segment: Ints
    segments: int
    parent: Ints
    row_node: Ints

    @cached_property
    def length_um(self) -> Floats:
        """(E,) axial length of each piece, µm."""
        return (self.high - self.low) * self.tree.shape.edge_length_um[self.row]

    @cached_property
    def radii_um(self) -> tuple[Floats, Floats]:
        """(E,) radius at the near and at the far end of each piece, µm."""
        shape = self.tree.shape
        near, far = shape.near[self.row], shape.far[self.row]
        first, last = shape.radius_near_um[self.row], shape.radius_far_um[self.row]
        slope = (last - first) / (far - near)
        return first + slope * (self.low - near), last - slope * (far - self.high)

    @cached_property
    def area_um2(self) -> Floats:
        """(E,) lateral area of each piece, µm²."""
        first, last = self.radii_um
        return np.pi * (first + last) * np.hypot(self.length_um, first - last)

    @cached_property
    def axial_per_um(self) -> Floats:
        """(E,) axial resistance of each piece over the resistivity, 1/µm."""
        first, last = self.radii_um
        return self.length_um / (np.pi * first * last)

    @cached_property
    def sphere_area_um2(self) -> Floats:
        """(E + 1,) area of the isopotential sphere at each node, µm²."""
        area = np.zeros(len(self.parent))
        spheres = np.flatnonzero(self.tree.shape.sphere_area_um2)
        np.add.at(area, self.row_node[spheres], self.tree.shape.sphere_area_um2[spheres])
        return area

    @cached_property
    def tapers(self) -> NDArray[np.bool_]:
        """(E,) whether the piece is a true frustum."""
        first, last = self.radii_um
        return np.abs(first - last) > 1e-12 * (first + last)

    @cached_property
    def lean_of_area(self) -> Floats:
        """(E,) centroid of a piece's membrane from its middle, in units of its axial resistance."""
        first, last = self.radii_um
        return 0.5 * (last - first) / (last + first)

    @cached_property
    def lean_of_length(self) -> Floats:
        """(E,) the same for what is spread evenly along its axis."""
        t = 2 * self.lean_of_area
        steep = np.abs(t) > 0.1
        safe = np.where(steep, t, 0.5)
        closed = (1 + safe) / (2 * safe) * (1 - (1 - safe) * np.arctanh(safe) / safe) - 0.5
        series = sum(t ** (2 * k + 1) / ((2 * k + 1) * (2 * k + 3)) for k in range(8))
        return np.where(steep, closed, series)

    def inside(self, part: ZonePart) -> NDArray[np.bool_]:
        """(E,) whether each piece lies in a zone whose limits are among the cuts."""
        middle = 0.5 * (self.low + self.high)
        return (middle > part.low[self.row]) & (middle < part.high[self.row])

    def spheres_inside(self, part: ZonePart) -> NDArray[np.bool_]:
        """(E + 1,) whether each node carries a sphere that lies in the zone."""
        inside = np.zeros(len(self.parent), dtype=bool)
        inside[self.row_node[part.spheres]] = True
        return inside

    def node_at(self, place: Place) -> int:
        """The node of a place that is among the cuts."""
        shape = self.tree.shape
        if place.fraction >= shape.far[place.row]:
            return int(self.row_node[place.row])
        if place.fraction <= shape.near[place.row]:
            return int(self.row_node[max(self.tree.parent[place.row], 0)])
        pieces = np.flatnonzero(self.row == place.row)
        return int(pieces[np.argmin(np.abs(self.high[pieces] - place.fraction))]) + 1


def lay_out(tree: CellTree, parts: list[ZonePart], places: list[Place], divide: Ints | None = None) -> Layout:
    """Cut the cell at the limits of zones and at places, and divide the stretches between cuts.

    Args:
        tree: the cell.
        parts: resolved zones whose limits become cuts.
        places: places that become cuts.
        divide: (segments,) into how many pieces of equal length each stretch is divided; None for one each.
    """
    shape, n = tree.shape, len(tree)
    cable = 1 + np.flatnonzero(shape.far[1:] > shape.near[1:])
    rows = [cable, cable] + [np.arange(n)] * (2 * len(parts)) + [np.array([p.row for p in places], dtype=np.int64)]
    fractions = [shape.near[cable], shape.far[cable]]
    fractions += [limit for part in parts for limit in (part.low, part.high)] + [np.array([p.fraction for p in places])]
    row, cut = np.concatenate(rows), np.concatenate(fractions)
    useful = (shape.far[row] > shape.near[row]) & (cut >= shape.near[row]) & (cut <= shape.far[row])
    row, cut = row[useful], cut[useful]
    order = np.lexsort((cut, row))
    row, cut = row[order], cut[order]
    apart = np.ones(len(row), dtype=bool)
    apart[1:] = (row[1:] != row[:-1]) | (cut[1:] - cut[:-1] > 1e-12)
    row, cut = row[apart], cut[apart]
    pair = np.flatnonzero(row[1:] == row[:-1])
    row, low, high = row[pair], cut[pair], cut[pair + 1]
    segments = len(row)
    times = np.ones(segments, dtype=np.int64) if divide is None else np.asarray(divide, dtype=np.int64)
    segment = np.repeat(np.arange(segments), times)
    step = np.arange(len(segment)) - np.repeat(np.cumsum(times) - times, times)
    width = (high - low)[segment] / times[segment]
    piece_low = low[segment] + step * width
    piece_high = np.where(step + 1 == times[segment], high[segment], low[segment] + (step + 1) * width)
    row = row[segment]
    row_node = _row_nodes(tree, row)
    first = np.ones(len(row), dtype=bool)
    first[1:] = row[1:] != row[:-1]
    parent = np.arange(-1, len(row))
    parent[1:][first] = row_node[tree.parent[row[first]]]
    return Layout(tree, row, piece_low, piece_high, segment, segments, parent, row_node)


def _row_nodes(tree: CellTree, row: Ints) -> Ints:
    """The node of each tree point: where its edge's last piece ends, or its parent's node where it is joined."""
    n = len(tree)
    node = np.full(n, -1)
    node[row] = np.arange(len(row)) + 1  # the last piece of each row wins
    node[0] = 0
    stand_in = np.where(node >= 0, np.arange(n), tree.parent)
    while (node[stand_in] < 0).any():
        stand_in = stand_in[stand_in]
    return node[stand_in]
