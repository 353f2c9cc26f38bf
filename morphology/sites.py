"""How a part of the tree (a zone) or one point of it (a site) is said, and what it resolves to."""

from __future__ import annotations

from dataclasses import dataclass, field

import numpy as np
from numpy.typing import NDArray

from morphology.kinds import kind_code, kind_name
from morphology.tree import CellTree, Floats

Range = tuple[float, float]
AXES = {"x": 0, "y": 1, "z": 2}


class PlaceError(ValueError):
    """A zone or site that names no place of this cell, or more than one; the message says what to do."""


@dataclass(frozen=True)
class Place:
    """One point of the tree: `fraction` of the way (0 to 1) from the parent of row `row` to that row."""

    row: int
    fraction: float = 1.0


@dataclass(frozen=True, eq=False)
class ZonePart:
    """A resolved zone.

    Attributes:
        low, high: (N,) the part of each edge inside the zone, as fractions from parent to point; an edge
            is outside where low >= high.
        spheres: (N,) points whose isopotential sphere is inside.
    """

    low: Floats
    high: Floats
    spheres: NDArray[np.bool_]

    @property
    def empty(self) -> bool:
        """Whether the zone selects nothing at all."""
        return not ((self.high > self.low).any() or self.spheres.any())


@dataclass(frozen=True)
class Zone:
    """A part of the tree: all filters that are given must hold. Ranges cut a cylinder where they fall.

    Attributes:
        kinds: kinds of neurite, as words or SWC codes.
        path_um: distance from the root's centre along the tree, from and to, µm.
        branch_order: number of branch points passed on the way from the root, from and to.
        radius_um: radius of the neurite, from and to, µm.
        height_um: distance from the soma along `height_axis`, from and to, µm (negative below).
        height_axis: "x", "y" or "z".
        subtree_of: SWC id of a point; its own cylinder and all that hangs on the point.

    Raises:
        ValueError: a range whose end lies below its beginning, an unknown kind or axis.
    """

    kinds: tuple[str | int, ...] | None = None
    path_um: Range | None = None
    branch_order: Range | None = None
    radius_um: Range | None = None
    height_um: Range | None = None
    height_axis: str = "y"
    subtree_of: int | None = None

    def __post_init__(self) -> None:
        for name in ("path_um", "branch_order", "radius_um", "height_um"):
            limits = getattr(self, name)
            if limits is not None and not limits[0] <= limits[1]:
                raise ValueError(f"{name}: the range {list(limits)} ends below its beginning")
        if self.height_axis not in AXES:
            raise ValueError(f"height_axis: expected x, y or z, found {self.height_axis!r}")
        for kind in self.kinds or ():
            kind_code(kind)

    def resolve(self, tree: CellTree) -> ZonePart:
        """The cable and spheres of `tree` inside this zone (possibly empty).

        Raises:
            PlaceError: `subtree_of` names no point of the tree.
        """
        shape, parent = tree.shape, np.maximum(tree.parent, 0)
        low, high = shape.near.copy(), shape.far.copy()
        spheres = shape.sphere_area_um2 > 0
        chosen = np.ones(len(tree), dtype=bool)
        if self.kinds is not None:
            codes = [kind_code(k) for k in self.kinds]
            chosen &= np.isin(shape.kind, codes)
            spheres &= np.isin(tree.kinds, codes)
        if self.branch_order is not None:
            first, last = self.branch_order
            inside = (tree.branch_order >= first) & (tree.branch_order <= last)
            chosen, spheres = chosen & inside, spheres & inside
        if self.subtree_of is not None:
            inside = tree.subtree(_row_of(tree, self.subtree_of))
            chosen, spheres = chosen & inside, spheres & inside
        sphere_radius = np.sqrt(shape.sphere_area_um2 / (4 * np.pi))
        along = tree.xyz_um[:, AXES[self.height_axis]]
        height: Floats = along - float(along[shape.soma])
        linear = (
            (self.path_um, tree.path_um[parent], tree.path_um, tree.path_um),
            (self.height_um, height[parent], height, height),
            (self.radius_um, *self._radius_line(tree), sphere_radius),
        )
        for limits, at_parent, at_point, at_sphere in linear:
            if limits is not None:
                inner, outer = _inside(limits, at_parent, at_point)
                low, high = np.maximum(low, inner), np.minimum(high, outer)
                spheres &= (at_sphere >= limits[0]) & (at_sphere <= limits[1])
        outside = ~chosen | (low >= high)
        low[outside] = high[outside] = 0.0
        return ZonePart(low, high, spheres)

    @staticmethod
    def _radius_line(tree: CellTree) -> tuple[Floats, Floats]:
        """The cable's radius, continued linearly to fractions 0 and 1 of each edge."""
        shape = tree.shape
        span = np.where(shape.far > shape.near, shape.far - shape.near, 1.0)
        slope = (shape.radius_far_um - shape.radius_near_um) / span
        return shape.radius_near_um - slope * shape.near, shape.radius_far_um + slope * (1.0 - shape.far)


def _inside(limits: Range, at_parent: Floats, at_point: Floats) -> tuple[Floats, Floats]:
    """The fractions between which a quantity linear along each edge lies within `limits`."""
    step = at_point - at_parent
    with np.errstate(divide="ignore", invalid="ignore"):
        one, other = (limits[0] - at_parent) / step, (limits[1] - at_parent) / step
    within = (at_parent >= limits[0]) & (at_parent <= limits[1])
    first = np.where(step == 0, np.where(within, 0.0, 1.0), np.minimum(one, other))
    last = np.where(step == 0, np.where(within, 1.0, 0.0), np.maximum(one, other))
    return first, last


def _row_of(tree: CellTree, swc_id: int) -> int:
    try:
        return tree.index_of(swc_id)
    except KeyError as error:
        raise PlaceError(f"{error.args[0]} (it may be of a kind that is left out)") from None


@dataclass(frozen=True)
class Site:
    """One named point: an SWC id (with a fraction of the way from its parent), or a path distance in a zone.

    Attributes:
        name: what the site is called.
        swc_id: the point's SWC id.
        fraction: 0 at the parent of `swc_id`, 1 at the point itself.
        path_um: distance from the root's centre, µm; the one place of `zone` at this distance.
        zone: filters that choose among several places at one distance.

    Raises:
        ValueError: neither or both of `swc_id` and `path_um`, or a fraction outside 0 to 1.
    """

    name: str
    swc_id: int | None = None
    fraction: float = 1.0
    path_um: float | None = None
    zone: Zone = field(default_factory=Zone)

    def __post_init__(self) -> None:
        if (self.swc_id is None) == (self.path_um is None):
            raise ValueError("a site needs either swc_id or path_um (with filters such as kinds)")
        if not 0.0 <= self.fraction <= 1.0:
            raise ValueError(f"fraction: expected 0 to 1 (from the parent to the point), found {self.fraction}")

    def resolve(self, tree: CellTree) -> Place:
        """The one place of `tree` that this site names.

        Raises:
            PlaceError: there is no such place, or more than one; the message lists what there is.
        """
        if self.swc_id is not None:
            return Place(_row_of(tree, self.swc_id), self.fraction)
        assert self.path_um is not None
        return self._at_path(tree, self.path_um)

    def _at_path(self, tree: CellTree, path_um: float) -> Place:
        shape, part = tree.shape, self.zone.resolve(tree)
        parent = np.maximum(tree.parent, 0)
        start = tree.path_um[parent]
        inside = part.high > part.low
        reach = np.where(inside, start + part.high * tree.edge_length_um, -np.inf)
        begin = start + part.low * tree.edge_length_um
        rows = np.flatnonzero((begin < path_um) & (path_um <= reach))
        if not rows.size:
            root_radius = np.sqrt(shape.sphere_area_um2[0] / (4 * np.pi))
            if 0 <= path_um <= root_radius and (part.spheres[0] or shape.sphere_area_um2[0] == 0):
                return Place(0, 1.0)
            if part.empty:
                raise PlaceError(f"site {self.name!r}: no part of the cell passes its filters")
            raise PlaceError(
                f"site {self.name!r}: no place at path_um = {path_um:g}; where its filters hold the path runs "
                f"from {begin[inside].min(initial=np.inf if inside.any() else 0.0):.4g} "
                f"to {max(reach.max(), 0.0):.4g} µm"
            )
        if rows.size > 1:
            listed = ", ".join(f"{tree.ids[r]} ({kind_name(shape.kind[r])})" for r in rows[:6])
            more = f" and {rows.size - 6} more" if rows.size > 6 else ""
            raise PlaceError(
                f"site {self.name!r}: {rows.size} places lie at path_um = {path_um:g}; say which by swc_id, "
                f"or narrow the filters. They are on the cylinders of SWC ids {listed}{more}"
            )
        row = int(rows[0])
        return Place(row, float((path_um - start[row]) / tree.edge_length_um[row]))
