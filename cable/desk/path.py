"""The way along the tree from the soma to a site, and the site table of its points."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from cable.desk.messages import DeskError
from cable.desk.site_table import joined, point_of_site, points_table, sites_table
from cable.desk.tables import Table
from morphology import CellTree
from morphology.measures import sum_from_root

if TYPE_CHECKING:
    from cable.noise.fluctuations import Fluctuations
    from cable.noise.model import CableModel

Floats = NDArray[np.float64]


@dataclass(frozen=True, eq=False)
class WayToSite:
    """The points passed from the soma to a site.

    Attributes:
        site: the site at the end.
        rows: (K,) rows of the points from the soma on; without the site where it lies between points.
        from_soma_um: (K,) or (K + 1,) distance from the soma's centre along the tree, the site last.
    """

    site: str
    rows: NDArray[np.int64]
    from_soma_um: Floats


def distance_from_soma(tree: CellTree) -> Floats:
    """(N,) distance from the soma's centre along the tree, µm; the soma need not be the root."""
    if tree.shape.soma == 0:
        return np.asarray(tree.path_um)
    on_way = np.zeros(len(tree), dtype=bool)
    on_way[tree.path_to(tree.shape.soma)] = True
    shared = sum_from_root(tree, np.where(on_way, tree.edge_length_um, 0.0))
    return np.asarray(tree.path_um + tree.path_um[tree.shape.soma] - 2 * shared)


def distance_of_site(model: CableModel, name: str) -> float:
    """Distance of a site from the soma's centre along the tree, µm."""
    distance, row = distance_from_soma(model.tree), point_of_site(model, name)
    if row is not None:
        return float(distance[row])
    place = model.site_places[name]
    ends = distance[[model.tree.parent[place.row], place.row]]
    return float(ends[0] + place.fraction * (ends[1] - ends[0]))


def way_to_site(model: CableModel, site: str) -> WayToSite:
    """The way from the soma to a site.

    Raises:
        DeskError: the site is where the soma is.
    """
    tree, row = model.tree, point_of_site(model, site)
    between = row is None
    if row is None:
        row = model.site_places[site].row
    up, down = tree.path_to(tree.shape.soma), tree.path_to(row)
    shared = int((up[: len(down)] == down[: len(up)]).sum())
    rows = np.r_[up[shared - 1 :][::-1], down[shared:]]
    distance = distance_from_soma(tree)
    if between and len(rows) > 1 and rows[-2] == tree.parent[row]:
        rows = rows[:-1]
    from_soma = np.r_[distance[rows], distance_of_site(model, site)] if between else distance[rows]
    if len(from_soma) < 2:
        raise DeskError(f"{site}: is where the soma is, expected a site away from it; name another site")
    return WayToSite(site, rows, from_soma)


def way_table(field: Fluctuations, way: WayToSite) -> Table:
    """The site table of the points on the way, with their distance from the soma in front."""
    table = points_table(field, way.rows)
    if len(way.from_soma_um) > len(way.rows):
        table = joined(table, sites_table(field, [way.site]))
    return Table({"from_soma_um": way.from_soma_um, **table.columns})


def sites_on_way(model: CableModel, way: WayToSite) -> list[str]:
    """The sites that lie on the way, its end included."""
    passed = set(way.rows.tolist())
    on_way = []
    for name in model.site_names:
        row = point_of_site(model, name)
        if row is None:
            place = model.site_places[name]
            inside = {place.row, int(model.tree.parent[place.row])} <= passed
        else:
            inside = row in passed
        if inside or name == way.site:
            on_way.append(name)
    return on_way
