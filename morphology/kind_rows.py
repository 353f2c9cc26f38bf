"""What is odd about kinds. None of it changes the cable; it matters where zones choose by kind."""

from __future__ import annotations

import numpy as np

from morphology.findings import Finding, counted, listed, rows_by_kind, subject
from morphology.kinds import APICAL, AXON, BASAL, SOMA
from morphology.structure import Ints
from morphology.table import SwcTable

FORK, END, GLIA = 5, 6, 7  # codes of older files; FORK and END mark points, not neurites
MANY_CHILDREN = 8


def check_kinds(table: SwcTable) -> list[Finding]:
    """The warnings and notes on kinds of a table with at least one row."""
    checks = (_kinds, _no_dendrite, _many_children, _axon_from_dendrite, _mixed_kinds)
    return [f for f in (check(table) for check in checks) if f is not None]


def finding_at(table: SwcTable, code: str, severity: str, rows: Ints, message: str, remedy: str) -> Finding:
    """A finding on some rows, with the line of the first of them."""
    line = int(table.lines[rows].min()) if rows.size else None
    return Finding(code, severity, line, message, remedy)


def _kinds(table: SwcTable) -> Finding | None:
    every = np.arange(len(table))
    if (table.kinds == 0).all():
        message = "every row is of kind 0: soma, axon and dendrites are not told apart"
        return finding_at(
            table,
            "all-kinds-0",
            "warning",
            every,
            message,
            "Give the kinds 1 soma, 2 axon, 3 basal, 4 apical, if zones are to use them.",
        )
    if (table.kinds == GLIA).all():
        message = "every row is of kind 7: this is glia, not a neuron"
        return finding_at(
            table,
            "glia",
            "warning",
            every,
            message,
            "Use it only if the passive cable of a glial cell is what you want.",
        )
    rows = np.flatnonzero(~np.isin(table.kinds, (SOMA, AXON, BASAL, APICAL)))
    if not rows.size:
        return None
    codes = np.unique(table.kinds[rows])
    harmless = bool(np.isin(codes, (0, FORK, END)).all())
    message = f"{counted(len(rows))} of kinds without a fixed meaning ({listed(codes, 8)})"
    if np.isin(codes, (FORK, END)).any():
        message += "; 5 and 6 mark fork and end points in older files"
    remedy = "Nothing to do unless zones choose by kind: the number of the kind may be used there."
    return finding_at(table, "unknown-kind", "note" if harmless else "warning", rows, message, remedy)


def _no_dendrite(table: SwcTable) -> Finding | None:
    rows = np.flatnonzero(table.kinds == AXON)
    if not rows.size or not np.isin(table.kinds, (SOMA, AXON)).all():
        return None
    message = "every neurite is called axon: the cell has no dendrite"
    return finding_at(
        table,
        "no-dendrite",
        "warning",
        rows,
        message,
        "Check whether the dendrites were given the wrong kind.",
    )


def _many_children(table: SwcTable) -> Finding | None:
    rows = np.flatnonzero((table.child_count > MANY_CHILDREN) & (table.kinds != SOMA))
    if not rows.size:
        return None
    n, most = len(rows), table.child_count[rows].max()
    message = f"{subject(n, 'have', 'has', 'neurite row')} up to {most} children {table.named(rows)}"
    return finding_at(
        table,
        "many-children",
        "note",
        rows,
        message,
        "Check whether a soma hides there; branch points mostly have two.",
    )


def _axon_from_dendrite(table: SwcTable) -> Finding | None:
    above = np.where(table.parent >= 0, table.kinds[np.maximum(table.parent, 0)], -1)
    rows = np.flatnonzero((table.kinds == AXON) & np.isin(above, (BASAL, APICAL)))
    if not rows.size:
        return None
    message = f"an axon leaves a dendrite in {counted(len(rows), 'place')} {table.named(rows)}"
    return finding_at(table, "axon-from-dendrite", "note", rows, message, "Nothing to do if this is so in the cell.")


def _mixed_kinds(table: SwcTable) -> Finding | None:
    above = np.where(table.parent >= 0, table.kinds[np.maximum(table.parent, 0)], -1)
    here = table.kinds
    swapped = ((here == APICAL) & (above == BASAL)) | ((here == BASAL) & (above == APICAL))
    rows = np.flatnonzero(swapped | (np.isin(here, (BASAL, APICAL)) & (above == AXON)))
    if not rows.size:
        return None
    message = f"basal, apical and axon are mixed on a path at {rows_by_kind(here[rows])} {table.named(rows)}"
    return finding_at(
        table,
        "mixed-kinds",
        "warning",
        rows,
        message,
        "Correct the kinds if zones choose by kind; the cable itself is not affected.",
    )
