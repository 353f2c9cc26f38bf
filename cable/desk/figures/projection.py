"""The cell as flat pieces: which plane it lies in, and where and how wide each piece of cable is drawn."""

from __future__ import annotations

from dataclasses import dataclass
from itertools import combinations

import numpy as np
from numpy.typing import NDArray

from morphology import CellTree

Floats = NDArray[np.float64]
PLANES = {"xy": (0, 1), "xz": (0, 2), "yz": (2, 1)}  # the axes that go right and up
TURNED = "flat"  # the plane in which the cable lies flattest, however it is turned
PIECES_ACROSS = 150  # a piece is at most the cell's size over this long: one piece has one colour


@dataclass(frozen=True, eq=False)
class Pieces:
    """Straight pieces of cable in the plane.

    Attributes:
        ends_um: (P, 2, 2) both ends of each piece, µm.
        radius_um: (P,) radius at its middle.
        values: (P,) value at its middle.
    """

    ends_um: Floats
    radius_um: Floats
    values: Floats

    def __len__(self) -> int:
        return len(self.values)


def flattest_plane(tree: CellTree) -> str:
    """The plane of the two largest extents; xy where extents are equal."""
    extent = np.ptp(tree.xyz_um, axis=0) if len(tree) > 1 else np.zeros(3)
    best = max(combinations(range(3), 2), key=lambda pair: extent[pair[0]] * (1 + 1e-9) + extent[pair[1]])
    return next(name for name, axes in PLANES.items() if set(axes) == set(best))


def directions(tree: CellTree, plane: str) -> Floats:
    """(3, 3) unit vectors that point right, up and to the viewer, one a row.

    In the plane "flat" the variance of the cable towards the viewer is least; y stays up as far as it can.
    """
    if plane != TURNED:
        across, upward = PLANES[plane]
        return np.eye(3)[[across, upward, ({0, 1, 2} - {across, upward}).pop()]]
    parent, weight = np.maximum(tree.parent, 0), np.maximum(tree.edge_length_um, 1e-12)
    middle = 0.5 * (tree.xyz_um + tree.xyz_um[parent])
    apart = middle - np.average(middle, axis=0, weights=weight)
    _, vectors = np.linalg.eigh((apart * weight[:, None]).T @ apart)
    towards = vectors[:, 0]  # of the least variance
    towards = towards * (-1.0 if towards[np.abs(towards).argmax()] < 0 else 1.0)
    wished = np.array([0.0, 1.0, 0.0]) if abs(towards[1]) < 0.9 else np.array([0.0, 0.0, 1.0])
    up = wished - (wished @ towards) * towards
    up = up / np.linalg.norm(up)
    return np.array([np.cross(up, towards), up, towards])


def flat_xy(tree: CellTree, plane: str) -> Floats:
    """(N, 2) the points in the plane, µm."""
    return np.ascontiguousarray(tree.xyz_um @ directions(tree, plane)[:2].T)


def bounds(tree: CellTree, plane: str) -> tuple[Floats, Floats]:
    """Lower left and upper right corner (2,) of all that is drawn, µm."""
    flat, radius = flat_xy(tree, plane), tree.radius_um[:, None]
    sphere = np.sqrt(tree.shape.sphere_area_um2 / (4 * np.pi))[:, None]
    reach = np.maximum(radius, sphere)
    return (flat - reach).min(axis=0), (flat + reach).max(axis=0)


def cut(tree: CellTree, plane: str, values: Floats) -> Pieces:
    """The cable of a cell in short pieces, the deepest first, with values linear between points."""
    shape, flat = tree.shape, flat_xy(tree, plane)
    parent = np.maximum(tree.parent, 0)
    edges = np.flatnonzero((shape.far > shape.near) & (tree.parent >= 0))
    edges = edges[np.argsort(tree.xyz_um[edges] @ directions(tree, plane)[2], kind="stable")]
    low, high = bounds(tree, plane)
    step = max(float((high - low).max()) / PIECES_ACROSS, 1e-9)
    across = np.linalg.norm(flat[edges] - flat[parent[edges]], axis=1)
    count = np.maximum(1, np.ceil(across / step)).astype(int)
    edge = np.repeat(edges, count)
    number = np.arange(len(edge)) - np.repeat(np.cumsum(count) - count, count)
    per = 1.0 / np.repeat(count, count)

    def at(share: Floats) -> Floats:
        fraction = shape.near[edge] + share * (shape.far[edge] - shape.near[edge])
        return np.asarray(flat[parent[edge]] + fraction[:, None] * (flat[edge] - flat[parent[edge]]))

    middle = (number + 0.5) * per
    wide = shape.radius_near_um[edge] + middle * (shape.radius_far_um[edge] - shape.radius_near_um[edge])
    # the soma's surface has the voltage of its centre: values begin with the parent's where the cable does
    shade = values[parent[edge]] + middle * (values[edge] - values[parent[edge]])
    return Pieces(np.stack([at(number * per), at((number + 1) * per)], axis=1), wide, shade)
