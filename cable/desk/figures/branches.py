"""The cell as a diagram of its branches: path distance is height, every unbranched run has a place of its own.

Where a drawing to scale hides one dendrite behind another, nothing overlaps here. Apical dendrites go up and all
others down; where there is only one sort, it goes up.
"""

from __future__ import annotations

from collections.abc import Sequence
from typing import TYPE_CHECKING

import numpy as np
from matplotlib.axes import Axes
from matplotlib.cm import ScalarMappable
from matplotlib.collections import LineCollection
from matplotlib.colors import Normalize
from matplotlib.figure import Figure
from matplotlib.ticker import FuncFormatter
from numpy.typing import NDArray

from cable.desk.figures.labels import place_names
from cable.desk.figures.marks import kind_marks, ring, site_marks
from cable.desk.figures.style import (
    COLUMN_MM,
    GREY,
    PAGE_MM,
    RASTER_ABOVE,
    bar_label,
    colour_map,
    figure,
    scale_of,
)
from cable.desk.messages import shown
from cable.desk.quantities import Quantity
from morphology import CellTree
from morphology.kinds import APICAL

if TYPE_CHECKING:
    from cable.noise.fluctuations import Fluctuations
    from cable.noise.model import CableModel

Floats = NDArray[np.float64]
PANEL_MM, BESIDE_MM, BEFORE_MM, TITLE_MM, BELOW_MM = 92.0, 19.0, 13.0, 8.0, 7.0
STEPS = 150  # a piece of one colour is at most the height of the diagram over this
WIDEST_PT, THINNEST_PT = 3.0, 0.5


def places(tree: CellTree) -> Floats:
    """(N, 2) where every point stands: across, in places of tips, and height, µm (below 0 for what goes down)."""
    children: list[list[int]] = [[] for _ in range(len(tree))]
    for row, parent in enumerate(tree.parent.tolist()):
        if parent >= 0:
            children[parent].append(row)
    reach = tree.path_um.copy()
    for row in range(len(tree) - 1, 0, -1):
        reach[tree.parent[row]] = max(reach[tree.parent[row]], reach[row])
    up = _goes_up(tree)
    across, used = np.zeros(len(tree)), {True: 0, False: 0}
    first, last = np.full(len(tree), np.inf), np.full(len(tree), -np.inf)
    todo = [(row, bool(up[row]), False) for row in reversed(children[0])]
    while todo:
        row, upward, turned = todo.pop()
        if not children[row]:
            across[row], used[upward] = used[upward], used[upward] + 1
        # the longest branch now on the right, now on the left, so that a tree does not lean
        turned ^= len(children[row]) > 1
        inner = sorted(children[row], key=lambda child: reach[child], reverse=turned)
        todo += [(child, upward, turned) for child in inner]
    for row in range(len(tree) - 1, 0, -1):
        if children[row]:
            across[row] = 0.5 * (first[row] + last[row])
        parent = tree.parent[row]
        first[parent], last[parent] = min(first[parent], across[row]), max(last[parent], across[row])
    for sort in (True, False):
        across[up == sort] -= 0.5 * (used[sort] - 1)
    stems = across[children[0]] if children[0] else np.zeros(1)
    across[0] = 0.5 * (stems.min() + stems.max())
    return np.column_stack([across, np.where(up, tree.path_um, -tree.path_um)])


def _goes_up(tree: CellTree) -> NDArray[np.bool_]:
    """(N,) whether a point's stem is drawn upwards."""
    apical = tree.kinds == APICAL
    for row in range(1, len(tree)):
        parent = tree.parent[row]
        if parent > 0:
            apical[row] = apical[parent]  # a stem stays whole whatever its points are called
    stems = tree.parent == 0
    if not apical[stems].any() or apical[stems].all():
        return np.ones(len(tree), dtype=bool)
    return apical


def draw_branches(field: Fluctuations, shown_quantities: Sequence[Quantity], title: str = "") -> Figure:
    """A diagram of the branches for each quantity; call it inside `styled`."""
    columns = min(2, len(shown_quantities))
    rows = -(-len(shown_quantities) // columns)
    width = PAGE_MM if columns > 1 else COLUMN_MM
    height = TITLE_MM + rows * (PANEL_MM + BELOW_MM)
    wide = width / columns - BEFORE_MM - BESIDE_MM
    page = figure(width, height)
    where = places(field.model.tree)
    for i, quantity in enumerate(shown_quantities):
        row, column = divmod(i, columns)
        left = column * width / columns + BEFORE_MM
        bottom = height - TITLE_MM - (row + 1) * PANEL_MM - row * BELOW_MM
        axes = page.add_axes((left / width, bottom / height, wide / width, PANEL_MM / height))
        bar = page.add_axes(((left + wide + 2.0) / width, (bottom + 25.0) / height, 2.2 / width, 42.0 / height))
        norm = _draw(axes, field.model, where, quantity.values(field))
        page.colorbar(ScalarMappable(norm, colour_map()), cax=bar)
        bar_label(bar, quantity.label)
    page.text(2.0 / width, 1 - 1.5 / height, shown(title, int(0.72 * width)), va="top", fontsize=8, weight="bold")
    told = "Diagram of the branches: widths follow diameters, horizontal lines only join."
    page.text(2.0 / width, 1.5 / height, told, va="bottom", fontsize=5.5, color=GREY)
    return page


def _draw(axes: Axes, model: CableModel, where: Floats, values: Floats) -> Normalize:
    tree, norm = model.tree, scale_of(values)
    edge = np.arange(1, len(tree))
    parent = tree.parent[edge]
    step = max(float(np.ptp(where[:, 1])) / STEPS, 1e-9)
    count = np.maximum(1, np.ceil(np.abs(where[edge, 1] - where[parent, 1]) / step)).astype(int)
    one = np.repeat(np.arange(len(edge)), count)
    number = np.arange(len(one)) - np.repeat(np.cumsum(count) - count, count)
    per = 1.0 / np.repeat(count, count)
    x, low, high = where[edge[one], 0], where[parent[one], 1], where[edge[one], 1]
    branching = np.bincount(tree.parent[1:], minlength=len(tree))
    lap = np.where((branching[edge[one]] == 0) & (number == count[one] - 1), 1.0, 1.3)  # no seams between pieces
    ends = np.stack(
        [
            np.column_stack([x, low + number * per * (high - low)]),
            np.column_stack([x, low + (number + lap) * per * (high - low)]),
        ],
        axis=1,
    )
    shade = values[parent[one]] + (number + 0.5) * per * (values[edge[one]] - values[parent[one]])
    radius = tree.radius_um[edge]
    widths = np.clip(WIDEST_PT * radius / max(float(radius.max(initial=1.0)), 1e-9), THINNEST_PT, None)
    many = len(ends) > RASTER_ABOVE
    joins = np.flatnonzero(where[edge, 0] != where[parent, 0])
    from_, to = where[parent[joins]], np.column_stack([where[edge[joins], 0], where[parent[joins], 1]])
    colours = colour_map()(norm(values[parent[joins]]))
    axes.add_collection(
        LineCollection(list(np.stack([from_, to], axis=1)), colors=colours, linewidths=THINNEST_PT, rasterized=many)
    )
    axes.add_collection(
        LineCollection(
            list(ends), colors=colour_map()(norm(shade)), linewidths=widths[one], capstyle="butt", rasterized=many
        )
    )
    _mark_sites(axes, model, where, np.vstack([where, 0.5 * (from_ + to), ends.mean(axis=1)]))
    return norm


def _mark_sites(axes: Axes, model: CableModel, where: Floats, drawing: Floats) -> None:
    spread = max(float(np.ptp(where[:, 0])), 1.0)
    tall = max(float(np.ptp(where[:, 1])), 1.0)
    axes.set_xlim(where[:, 0].min() - 0.05 * spread, where[:, 0].max() + 0.05 * spread)
    axes.set_ylim(where[:, 1].min() - 0.04 * tall, where[:, 1].max() + 0.04 * tall)
    marks = site_marks(model, where, upright=True)
    ring(axes, marks)
    place_names(axes, [*marks, *kind_marks(model.tree, where)], drawing)
    axes.spines["bottom"].set_visible(False)
    axes.set_xticks([])
    axes.yaxis.set_major_formatter(FuncFormatter(lambda value, _: f"{abs(value):g}"))
    axes.set_ylabel("path distance (µm)")
