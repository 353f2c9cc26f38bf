"""What the points of a reconstruction stand for as solids: one sphere or a chain for the soma, frusta else.

The rules, in the order in which they are tried:

* one soma point, or several in one place: an isopotential sphere of its (largest) radius;
* three soma points, a centre and two at about plus and minus its radius (the convention of large public
  archives): the sphere of the same area, at the centre, and the side points are electrically joined to it;
* any other set of soma points: a chain of frusta like every other run of points;
* no soma point: frusta only, and the root stands in for the soma wherever a soma is asked for.

A neurite that hangs on a soma point starts at the soma's surface with the radius of its own first point;
points inside the soma are electrically joined to it. Two points in one place are one electrical point.
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property

import numpy as np
from numpy.typing import NDArray

from morphology.kinds import SOMA
from morphology.tree import CellTree, Floats, Ints

Mask = NDArray[np.bool_]
SIDE_POINT_SLACK = 0.1  # how far the side points of a three-point soma may miss the sphere, per radius
SURFACE_SLACK = 1e-9  # a point written on the surface counts as on it, whatever rounding made of it


@dataclass(frozen=True, eq=False)
class Shape:
    """The solids of a cell. Edge i runs from parent[i] (fraction 0) to point i (fraction 1).

    Attributes:
        soma_rule: the rule that was used for the soma, as a sentence.
        soma: row of the point that the site "soma" stands for.
        sphere_area_um2: (N,) area of the isopotential sphere at a point, 0 where there is none.
        near, far: (N,) the fractions of each edge between which it is cable; equal where its two ends
            are electrically joined.
        radius_near_um, radius_far_um: (N,) radius of the cable at those two fractions.
        kind: (N,) kind of the cable: that of the far point, or the neurite's where one end is the soma.
        edge_length_um: (N,) straight distance from parent to point.
    """

    soma_rule: str
    soma: int
    sphere_area_um2: Floats
    near: Floats
    far: Floats
    radius_near_um: Floats
    radius_far_um: Floats
    kind: Ints
    edge_length_um: Floats

    @cached_property
    def length_um(self) -> Floats:
        """(N,) axial length of the cable of each edge, µm."""
        return (self.far - self.near) * self.edge_length_um

    @cached_property
    def area_um2(self) -> Floats:
        """(N,) lateral area of the frustum of each edge, µm²; 0 where the ends are joined."""
        slant = np.hypot(self.length_um, self.radius_near_um - self.radius_far_um)
        return np.where(self.far > self.near, np.pi * (self.radius_near_um + self.radius_far_um) * slant, 0.0)

    def radius_at(self, fraction: Floats) -> Floats:
        """Radius of the cable (µm) at a fraction of each edge, clipped to its cable part."""
        span = np.where(self.far > self.near, self.far - self.near, 1.0)
        share = np.clip((fraction - self.near) / span, 0.0, 1.0)
        return self.radius_near_um + share * (self.radius_far_um - self.radius_near_um)


def shape_of(tree: CellTree) -> Shape:
    """The solids that `tree` stands for, by the rules above."""
    somata = np.flatnonzero(tree.kinds == SOMA)
    rule, centre = _soma_rule(tree, somata)
    sphere = np.zeros(len(tree))
    if centre is not None:
        sphere[centre] = 4 * np.pi * tree.radius_um[somata].max() ** 2
    owner = _points_in_soma(tree, centre)
    near, far, radius_near, radius_far = _cable(tree, owner, centre)
    parent = np.maximum(tree.parent, 0)
    touches = (tree.kinds == SOMA) & (tree.kinds[parent] != SOMA)
    return Shape(
        soma_rule=rule,
        soma=int(somata[0]) if somata.size else 0,
        sphere_area_um2=sphere,
        near=near,
        far=far,
        radius_near_um=radius_near,
        radius_far_um=radius_far,
        kind=np.where(touches, tree.kinds[parent], tree.kinds),
        edge_length_um=tree.edge_length_um,
    )


def _soma_rule(tree: CellTree, somata: Ints) -> tuple[str, int | None]:
    """The sentence for the rule that applies, and the row of the sphere's centre (None: no sphere)."""
    if not somata.size:
        return "no soma point: every run of points is cable, and the root stands in for the soma", None
    first, radius = int(somata[0]), tree.radius_um[somata].max()
    offset = np.linalg.norm(tree.xyz_um[somata] - tree.xyz_um[first], axis=1)
    if somata.size == 1:
        return f"one soma point: an isopotential sphere of radius {radius:.4g} µm", first
    if not offset.any():
        return (
            f"{somata.size} soma points in one place: one isopotential sphere of radius {radius:.4g} µm",
            first,
        )
    sides = somata[1:]
    if (
        somata.size == 3
        and (tree.parent[sides] == first).all()
        and np.allclose(offset[1:], radius, rtol=SIDE_POINT_SLACK)
        and np.allclose(tree.radius_um[sides], tree.radius_um[first], rtol=SIDE_POINT_SLACK)
    ):
        return f"three-point soma: the sphere of the same area, radius {radius:.4g} µm, at its centre", first
    return f"{somata.size} soma points: a chain of frusta", None


def _ball(tree: CellTree, owner: Ints, centre: int | None) -> tuple[Floats, Floats]:
    """Centre (n, 3) and radius (n,) of the soma's surface as seen from owning soma points (n,)."""
    if centre is None:
        return tree.xyz_um[owner], tree.radius_um[owner]
    radius = tree.radius_um[tree.kinds == SOMA].max()
    return np.broadcast_to(tree.xyz_um[centre], (len(owner), 3)), np.full(len(owner), radius)


def _points_in_soma(tree: CellTree, centre: int | None) -> Ints:
    """(N,) the soma point which each point belongs to, -1 for points outside the soma."""
    owner = np.where(tree.kinds == SOMA, np.arange(len(tree)), -1)
    edge = np.arange(1, len(tree))
    ends = np.stack([np.r_[edge, tree.parent[1:]], np.r_[tree.parent[1:], edge]])
    while True:
        inner, outer = ends[:, (owner[ends[0]] >= 0) & (owner[ends[1]] < 0)]
        middle, radius = _ball(tree, owner[inner], centre)
        inside = np.linalg.norm(tree.xyz_um[outer] - middle, axis=1) <= radius * (1 + SURFACE_SLACK)
        if not inside.any():
            return owner
        owner[outer[inside]] = owner[inner[inside]]


def _cable(tree: CellTree, owner: Ints, centre: int | None) -> tuple[Floats, Floats, Floats, Floats]:
    """The cable part (near, far) of every edge and its two radii."""
    n, parent = len(tree), np.maximum(tree.parent, 0)
    near, far = np.zeros(n), np.ones(n)
    radius_near, radius_far = tree.radius_um[parent].copy(), tree.radius_um.copy()
    both = (owner >= 0) & (owner[parent] >= 0)
    soma_chain = both & (tree.kinds == SOMA) & (tree.kinds[parent] == SOMA) & (centre is None)
    near[(both & ~soma_chain) | (tree.edge_length_um == 0)] = 1.0
    for leaving, inner_end, outer_end in (
        ((owner[parent] >= 0) & (owner < 0), parent, np.arange(n)),
        ((owner >= 0) & (owner[parent] < 0), np.arange(n), parent),
    ):
        edge = np.flatnonzero(leaving & (tree.parent >= 0))
        inner, outer = inner_end[edge], outer_end[edge]
        start = _exit_fraction(tree, inner, outer, owner[inner], centre)
        own = tree.radius_um[outer]
        at_surface = np.where(
            tree.kinds[inner] == SOMA, own, tree.radius_um[inner] + start * (own - tree.radius_um[inner])
        )
        outward = outer == edge
        near[edge] = np.where(outward, start, 0.0)
        far[edge] = np.where(outward, 1.0, 1.0 - start)
        radius_near[edge] = np.where(outward, at_surface, own)
        radius_far[edge] = np.where(outward, own, at_surface)
    return near, far, radius_near, radius_far


def _exit_fraction(tree: CellTree, inner: Ints, outer: Ints, owner: Ints, centre: int | None) -> Floats:
    """How far along the way from `inner` to `outer` the soma's surface is crossed, 0 to 1."""
    middle, radius = _ball(tree, owner, centre)
    offset, step = tree.xyz_um[inner] - middle, tree.xyz_um[outer] - tree.xyz_um[inner]
    a = np.einsum("ij,ij->i", step, step)
    b = np.einsum("ij,ij->i", offset, step)
    c = np.einsum("ij,ij->i", offset, offset) - radius**2
    root = np.sqrt(np.maximum(b * b - a * c, 0.0))
    # the larger root of a f² + 2 b f + c = 0, written so that neither sign of b cancels
    with np.errstate(divide="ignore", invalid="ignore"):
        fraction = np.where(b > 0, -c / (b + root), (root - b) / a)
    return np.clip(np.nan_to_num(fraction), 0.0, 1.0)
