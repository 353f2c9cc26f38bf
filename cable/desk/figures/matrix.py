"""The correlations of all sites drawn: one cell a pair, coloured and, where there is room, in figures."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from matplotlib.cm import ScalarMappable
from matplotlib.colors import Normalize
from matplotlib.figure import Figure
from numpy.typing import NDArray

from cable.desk.figures.style import COLUMN_MM, GREY, INK, PAGE_MM, colour_map, figure
from cable.desk.messages import shown

CELL_MM = 11.0  # the largest; smaller where a page would not hold all sites
NAMES_MM, BESIDE_MM, ABOVE_MM, BELOW_MM = 26.0, 17.0, 13.0, 20.0
FIGURES_FROM_MM, NAME_MM = 6.5, 3.0  # the cell that holds a figure, the height of a name
PALE_FROM = 0.62  # of the colours: black on these, white on darker ones


def draw_matrix(names: Sequence[str], matrix: NDArray[np.float64], title: str = "") -> Figure:
    """Correlations (S, S) between the sites `names`; call it inside `styled`."""
    count = len(names)
    side = min(CELL_MM * max(count, 2), PAGE_MM - NAMES_MM - BESIDE_MM)
    cell_mm = side / count
    width, height = max(NAMES_MM + side + BESIDE_MM, COLUMN_MM), ABOVE_MM + side + BELOW_MM
    page = figure(width, height)
    axes = page.add_axes((NAMES_MM / width, BELOW_MM / height, side / width, side / height))
    lowest = float(np.nanmin(matrix)) if np.isfinite(matrix).any() else 0.0
    norm = Normalize(min(lowest, 0.99), 1.0)
    axes.imshow(np.ma.masked_invalid(matrix), cmap=colour_map(), norm=norm, interpolation="nearest")
    if cell_mm >= FIGURES_FROM_MM:
        for (row, column), value in np.ndenumerate(matrix):
            if np.isfinite(value):
                ink = INK if norm(value) > PALE_FROM else "white"
                text = f"{round(value, 2) + 0.0:.2f}".replace("-", "−")
                axes.text(column, row, text, ha="center", va="center", fontsize=6.0, color=ink)
    every = max(1, int(np.ceil(NAME_MM / cell_mm)))
    ticks = range(0, count, every)
    labels = [shown(names[k], 18) for k in ticks]
    axes.set_xticks(ticks, labels, rotation=45, ha="right", rotation_mode="anchor")
    axes.set_yticks(ticks, labels)
    axes.tick_params(length=0)
    for spine in axes.spines.values():
        spine.set_visible(False)
    bar = page.add_axes(((NAMES_MM + side + 3.0) / width, BELOW_MM / height, 2.5 / width, min(side, 40.0) / height))
    page.colorbar(ScalarMappable(norm, colour_map()), cax=bar)
    page.text(2.0 / width, 1 - 1.5 / height, shown(title, 52), va="top", fontsize=8, weight="bold")
    page.text(2.0 / width, 1 - 6.0 / height, "correlations of all sites", va="top", fontsize=6.5, color=GREY)
    return page
