"""Named repairs of a reconstruction. None is applied unless asked for, and each one says what it changed."""

from __future__ import annotations

from collections.abc import Callable, Iterable
from dataclasses import replace

import numpy as np

from morphology.credibility import side_twigs
from morphology.findings import Finding, SwcError, counted
from morphology.kinds import SOMA
from morphology.soma_rows import FROM_OUTLINE, soma_form, soma_parts, sphere_from_outline
from morphology.structure import Ints, parents_first
from morphology.table import SwcTable

Repair = Callable[[SwcTable], tuple[SwcTable, Finding]]


def apply_repairs(table: SwcTable, names: Iterable[str]) -> tuple[SwcTable, list[Finding]]:
    """The table after these repairs, in their order, and a note on each.

    Raises:
        SwcError: a name is unknown, or the links between rows are broken so that nothing can be repaired.
    """
    notes: list[Finding] = []
    for name in [names] if isinstance(names, str) else names:
        if name not in REPAIRS:
            known = ", ".join(f'"{known}"' for known in REPAIRS)
            message = f"repairs: there is no repair {str(name)!r}"
            raise SwcError([Finding("unknown-repair", "error", None, message, f"Known are {known}.")], table.name)
        if not table.linked or not table.roots.size:
            raise SwcError(table.findings, table.name)
        with np.errstate(all="ignore"):  # rows may hold NaN or infinity; what cannot be repaired stays
            table, note = REPAIRS[name](table)
        notes.append(note)
    return table, notes


def radius_from_neighbours(table: SwcTable) -> tuple[SwcTable, Finding]:
    """Give rows without a usable radius one by linear interpolation along the tree.

    Between the nearest good row above and the nearest good row below, both of the same kind and reached
    through rows of that kind; where only one side has such a row, its radius. Others stay as they are.
    """
    good, radius, kinds = table.readable_radius.tolist(), table.radius_um.copy(), table.kinds.tolist()
    parent, edge = table.parent.tolist(), table.edge_length_um.tolist()
    order = parents_first(table.parent).tolist()
    above: dict[int, tuple[float, float]] = {}
    below: dict[int, tuple[float, float]] = {}
    for row in order:
        up = parent[row]
        if not good[row] and up >= 0 and kinds[up] == kinds[row]:
            if good[up]:
                above[row] = (edge[row], radius[up])
            elif up in above:
                above[row] = (above[up][0] + edge[row], above[up][1])
    for row in reversed(order):
        up = parent[row]
        if up < 0 or good[up] or kinds[up] != kinds[row]:
            continue
        if good[row]:
            near = (edge[row], radius[row])
        elif row in below:
            near = (below[row][0] + edge[row], below[row][1])
        else:
            continue
        below[up] = min(below.get(up, near), near)
    for row in above.keys() | below.keys():
        (up_um, upper), (down_um, lower) = (
            above.get(row, below.get(row, (0, 0))),
            below.get(row, above.get(row, (0, 0))),
        )
        span = up_um + down_um
        radius[row] = upper + (lower - upper) * (up_um / span if span > 0 else 0.5)
    changed = int((radius != table.radius_um)[~table.readable_radius].sum())
    return _done(table, replace(table, radius_um=radius), "radius from neighbours", changed)


def soma_from_outline(table: SwcTable) -> tuple[SwcTable, Finding]:
    """Put one sphere in the place of a soma that is drawn as an outline or as a stack of discs."""
    rows = table.somata
    if soma_form(table) not in ("outline", "chain") or len(rows) < 4:
        return _refused(table, FROM_OUTLINE, "the soma rows are neither an outline nor a stack of four rows or more")
    if soma_parts(table) > 1:
        return _refused(table, FROM_OUTLINE, "the soma rows are in parts which do not touch")
    centre, radius = sphere_from_outline(table)
    top = rows[np.flatnonzero((table.parent[rows] < 0) | (table.kinds[np.maximum(table.parent[rows], 0)] != SOMA))[0]]
    xyz, radii, parent_ids = table.xyz_um.copy(), table.radius_um.copy(), table.parent_ids.copy()
    xyz[top], radii[top] = centre, radius
    hanging = (table.parent >= 0) & (table.kinds[np.maximum(table.parent, 0)] == SOMA)
    parent_ids[hanging] = table.ids[top]
    keep = (table.kinds != SOMA) | (np.arange(len(table)) == top)
    after = replace(table, xyz_um=xyz, radius_um=radii, parent_ids=parent_ids).take(keep)
    return _done(table, after, FROM_OUTLINE, len(rows), f"; one sphere of radius {radius:.4g} µm")


def soma_radius_from_twin(table: SwcTable) -> tuple[SwcTable, Finding]:
    """Give a soma row without a radius that of another soma row in the same place (the largest)."""
    radius = table.radius_um.copy()
    good, soma = table.readable_radius, table.somata
    for row in soma[~good[soma]]:
        twins = soma[good[soma] & (table.xyz_um[soma] == table.xyz_um[row]).all(axis=1)]
        if twins.size:
            radius[row] = table.radius_um[twins].max()
    changed = int((radius[~good] > 0).sum())
    return _done(table, replace(table, radius_um=radius), "soma radius from its twin", changed)


def keep_largest_piece(table: SwcTable) -> tuple[SwcTable, Finding]:
    """Of several unconnected pieces keep the one with most rows (the first of equals)."""
    sizes = np.bincount(table.tops, minlength=len(table))
    keep = table.tops == int(np.argmax(sizes))
    return _done(table, table.take(keep), "keep largest piece", int((~keep).sum()))


def drop_zero_length_edges(table: SwcTable) -> tuple[SwcTable, Finding]:
    """Merge rows with their parent where place, radius and kind are the same."""
    above = np.maximum(table.parent, 0)
    same = (table.parent >= 0) & (table.xyz_um == table.xyz_um[above]).all(axis=1)
    same &= (table.radius_um == table.radius_um[above]) & (table.kinds == table.kinds[above])
    stays = np.where(same, table.parent, np.arange(len(table)))
    while (stays != stays[stays]).any():
        stays = stays[stays]
    parent_ids = np.where(table.parent >= 0, table.ids[stays[above]], table.parent_ids)
    after = replace(table, parent_ids=parent_ids).take(~same)
    return _done(table, after, "drop zero-length edges", int(same.sum()))


def remove_side_twigs(table: SwcTable) -> tuple[SwcTable, Finding]:
    """Remove one-row tips shorter than 3 µm from dendrites that go on beyond them."""
    keep = np.ones(len(table), dtype=bool)
    twigs: Ints = side_twigs(table)
    keep[twigs] = False
    return _done(table, table.take(keep), "remove side twigs", len(twigs))


def _done(before: SwcTable, after: SwcTable, name: str, changed: int, detail: str = "") -> tuple[SwcTable, Finding]:
    if not changed:
        return _refused(before, name, "no row of this cell needs it or allows it")
    (length, area), (new_length, new_area) = _size(before), _size(after)
    message = (
        f'repair "{name}": {counted(changed)} changed or removed{detail}; '
        f"length {_change(length, new_length)}, area {_change(area, new_area)}"
    )
    return after, Finding(_code(name), "note", None, message, "Nothing to do: the repair was asked for.")


def _refused(table: SwcTable, name: str, why: str) -> tuple[SwcTable, Finding]:
    return table, Finding(
        _code(name),
        "note",
        None,
        f'repair "{name}": nothing was changed, {why}',
        "Take the repair off the list.",
    )


def _code(name: str) -> str:
    return "repair-" + name.replace(" ", "-")


def _change(before: float, after: float) -> str:
    return f"{100 * (after / before - 1):+.3g} %" if before > 0 else f"from 0 to {after:.4g}"


def _size(table: SwcTable) -> tuple[float, float]:
    """Length (µm) and area (µm²) of a table that need not be a tree: frusta between rows, radii at least 0.

    A neurite has its own radius where it leaves the soma; the soma is a sphere unless it is a chain.
    """
    parent = np.maximum(table.parent, 0)
    radius = np.where(table.readable_radius, table.radius_um, 0.0)
    chain = soma_form(table) in ("outline", "chain")
    soma, soma_above = table.kinds == SOMA, table.kinds[parent] == SOMA
    edge = (table.parent >= 0) & (~soma | chain) & np.isfinite(table.edge_length_um)
    near = np.where(soma_above & ~soma, radius, radius[parent])
    area = np.pi * (near + radius) * np.hypot(table.edge_length_um, near - radius)
    sphere = 0.0 if chain or not table.somata.size else 4 * np.pi * radius[table.somata].max() ** 2
    return float(table.edge_length_um[edge].sum()), float(area[edge].sum()) + sphere


REPAIRS: dict[str, Repair] = {
    "radius from neighbours": radius_from_neighbours,
    FROM_OUTLINE: soma_from_outline,
    "soma radius from its twin": soma_radius_from_twin,
    "keep largest piece": keep_largest_piece,
    "drop zero-length edges": drop_zero_length_edges,
    "remove side twigs": remove_side_twigs,
}
