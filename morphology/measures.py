"""The usual numbers of a reconstruction: lengths, areas, orders, taper, Rall's ratio, area by distance."""

from __future__ import annotations

from dataclasses import asdict, dataclass
from typing import Any

import numpy as np

from morphology.distance import DistanceBin, area_by_distance
from morphology.kinds import SOMA, kind_name
from morphology.structure import Floats, Ints, Mask
from morphology.tree import CellTree


@dataclass(frozen=True)
class Quartiles:
    """The three quartiles of `count` values; NaN where there are none."""

    count: int
    lower: float
    median: float
    upper: float


@dataclass(frozen=True)
class Measures:
    """The measures of one cell. Lengths and areas are those of cable; a spherical soma is area only.

    Attributes:
        rows: number of points.
        length_um, area_um2: totals of the cell.
        length_by_kind_um, area_by_kind_um2: the same by kind of neurite.
        branch_points: points off the soma with two cables or more that go on from them.
        tips: ends of cables.
        max_branch_order: most branch points passed on a way from the root.
        max_path_um: longest way from the root's centre.
        taper_by_kind: mean change of radius per µm away from the root along unbranched runs, each run
            weighted by its length; negative where neurites thin.
        electrotonic_extent: from the soma to the electrically farthest tip, in length constants.
        axial_resistivity_ohm_cm, resistance_ohm_cm2: what that extent was computed with.
        rall_ratio: sum of the daughters' d^1.5 over the parent's at branch points (1 by the 3/2 law).
        area_by_distance: bins of 50 µm path distance.
        box_um: extents in x, y and z.
        soma_rule: how the soma was taken.
    """

    rows: int
    length_um: float
    area_um2: float
    length_by_kind_um: dict[str, float]
    area_by_kind_um2: dict[str, float]
    branch_points: int
    tips: int
    max_branch_order: int
    max_path_um: float
    taper_by_kind: dict[str, float]
    electrotonic_extent: float
    axial_resistivity_ohm_cm: float
    resistance_ohm_cm2: float
    rall_ratio: Quartiles
    area_by_distance: tuple[DistanceBin, ...]
    box_um: tuple[float, float, float]
    soma_rule: str

    def as_dict(self) -> dict[str, Any]:
        """All fields by name as plain numbers, lists and dicts; None where a number is not defined."""
        return {name: _plain(value) for name, value in asdict(self).items()}


def measure(tree: CellTree, axial_resistivity_ohm_cm: float = 150.0, resistance_ohm_cm2: float = 20_000.0) -> Measures:
    """The measures of a tree; the two membrane numbers serve the electrotonic extent alone.

    Raises:
        ValueError: a membrane number that is not positive.
    """
    if not (axial_resistivity_ohm_cm > 0 and resistance_ohm_cm2 > 0):
        raise ValueError("axial_resistivity_ohm_cm and resistance_ohm_cm2 must be positive")
    shape = tree.shape
    cable = shape.far > shape.near
    onward = branches_below(tree, cable)
    forks = (onward > 1) & (tree.kinds != SOMA)
    runs = _runs(tree, cable, forks)
    return Measures(
        rows=len(tree),
        length_um=float(shape.length_um.sum()),
        area_um2=float(shape.area_um2.sum() + shape.sphere_area_um2.sum()),
        length_by_kind_um=_by_kind(shape.kind, shape.length_um, cable),
        area_by_kind_um2=_area_by_kind(tree, cable),
        branch_points=int(forks.sum()),
        tips=int((cable & (onward == 0) & (tree.kinds != SOMA)).sum()),
        max_branch_order=int(tree.branch_order.max()),
        max_path_um=float(tree.path_um.max()),
        taper_by_kind=_taper(tree, cable, runs),
        electrotonic_extent=electrotonic_extent(tree, axial_resistivity_ohm_cm, resistance_ohm_cm2),
        axial_resistivity_ohm_cm=float(axial_resistivity_ohm_cm),
        resistance_ohm_cm2=float(resistance_ohm_cm2),
        rall_ratio=_quartiles(rall_ratios(tree)),
        area_by_distance=area_by_distance(tree),
        box_um=tuple(float(v) for v in np.ptp(tree.xyz_um, axis=0)),  # type: ignore[arg-type]
        soma_rule=shape.soma_rule,
    )


def electrotonic_distance(tree: CellTree, axial_resistivity_ohm_cm: float, resistance_ohm_cm2: float) -> Floats:
    """(N,) distance from the soma's surface in length constants, λ = sqrt(R_m d / (4 R_i)).

    Along a frustum the integral of dx/λ is closed: 2 Δx / (sqrt(d_near) + sqrt(d_far)) · sqrt(4 R_i/R_m).
    Source: Rall 1959, Exp Neurol 1:491-527, for λ.
    """
    shape = tree.shape
    root_um = np.sqrt(2 * shape.radius_near_um) + np.sqrt(2 * shape.radius_far_um)
    per_sqrt_um = np.sqrt(4 * axial_resistivity_ohm_cm / resistance_ohm_cm2 * 1e-4)  # cm to µm
    step = 2 * shape.length_um / root_um * per_sqrt_um
    step[0] = 0.0
    from_root = sum_from_root(tree, step)
    if shape.soma == 0:
        return from_root
    on_way = np.zeros(len(tree), dtype=bool)
    on_way[tree.path_to(shape.soma)] = True
    # from the soma up to where the ways part, then down
    shared = sum_from_root(tree, np.where(on_way, step, 0.0))
    return np.asarray(from_root + from_root[shape.soma] - 2 * shared)


def electrotonic_extent(
    tree: CellTree, axial_resistivity_ohm_cm: float = 150.0, resistance_ohm_cm2: float = 20_000.0
) -> float:
    """Distance from the soma to the electrically farthest point, in length constants."""
    return float(electrotonic_distance(tree, axial_resistivity_ohm_cm, resistance_ohm_cm2).max())


def rall_ratios(tree: CellTree) -> Floats:
    """Sum of the daughters' d^1.5 over the parent's, for each branch point off the soma.

    The parent's diameter is that at the branch point, a daughter's that of her own first row, which lies in
    the branch point's place or beyond it. Source of the ratio: Rall 1959, Exp Neurol 1:491-527.
    """
    shape = tree.shape
    cable = shape.far > shape.near
    node = joint_rows(tree, cable)
    daughters = np.flatnonzero(cable & (tree.parent >= 0))
    above = node[tree.parent[daughters]]
    own_row_there = above != tree.parent[daughters]
    own = np.where(own_row_there, shape.radius_near_um[daughters], shape.radius_far_um[daughters])
    total = np.bincount(above, own**1.5, len(tree))
    fork = (np.bincount(above, minlength=len(tree)) > 1) & cable & (tree.kinds != SOMA)
    return np.asarray(total[fork] / shape.radius_far_um[fork] ** 1.5)


def joint_rows(tree: CellTree, cable: Mask) -> Ints:
    """(N,) for each point the topmost of the points electrically joined with it."""
    jump = np.where(cable | (tree.parent < 0), np.arange(len(tree)), tree.parent)
    while (jump != jump[jump]).any():
        jump = jump[jump]
    return jump


def branches_below(tree: CellTree, cable: Mask) -> Ints:
    """(N,) number of cables that go on from each point, rows in one place taken together as the topmost."""
    edges = np.flatnonzero(cable & (tree.parent >= 0))
    return np.bincount(joint_rows(tree, cable)[tree.parent[edges]], minlength=len(tree)).astype(np.int64)


def sum_from_root(tree: CellTree, step: Floats) -> Floats:
    """(N,) sums of `step` (N,) along the way from the root to each point."""
    total, jump = step.copy(), np.maximum(tree.parent, 0)
    total[0] = 0.0
    while jump.any():
        total, jump = total + total[jump], jump[jump]
    return total


def _runs(tree: CellTree, cable: Mask, forks: Mask) -> Ints:
    """(N,) a label that the edges of one unbranched run of one kind share: the row where the run begins."""
    parent = np.maximum(tree.parent, 0)
    begins = (tree.parent < 0) | ~cable | ~cable[parent] | forks[parent] | (tree.shape.kind != tree.shape.kind[parent])
    jump = np.where(begins, np.arange(len(tree)), parent)
    while (jump != jump[jump]).any():
        jump = jump[jump]
    return jump


def _taper(tree: CellTree, cable: Mask, runs: Ints) -> dict[str, float]:
    """Change of radius per µm by kind; runs weigh by length, so it is total change over total length."""
    shape = tree.shape
    result = {}
    for code in np.unique(shape.kind[cable & (shape.kind != SOMA)]).tolist():
        edges = np.flatnonzero(cable & (shape.kind == code))
        first = edges[runs[edges] == edges]
        ends = np.setdiff1d(edges, tree.parent[edges[runs[edges] != edges]])
        change = shape.radius_far_um[ends].sum() - shape.radius_near_um[first].sum()
        result[kind_name(code)] = float(change / shape.length_um[edges].sum())
    return result


def _by_kind(kind: Ints, value: Floats, mask: Mask) -> dict[str, float]:
    return {kind_name(c): float(value[mask & (kind == c)].sum()) for c in np.unique(kind[mask]).tolist()}


def _area_by_kind(tree: CellTree, cable: Mask) -> dict[str, float]:
    shape = tree.shape
    areas = _by_kind(shape.kind, shape.area_um2, cable)
    spheres = _by_kind(tree.kinds, shape.sphere_area_um2, shape.sphere_area_um2 > 0)
    return {kind: areas.get(kind, 0.0) + spheres.get(kind, 0.0) for kind in spheres | areas}


def _quartiles(values: Floats) -> Quartiles:
    if not values.size:
        return Quartiles(0, float("nan"), float("nan"), float("nan"))
    lower, median, upper = np.quantile(values, (0.25, 0.5, 0.75)).tolist()
    return Quartiles(int(values.size), lower, median, upper)


def _plain(value: Any) -> Any:
    if isinstance(value, dict):
        return {key: _plain(item) for key, item in value.items()}
    if isinstance(value, tuple | list):
        return [_plain(item) for item in value]
    return None if isinstance(value, float) and not np.isfinite(value) else value
