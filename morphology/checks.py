"""Errors: what keeps the rows from being a tree with positive radii. Each check gives one finding at most."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np

from morphology.findings import Finding, excerpt, listed, rows_by_kind, subject
from morphology.kinds import AXON, kind_name
from morphology.structure import MISSING, Ints, Mask, cycle_through, endless
from morphology.table import LARGEST_UM, SMALLEST_UM, SwcTable

NEIGHBOURS = '"radius from neighbours"'


def check_rows(table: SwcTable) -> list[Finding]:
    """The errors of a table with at least one row, and the note on the order of its rows."""
    findings = [check(table) for check in _CHECKS]
    return [f for f in findings if f is not None]


def _first_line(table: SwcTable, rows: Ints) -> int:
    return int(table.lines[rows].min())


def _duplicate_id(table: SwcTable) -> Finding | None:
    order = np.argsort(table.ids, kind="stable")
    again = np.sort(order[1:][np.diff(table.ids[order]) == 0])
    if not again.size:
        return None
    n = len(again)
    message = f"{subject(n, 'repeat', 'repeats')} an id that is taken {table.named(again)}"
    return Finding(
        "duplicate-id",
        "error",
        _first_line(table, again),
        message,
        "Give every row an id of its own; look for rows pasted twice.",
    )


def _negative_id(table: SwcTable) -> Finding | None:
    rows = np.flatnonzero(table.ids < 0)
    if not rows.size:
        return None
    message = f"{subject(len(rows), 'have', 'has')} a negative id {table.named(rows)}"
    return Finding(
        "negative-id",
        "error",
        _first_line(table, rows),
        message,
        "Number the rows from 0 or 1; a negative number marks a root's parent.",
    )


def _missing_parent(table: SwcTable) -> Finding | None:
    rows = np.flatnonzero(table.parent == MISSING)
    if not rows.size:
        return None
    n = len(rows)
    message = (
        f"{subject(n, 'have', 'has')} a parent that is not in the file "
        f"(ids {listed(table.ids[rows])}; parents {listed(table.parent_ids[rows])})"
    )
    remedy = "Correct the parent, or write -1 if the row is the root."
    return Finding("missing-parent", "error", _first_line(table, rows), message, remedy)


def _self_parent(table: SwcTable) -> Finding | None:
    rows = np.flatnonzero(table.ids == table.parent_ids)
    if not rows.size:
        return None
    message = f"{subject(len(rows), 'are their', 'is its')} own parent {table.named(rows)}"
    return Finding(
        "self-parent",
        "error",
        _first_line(table, rows),
        message,
        "Correct the parent, or write -1 if the row is the root.",
    )


def _cycle(table: SwcTable) -> Finding | None:
    caught = endless(table.parent) & (table.ids[table.tops] != table.parent_ids[table.tops])
    if not caught.any():
        return None
    ring = np.array(cycle_through(table.parent, int(np.flatnonzero(caught)[0])), dtype=np.int64)
    ring = np.roll(ring, -int(np.argmin(ring)))
    if len(ring) < 2:
        return None  # a row that is its own parent, met through a repeated id: said by that check
    shown = " -> ".join(str(i) for i in table.ids[np.r_[ring, ring[:1]] if len(ring) <= 8 else ring[:8]].tolist())
    tail = f" -> ... ({len(ring)} rows)" if len(ring) > 8 else ""
    message = f"the parents run in a circle: {shown}{tail}"
    return Finding(
        "cycle",
        "error",
        _first_line(table, ring),
        message,
        "Correct the parent of one of these rows so that the path ends at the root.",
    )


def _no_root(table: SwcTable) -> Finding | None:
    if table.roots.size:
        return None
    return Finding(
        "no-root",
        "error",
        None,
        "no row is the root: no parent is negative",
        "Write -1 as the parent of the row where the cell begins.",
    )


def _several_roots(table: SwcTable) -> Finding | None:
    n = len(table.roots)
    if n < 2:
        return None
    sizes = np.bincount(table.tops, minlength=len(table))[table.roots]
    largest = np.argsort(-sizes, kind="stable")
    pieces = f"{listed(sizes[largest], 8)} rows, roots {listed(table.ids[table.roots[largest]], 8)}"
    message = f"the cell is in {n:,} unconnected pieces ({pieces})"
    remedy = 'Connect them where the cell is known to continue, or apply the repair "keep largest piece".'
    return Finding("several-roots", "error", int(table.lines[table.roots[1]]), message, remedy)


def _not_a_number(table: SwcTable) -> Finding | None:
    rows = (
        np.flatnonzero(np.isin(table.lines, list(table.unread)) & ~_finite(table))
        if table.unread
        else np.empty(0, dtype=int)
    )
    if not rows.size:
        return None
    column, token = table.unread[int(table.lines[rows[0]])]
    message = (
        f"{rows_by_kind(table.kinds[rows])} without a number for a position or the radius "
        f"{table.named(rows)}; the first has {excerpt(token)} for its {column}"
    )
    return Finding("not-a-number", "error", _first_line(table, rows), message, _radius_remedy(table, rows))


def _not_finite(table: SwcTable) -> Finding | None:
    odd = ~_finite(table)
    if table.unread:
        odd &= ~np.isin(table.lines, list(table.unread))
    rows = np.flatnonzero(odd)
    if not rows.size:
        return None
    message = f"{rows_by_kind(table.kinds[rows])} with a position or radius not finite {table.named(rows)}"
    return Finding("not-finite", "error", _first_line(table, rows), message, _radius_remedy(table, rows))


def _finite(table: SwcTable) -> Mask:
    return (np.abs(table.xyz_um) < LARGEST_UM).all(axis=1) & (np.abs(table.radius_um) < LARGEST_UM)


def _zero_radius(table: SwcTable) -> Finding | None:
    rows = np.flatnonzero((table.radius_um > -SMALLEST_UM) & (table.radius_um < SMALLEST_UM))
    if not rows.size:
        return None
    message = f"{rows_by_kind(table.kinds[rows])} of radius 0 {table.named(rows)}"
    return Finding("zero-radius", "error", _first_line(table, rows), message, _radius_remedy(table, rows))


def _negative_radius(table: SwcTable) -> Finding | None:
    rows = np.flatnonzero(np.isfinite(table.radius_um) & (table.radius_um <= -SMALLEST_UM))
    if not rows.size:
        return None
    message = f"{rows_by_kind(table.kinds[rows])} of negative radius {table.named(rows)}"
    return Finding("negative-radius", "error", _first_line(table, rows), message, _radius_remedy(table, rows))


def _radius_remedy(table: SwcTable, rows: Ints) -> str:
    """What can be done about rows with a bad number, given what else the file has."""
    kinds = np.unique(table.kinds[rows])
    placed = np.isfinite(table.xyz_um[rows]).all()
    root_goes = bool(table.roots.size) and bool(np.isin(table.kinds[table.roots[0]], kinds))
    ways = []
    if len(rows) == 1 and placed and _twin_of(table, int(rows[0])) is not None:
        ways.append('apply the repair "soma radius from its twin"')
    if not root_goes:
        names = ", ".join(f'"{kind_name(k)}"' if kind_name(k) != str(k) else str(int(k)) for k in kinds)
        way = "the axon" if kinds.tolist() == [AXON] else "what is not needed"
        ways.append(f"leave {way} out: omit = [{names}]")
    if placed and np.isin(kinds, table.kinds[table.readable_radius]).any():
        ways.append(f"apply the repair {NEIGHBOURS}")
    ways.append("correct the rows" if ways else "correct the rows; nothing in the file tells what they should be")
    sentence = ", or ".join(ways)
    return f"{sentence[0].upper()}{sentence[1:]}."


def _twin_of(table: SwcTable, row: int) -> int | None:
    """Another soma row in the same place as soma row `row`, with a radius; None if there is none."""
    if row not in table.somata:
        return None
    same = (table.xyz_um[table.somata] == table.xyz_um[row]).all(axis=1) & table.readable_radius[table.somata]
    twins = table.somata[same & (table.somata != row)]
    return int(twins[np.argmax(table.radius_um[twins])]) if twins.size else None


def _child_before_parent(table: SwcTable) -> Finding | None:
    rows = np.flatnonzero(table.parent > np.arange(len(table)))
    if not rows.size:
        return None
    stand = subject(len(rows), "stand before their parents", "stands before its parent")
    message = f"{stand} {table.named(rows)}"
    return Finding(
        "child-before-parent",
        "note",
        _first_line(table, rows),
        message,
        "Nothing to do: the rows are put in order, ids stay.",
    )


_CHECKS: tuple[Callable[[SwcTable], Finding | None], ...] = (
    _duplicate_id,
    _negative_id,
    _missing_parent,
    _self_parent,
    _cycle,
    _no_root,
    _several_roots,
    _not_a_number,
    _not_finite,
    _zero_radius,
    _negative_radius,
    _child_before_parent,
)
