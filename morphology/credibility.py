"""Warnings and notes: rows that make a tree, but may not be the cell that was meant.

The thresholds are common practice, no source.
"""

from __future__ import annotations

from collections.abc import Callable

import numpy as np

from morphology.findings import Finding, counted, subject
from morphology.kind_rows import check_kinds, finding_at
from morphology.kinds import AXON, SOMA
from morphology.soma_rows import check_soma
from morphology.structure import Ints
from morphology.table import SwcTable

THICK_UM = 20.0
CODE_RADIUS_UM = 10.0
LARGEST_CELL_UM = 20_000.0
SMALLEST_CELL_UM = 5.0
LONG_EDGE_UM = 100.0
FAR_UM = 5e5
TWIG_UM = 3.0


def check_credibility(table: SwcTable) -> list[Finding]:
    """The warnings and notes of a table with at least one row."""
    with np.errstate(all="ignore"):
        findings = [check(table) for check in _CHECKS]
        return check_kinds(table) + [f for f in findings if f is not None] + check_soma(table)


def side_twigs(table: SwcTable) -> Ints:
    """Rows of one-row tips shorter than 3 µm on a dendrite that goes on beyond them."""
    parent, above = table.parent, np.maximum(table.parent, 0)
    tip = (table.child_count == 0) & (parent >= 0)
    goes_on = np.zeros(len(table), dtype=bool)
    goes_on[parent[(table.child_count > 0) & (parent >= 0)]] = True
    dendrite = ~np.isin(table.kinds, (SOMA, AXON))
    short = table.edge_length_um < TWIG_UM
    return np.flatnonzero(tip & short & dendrite & dendrite[above] & goes_on[above])


def _neurites(table: SwcTable) -> Ints:
    return np.flatnonzero((table.kinds != SOMA) & table.readable_radius)


def _zero_length(table: SwcTable) -> Finding | None:
    linked = (table.parent >= 0) & (table.parent != np.arange(len(table)))
    rows = np.flatnonzero(linked & (table.edge_length_um == 0))
    if not rows.size:
        return None
    message = f"{subject(len(rows), 'lie', 'lies')} where the parent lies {table.named(rows)}"
    return finding_at(
        table,
        "zero-length-edge",
        "note",
        rows,
        message,
        "Nothing to do: two rows in one place are one electrical point.",
    )


def _constant_radius(table: SwcTable) -> Finding | None:
    rows = _neurites(table)
    values = np.unique(table.radius_um[rows])
    if len(rows) < 10:
        return None
    if len(values) == 1:
        message = f"all {len(rows):,} neurite rows have the radius {values[0]:g} µm: it was not measured"
        return finding_at(
            table,
            "constant-radius",
            "warning",
            rows,
            message,
            "Do not trust areas and resistances of this cell; find a reconstruction with measured radii.",
        )
    if len(values) <= 25 and len(rows) >= 20 * len(values):
        message = f"the radii of {len(rows):,} neurite rows have {len(values)} values, the microscope's step"
        return finding_at(
            table,
            "radius-quantised",
            "note",
            rows,
            message,
            "Nothing to do; thin neurites are known no better than one step.",
        )
    return None


def _thick(table: SwcTable) -> Finding | None:
    rows = _neurites(table)
    if not rows.size:
        return None
    if np.median(table.radius_um[rows]) > CODE_RADIUS_UM:
        half = np.median(table.radius_um[rows])
        message = f"half of the neurite rows have a radius of {half:g} or more: codes or another unit, not µm"
        return finding_at(
            table,
            "radius-codes",
            "warning",
            rows,
            message,
            "Find out what the sixth column holds; radii must be in µm.",
        )
    rows = rows[table.radius_um[rows] > THICK_UM]
    if not rows.size:
        return None
    message = (
        f"{subject(len(rows), 'have', 'has', 'neurite row')} a radius above {THICK_UM:g} µm, "
        f"up to {table.radius_um[rows].max():g} {table.named(rows)}"
    )
    remedy = "Check the unit, and whether a soma hides among them: its row should be of kind 1."
    return finding_at(table, "radius-large", "warning", rows, message, remedy)


def _units(table: SwcTable) -> Finding | None:
    xyz = table.xyz_um[np.isfinite(table.xyz_um).all(axis=1)]
    if not len(xyz):
        return None
    extent, reach = float(np.ptp(xyz, axis=0).max()), float(np.abs(xyz).max())
    edges = table.edge_length_um[table.parent >= 0]
    edge = float(np.nanmedian(edges)) if np.isfinite(edges).any() else 0.0
    doubts = []
    if extent > LARGEST_CELL_UM:
        doubts.append(f"the cell is {extent / 1000:.4g} mm across")
    if len(table) >= 50 and extent < SMALLEST_CELL_UM:
        doubts.append(f"the cell of {counted(len(table))} is {extent:.3g} µm across")
    if len(table) >= 10 and edge > LONG_EDGE_UM:
        doubts.append(f"half of the edges are longer than {edge:.4g} µm")
    if reach > FAR_UM:
        doubts.append(f"a coordinate is {reach:.4g} µm")
    if not doubts:
        return None
    message = "lengths are not credible in µm: " + ", ".join(doubts)
    return Finding(
        "units",
        "warning",
        None,
        message,
        "Check the unit (nanometres, voxels, millimetres) and scale the file.",
    )


def _spines(table: SwcTable) -> Finding | None:
    rows, tips = side_twigs(table), int((table.child_count == 0).sum())
    if len(rows) < 20 or len(rows) < 0.1 * tips:
        return None
    message = (
        f"{len(rows):,} of {tips:,} tips are one-row side twigs shorter than {TWIG_UM:g} µm "
        f"{table.named(rows)}: spines drawn into the tree"
    )
    remedy = 'Apply the repair "remove side twigs" and give spines as membrane area, or leave spine_factor at 1.'
    return finding_at(table, "spines-in-tree", "warning", rows, message, remedy)


_CHECKS: tuple[Callable[[SwcTable], Finding | None], ...] = (
    _zero_length,
    _constant_radius,
    _thick,
    _units,
    _spines,
)
