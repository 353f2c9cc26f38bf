"""Profiles from the soma to a site: mean with its SD, and one quantity below, over the rest of the cell."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np
from matplotlib.axes import Axes
from matplotlib.collections import LineCollection
from matplotlib.figure import Figure
from matplotlib.ticker import MaxNLocator
from numpy.typing import NDArray

from cable.desk.figures.labels import Mark, place_names
from cable.desk.figures.style import COLUMN_MM, GREY, INK, PALE, RASTER_ABOVE, figure
from cable.desk.messages import shown
from cable.desk.path import WayToSite, distance_from_soma, distance_of_site, sites_on_way, way_table
from cable.desk.quantities import LABELS, Quantity
from cable.desk.site_table import sites_table

if TYPE_CHECKING:
    from cable.noise.fluctuations import Fluctuations

Floats = NDArray[np.float64]
HEIGHT_MM, LEFT = 92.0, 0.17
BAND = "#dbe4ea"


def draw_along(field: Fluctuations, way: WayToSite, quantity: Quantity, title: str = "") -> Figure:
    """The profile of mean ± SD and of one quantity along a way; call it inside `styled`."""
    page = figure(COLUMN_MM, HEIGHT_MM)
    upper = page.add_axes((LEFT, 0.55, 0.97 - LEFT, 0.36))
    lower = page.add_axes((LEFT, 0.115, 0.97 - LEFT, 0.36), sharex=upper)
    table = way_table(field, way)
    x = np.asarray(table.columns["from_soma_um"], dtype=float)
    mean, sd = (np.asarray(table.columns[key], dtype=float) for key in ("mean_mV", "sd_mV"))
    distance = distance_from_soma(field.model.tree)
    _rest(upper, field, distance, field.mean_mV)
    upper.fill_between(x, mean - sd, mean + sd, color=BAND, linewidth=0, zorder=2)
    upper.plot(x, mean, color=INK, linewidth=1.5, zorder=4)
    threshold = field.model.threshold_mV
    if threshold is not None:
        upper.axhline(threshold, color=GREY, linewidth=0.7, linestyle=(0, (4, 3)), zorder=1)
        place = ("axes fraction", "data")
        upper.annotate("threshold", (0, threshold), (3, 2), place, "offset points", fontsize=6, color=GREY)
    values = quantity.of_table(table)
    _rest(lower, field, distance, quantity.values(field))
    lower.plot(x, values, color=INK, linewidth=1.5, zorder=4)
    lower.set_xlim(0.0, float(distance.max()) * 1.02 or 1.0)
    _limits(upper, [mean - sd, mean + sd, field.mean_mV, np.array([] if threshold is None else [threshold])])
    _limits(lower, [values, quantity.values(field)])
    _mark_sites(upper, lower, field, way, quantity, x, values)
    beyond = ", next order" if "next order" in quantity.label else ""
    upper.set_ylabel(f"mean ± SD{beyond} (mV)")
    lower.set_ylabel(shown(quantity.label, 60) if quantity.word != "mean" or beyond else LABELS["mean"])
    lower.set_xlabel("distance from the soma along the tree (µm)")
    upper.tick_params(labelbottom=False)
    for axes in (upper, lower):
        axes.yaxis.set_label_coords(-0.145, 0.5)
        axes.yaxis.set_major_locator(MaxNLocator(6, steps=[1, 2, 5, 10]))
    page.text(0.02, 0.985, shown(title, 52), va="top", fontsize=8, weight="bold")
    page.text(
        0.02,
        0.94,
        f"bold: from the soma to {shown(way.site, 30)}; grey: every other branch",
        va="top",
        fontsize=6,
        color=GREY,
    )
    return page


def _rest(axes: Axes, field: Fluctuations, distance: Floats, values: Floats) -> None:
    """Every edge of the cell, pale."""
    parent = field.model.tree.parent
    edges = np.flatnonzero(parent >= 0)
    points = np.stack([distance, values], axis=1)
    lines = np.stack([points[parent[edges]], points[edges]], axis=1)
    axes.add_collection(
        LineCollection(list(lines), colors=PALE, linewidths=0.5, rasterized=len(edges) > RASTER_ABOVE, zorder=3),
        autolim=False,
    )


def _limits(axes: Axes, shown_values: list[Floats]) -> None:
    every = np.concatenate([np.asarray(v, dtype=float).ravel() for v in shown_values])
    every = every[np.isfinite(every)]
    low, high = (float(every.min()), float(every.max())) if every.size else (0.0, 1.0)
    room = 0.06 * (high - low) or 0.5
    axes.set_ylim(low - 2 * room, high + 2 * room)


def _mark_sites(
    upper: Axes,
    lower: Axes,
    field: Fluctuations,
    way: WayToSite,
    quantity: Quantity,
    x: Floats,
    values: Floats,
) -> None:
    """Full dots on the way, rings elsewhere, each with its name."""
    model, table = field.model, sites_table(field)
    on_way = sites_on_way(model, way)
    means, shown_values = np.asarray(table.columns["mean_mV"], dtype=float), quantity.of_table(table)
    marks = []
    for name, mean, value in zip(model.site_names, means, shown_values, strict=True):
        at = distance_of_site(model, name)
        face = INK if name in on_way else "white"
        for axes, y in ((upper, mean), (lower, value)):
            axes.plot(
                [at],
                [y],
                marker="o",
                markersize=3.6,
                markerfacecolor=face,
                markeredgecolor=INK,
                markeredgewidth=0.7,
                zorder=8,
                clip_on=False,
            )
        if np.isfinite(value):
            marks.append(Mark(name, at, float(value)))
    dense = np.linspace(x[0], x[-1], 300)
    line = np.column_stack([dense, np.interp(dense, x, values)])
    cell = np.column_stack([distance_from_soma(model.tree), quantity.values(field)])
    cell = cell[np.isfinite(cell).all(axis=1)]
    place_names(lower, marks, np.vstack([line, cell]), avoid=4.0)
