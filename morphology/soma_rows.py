"""What the soma rows of a table are: none, a sphere said in one, two or three rows, an outline, a chain."""

from __future__ import annotations

import numpy as np

from morphology.findings import Finding, listed, subject
from morphology.kinds import SOMA
from morphology.shape import SIDE_POINT_SLACK, SURFACE_SLACK
from morphology.structure import Floats, Ints
from morphology.table import SwcTable

TINY_UM = 1.0
FROM_OUTLINE = "soma from outline"
FORMS = ("none", "one", "one place", "three points", "outline", "chain")


def soma_form(table: SwcTable) -> str:
    """Which of FORMS the soma has.

    An outline is a ring of six or more rows drawn with a thin pen: the radii are small beside the distances
    from the middle, and no row lies near the middle. A stack of discs is a chain.
    """
    rows = table.somata
    if len(rows) < 2:
        return "one" if len(rows) else "none"
    xyz, radius = table.xyz_um[rows], table.radius_um[rows]
    if (xyz == xyz[0]).all():
        return "one place"
    offset = np.linalg.norm(xyz - xyz[0], axis=1)
    if (
        len(rows) == 3
        and (table.parent[rows[1:]] == rows[0]).all()
        and np.allclose(offset[1:], radius.max(), rtol=SIDE_POINT_SLACK)
        and np.allclose(radius[1:], radius[0], rtol=SIDE_POINT_SLACK)
    ):
        return "three points"
    distance = np.linalg.norm(xyz - xyz.mean(axis=0), axis=1)
    ring = distance.min() > 0.3 * distance.mean() and np.median(radius) < 0.25 * distance.mean()
    return "outline" if len(rows) >= 6 and ring else "chain"


def inside_soma(table: SwcTable) -> Ints:
    """Rows off the soma which, with all rows between, lie inside the soma's surface."""
    form, rows = soma_form(table), table.somata
    if form in ("none", "outline"):
        return np.empty(0, dtype=np.int64)
    owner = np.where(table.kinds == SOMA, np.arange(len(table)), -1)
    child = np.flatnonzero(table.parent >= 0)
    pairs = np.stack([np.r_[child, table.parent[child]], np.r_[table.parent[child], child]])
    inside: list[Ints] = []
    while True:
        inner, outer = pairs[:, (owner[pairs[0]] >= 0) & (owner[pairs[1]] < 0)]
        middle = table.xyz_um[owner[inner]] if form == "chain" else table.xyz_um[rows[0]]
        radius = table.radius_um[owner[inner]] if form == "chain" else table.radius_um[rows].max()
        within = np.linalg.norm(table.xyz_um[outer] - middle, axis=1) <= radius * (1 + SURFACE_SLACK)
        if not within.any():
            return np.unique(np.concatenate(inside)) if inside else np.empty(0, dtype=np.int64)
        owner[outer[within]] = owner[inner[within]]
        inside.append(outer[within])


def soma_parts(table: SwcTable) -> int:
    """How many parts the soma rows are in: rows whose parent is no soma row."""
    above = table.parent[table.somata]
    return int(((above < 0) | (table.kinds[np.maximum(above, 0)] != SOMA)).sum())


def sphere_from_outline(table: SwcTable) -> tuple[Floats, float]:
    """Centre (3,) and radius, µm, of the sphere that stands for an outline or a stack of discs.

    The centre is the mean of the soma rows and the radius their mean distance from it, each row weighted
    by its share of the line so that it does not matter where the line was sampled densely. Rows of a
    stack count with the rim of their disc.
    """
    rows = table.somata
    place = np.full(len(table), -1)
    place[rows] = np.arange(len(rows))
    lower = np.flatnonzero((table.parent[rows] >= 0) & (place[np.maximum(table.parent[rows], 0)] >= 0))
    upper = place[table.parent[rows[lower]]]
    children = np.bincount(upper, minlength=len(rows))
    if soma_form(table) == "outline" and children.max(initial=0) <= 1:
        top = np.setdiff1d(np.arange(len(rows)), lower)[:1]  # close the ring from its last row to its first
        lower, upper = np.r_[lower, np.flatnonzero(children == 0)[:1]], np.r_[upper, top]
    step = np.linalg.norm(table.xyz_um[rows[lower]] - table.xyz_um[rows[upper]], axis=1)
    weight = np.bincount(lower, step, len(rows)) + np.bincount(upper, step, len(rows))
    weight = weight / weight.sum() if weight.sum() > 0 else np.full(len(rows), 1 / len(rows))
    centre = weight @ table.xyz_um[rows]
    distance = np.linalg.norm(table.xyz_um[rows] - centre, axis=1)
    return centre, float(weight @ np.hypot(distance, table.radius_um[rows]))


def check_soma(table: SwcTable) -> list[Finding]:
    """What is odd about the soma."""
    rows, form = table.somata, soma_form(table)
    if form == "none":
        message = "no row is of kind 1: the cell has no soma"
        return [
            Finding(
                "no-soma",
                "warning",
                None,
                message,
                'The root stands for the site "soma"; give the soma\'s row the kind 1 if there is one.',
            )
        ]
    line, ids = int(table.lines[rows].min()), listed(table.ids[rows])
    findings = []
    if form == "one place":
        message = f"{len(rows)} soma rows lie in one place (ids {ids})"
        findings.append(
            Finding(
                "soma-two-rows-one-place",
                "note",
                line,
                message,
                "Nothing to do: they are one sphere of the largest radius.",
            )
        )
    elif form == "three points":
        message = f"the soma is a centre and two side rows (ids {ids}), the three-row way of writing a sphere"
        findings.append(
            Finding(
                "soma-three-point",
                "note",
                line,
                message,
                "Nothing to do: it is one sphere; the side rows are no cable.",
            )
        )
    elif form == "outline":
        pen = np.median(table.radius_um[rows])
        message = f"{len(rows)} soma rows of radius {pen:g} µm trace its outline (ids {ids}): a thin ring"
        findings.append(
            Finding(
                "soma-outline",
                "warning",
                line,
                message,
                f'Apply the repair "{FROM_OUTLINE}", which puts a sphere in its place.',
            )
        )
    elif form == "chain":
        message = f"the soma is a chain of {len(rows)} rows (ids {ids})"
        findings.append(Finding("soma-chain", "note", line, message, "Nothing to do: it is taken as a run of frusta."))
    parts = soma_parts(table)
    if parts > 1:
        message = f"the soma rows are in {parts} parts which do not touch (ids {ids})"
        findings.append(
            Finding(
                "soma-in-parts",
                "warning",
                line,
                message,
                "Check the kinds: a cell has one soma, and stray rows of kind 1 change the answer.",
            )
        )
    largest = np.nanmax(table.radius_um[rows], initial=0.0)
    if form != "outline" and 0 < largest < TINY_UM:
        message = f"the soma's radius is {largest:g} µm, which is not credible"
        findings.append(
            Finding(
                "soma-tiny",
                "warning",
                line,
                message,
                "Give the soma its measured size, or the cell's resistance will be too high.",
            )
        )
    return findings + _inside(table)


def _inside(table: SwcTable) -> list[Finding]:
    rows = inside_soma(table)
    if not rows.size:
        return []
    message = f"{subject(len(rows), 'lie', 'lies', 'neurite row')} inside the soma {table.named(rows)}"
    remedy = "Nothing to do: they are electrically joined to it, and cable begins at its surface."
    return [Finding("point-inside-soma", "note", int(table.lines[rows].min()), message, remedy)]
