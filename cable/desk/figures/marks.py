"""Sites in a drawing of the cell: where they are, and the rings that mark them."""

from __future__ import annotations

from collections.abc import Sequence
from typing import TYPE_CHECKING

import numpy as np
from matplotlib.axes import Axes
from matplotlib.patheffects import withStroke
from numpy.typing import NDArray

from cable.desk.figures.labels import Mark
from cable.desk.figures.style import INK
from cable.desk.site_table import point_of_site
from morphology import CellTree, kind_name
from morphology.kinds import SOMA

if TYPE_CHECKING:
    from cable.noise.model import CableModel


def site_marks(model: CableModel, where: NDArray[np.float64], upright: bool = False) -> list[Mark]:
    """The sites among points that are drawn at `where` (N, 2).

    Args:
        upright: a cylinder is drawn straight up or down over the place of its far point, not from its near one.
    """
    marks = []
    for name in model.site_names:
        row = point_of_site(model, name)
        if row is not None:
            x, y = where[row]
        else:
            place = model.site_places[name]
            start, end = where[model.tree.parent[place.row]], where[place.row]
            x, y = start + place.fraction * (end - start)
            x = end[0] if upright else x
        marks.append(Mark(name, float(x), float(y)))
    return marks


def kind_marks(tree: CellTree, where: NDArray[np.float64]) -> list[Mark]:
    """The kinds of neurite, named once each at their farthest point from the soma; none where there is one kind."""
    kinds = [k for k in np.unique(tree.shape.kind[tree.shape.length_um > 0]).tolist() if k != SOMA]
    marks = []
    for kind in kinds[:6] if len(kinds) > 1 else []:
        rows = np.flatnonzero((tree.shape.kind == kind) & (tree.shape.length_um > 0))
        away = np.linalg.norm(where[rows] - where[tree.shape.soma], axis=1)
        x, y = where[rows[np.argmax(away)]]
        word = kind_name(kind) if kind_name(kind) != str(kind) else f"kind {kind}"
        marks.append(Mark(word, float(x), float(y), quiet=True))
    return marks


def ring(axes: Axes, marks: Sequence[Mark]) -> None:
    """A ring around every mark, readable on any colour."""
    axes.plot(
        [m.x for m in marks],
        [m.y for m in marks],
        linestyle="none",
        marker="o",
        markersize=3.6,
        markerfacecolor="none",
        markeredgecolor=INK,
        markeredgewidth=0.7,
        path_effects=[withStroke(linewidth=1.8, foreground="white")],
        zorder=10,
    )
