"""The cell drawn to scale with one quantity in colour, a panel each."""

from __future__ import annotations

import textwrap
from collections.abc import Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np
from matplotlib.axes import Axes
from matplotlib.cm import ScalarMappable
from matplotlib.collections import LineCollection
from matplotlib.colors import Normalize
from matplotlib.figure import Figure
from matplotlib.patches import Circle
from numpy.typing import NDArray

from cable.desk.figures.labels import place_names
from cable.desk.figures.marks import kind_marks, ring, site_marks
from cable.desk.figures.projection import PLANES, TURNED, bounds, cut, flat_xy, flattest_plane
from cable.desk.figures.style import (
    COLUMN_MM,
    GREY,
    INK,
    PAGE_MM,
    PT_PER_MM,
    RASTER_ABOVE,
    bar_label,
    colour_map,
    figure,
    scale_of,
)
from cable.desk.messages import shown
from cable.desk.quantities import Quantity
from morphology import CellTree

if TYPE_CHECKING:
    from cable.noise.fluctuations import Fluctuations
    from cable.noise.model import CableModel

Floats = NDArray[np.float64]
THINNEST_PT = 0.5
DISC_IS_MARK_PT = 2.5
EDGE_MM, BAR_MM, BAR_ROOM_MM, GAP_MM = 2.0, 2.2, 14.0, 3.0  # page edge; colour bar; its room; between panels
PAD_MM, FOOT_MM = 3.5, 6.0  # around the cell, for names; under it, for the scale bar
TITLE_MM, CAPTION_MM = 6.0, 3.0
TALLEST_MM, LOWEST_MM = 125.0, 22.0  # of a panel


@dataclass(frozen=True)
class Layout:
    """Where panels stand on the page and how large the cell is drawn.

    Attributes:
        columns: panels side by side.
        mm_per_um: scale of the drawing.
        panel_mm: width and height of the cell's box in a panel.
        page_mm: width and height of the figure.
    """

    columns: int
    mm_per_um: float
    panel_mm: tuple[float, float]
    page_mm: tuple[float, float]


def layout(extent_um: Floats, panels: int, captions: int = 1) -> Layout:
    """The arrangement in which a cell of `extent_um` (2,) is drawn largest on a page."""
    best = None
    for columns in (1, 2) if panels > 1 else (1,):
        rows = -(-panels // columns)
        page_width = PAGE_MM if panels > 1 else COLUMN_MM
        room = (page_width - 2 * EDGE_MM - (columns - 1) * GAP_MM) / columns - BAR_ROOM_MM
        tallest = TALLEST_MM if rows == 1 else 200.0 / rows
        scale = min((room - 2 * PAD_MM) / extent_um[0], (tallest - 2 * PAD_MM - FOOT_MM) / extent_um[1])
        # side by side is easier to compare: one above the other only where it gains a good deal
        weight = scale * (1.6 if columns > 1 else 1.0)
        if best is None or weight > best[0]:
            best = weight, columns, scale, room
    assert best is not None
    _, columns, scale, room = best
    rows = -(-panels // columns)
    wide = float(min(room, max(extent_um[0] * scale + 2 * PAD_MM, 26.0)))
    high = float(max(extent_um[1] * scale + 2 * PAD_MM + FOOT_MM, LOWEST_MM))
    width = columns * (wide + BAR_ROOM_MM) + (columns - 1) * GAP_MM + 2 * EDGE_MM
    height = rows * high + (rows - 1) * GAP_MM + TITLE_MM + captions * CAPTION_MM + 2 * EDGE_MM
    return Layout(columns, float(scale), (wide, high), (max(width, COLUMN_MM), height))


def draw_map(
    field: Fluctuations, shown_quantities: Sequence[Quantity], plane: str | None = None, title: str = ""
) -> Figure:
    """A map of the cell for each quantity; call it inside `styled`.

    Args:
        plane: "xy", "xz" or "yz", the flattest of them where not given; or "flat", the flattest plane of all.
    """
    model = field.model
    chosen = plane or flattest_plane(model.tree)
    low, high = bounds(model.tree, chosen)
    plan = layout(np.maximum(high - low, 1e-6), len(shown_quantities), captions=2)
    caption = _caption(chosen, plan.mm_per_um)
    page = figure(*plan.page_mm)
    per_line = int(plan.page_mm[0] / 0.98)
    for i, quantity in enumerate(shown_quantities):
        axes, bar = _boxes(page, plan, i)
        middle = (low + high) / 2
        half = np.array(plan.panel_mm) / plan.mm_per_um / 2
        foot = FOOT_MM / plan.mm_per_um / 2
        axes.set_xlim(middle[0] - half[0], middle[0] + half[0])
        axes.set_ylim(middle[1] - half[1] - foot, middle[1] + half[1] - foot)
        norm = _draw_cell(axes, model, chosen, quantity.values(field), plan.mm_per_um)
        page.colorbar(ScalarMappable(norm, colour_map()), cax=bar)
        bar_label(bar, quantity.label)
        if i == 0:
            _scale_bar(axes, plan.mm_per_um)
        soma_pt = 2 * _sphere_radius_um(model.tree, model.tree.shape.soma) * plan.mm_per_um * PT_PER_MM
        _name_places(axes, model, chosen, FOOT_MM / plan.mm_per_um, soma_pt >= DISC_IS_MARK_PT)
    edge = EDGE_MM / plan.page_mm[0]
    head = shown(title, int(per_line * 0.72))
    page.text(edge, 1 - EDGE_MM / plan.page_mm[1], head, va="top", fontsize=8, weight="bold")
    wrapped = "\n".join(textwrap.wrap(caption, per_line))
    page.text(edge, EDGE_MM / plan.page_mm[1], wrapped, va="bottom", fontsize=5.5, color=GREY, linespacing=1.3)
    return page


def _boxes(page: Figure, plan: Layout, number: int) -> tuple[Axes, Axes]:
    """The axes of a panel and of its colour bar."""
    (wide, high), (width, height) = plan.panel_mm, plan.page_mm
    row, column = divmod(number, plan.columns)
    left = EDGE_MM + column * (wide + BAR_ROOM_MM + GAP_MM)
    bottom = height - EDGE_MM - TITLE_MM - (row + 1) * high - row * GAP_MM
    axes = page.add_axes((left / width, bottom / height, wide / width, high / height))
    axes.set_axis_off()
    bar_high = min(high * 0.8, 42.0)
    bar_bottom = bottom + (high - bar_high) / 2
    bar = page.add_axes(((left + wide) / width, bar_bottom / height, BAR_MM / width, bar_high / height))
    return axes, bar


def _draw_cell(axes: Axes, model: CableModel, plane: str, values: Floats, mm_per_um: float) -> Normalize:
    tree = model.tree
    norm = scale_of(values)
    pieces = cut(tree, plane, values)
    cable = LineCollection(
        list(pieces.ends_um),
        linewidths=np.maximum(2 * pieces.radius_um * mm_per_um * PT_PER_MM, THINNEST_PT),
        colors=colour_map()(norm(pieces.values)),
        capstyle="round",
        rasterized=len(pieces) > RASTER_ABOVE,
        zorder=2,
    )
    axes.add_collection(cable, autolim=False)
    flat = flat_xy(tree, plane)
    for row in np.flatnonzero(tree.shape.sphere_area_um2 > 0).tolist():
        radius = _sphere_radius_um(tree, row)
        face = colour_map()(norm(values[row]))
        axes.add_patch(Circle(tuple(flat[row]), radius, facecolor=face, edgecolor=INK, linewidth=0.5, zorder=3))
    return norm


def _sphere_radius_um(tree: CellTree, row: int) -> float:
    return float(np.sqrt(tree.shape.sphere_area_um2[row] / (4 * np.pi)))


def _name_places(axes: Axes, model: CableModel, plane: str, foot_um: float, soma_is_mark: bool) -> None:
    """Rings and names for the sites, and the kinds of neurite named once each, at their farthest point.

    A soma drawn large enough is its own mark.
    """
    sites = site_marks(model, flat_xy(model.tree, plane))
    ringed = [m for m in sites if m.name != "soma" or not soma_is_mark]
    ring(axes, ringed)
    tree, flat = model.tree, flat_xy(model.tree, plane)
    (x0, x1), (y0, y1) = axes.get_xlim(), axes.get_ylim()
    turn = np.linspace(0, 2 * np.pi, 24, endpoint=False)
    soma_um = 0.9 * _sphere_radius_um(tree, tree.shape.soma)
    disc = soma_um * np.column_stack([np.cos(turn), np.sin(turn)])
    soma = [flat[tree.shape.soma] + share * disc for share in (0.4, 0.7, 1.0)]
    cable = cut(tree, plane, np.zeros(len(tree))).ends_um.mean(axis=1)
    place_names(axes, [*sites, *kind_marks(tree, flat)], np.vstack([flat, cable, *soma]), (x0, y0 + foot_um, x1, y1))


def round_length(longest_um: float) -> float:
    """The largest of 1, 2, 5 times a power of ten that is at most `longest_um`."""
    power = 10.0 ** np.floor(np.log10(longest_um))
    return float(max(m * power for m in (1, 2, 5) if m * power <= longest_um * (1 + 1e-9)))


def _scale_bar(axes: Axes, mm_per_um: float) -> None:
    (x0, _), (y0, _) = axes.get_xlim(), axes.get_ylim()
    length = round_length(16.0 / mm_per_um)
    left, base = x0 + 1.0 / mm_per_um, y0 + 1.5 / mm_per_um
    axes.plot([left, left + length], [base, base], color=INK, linewidth=1.4, solid_capstyle="butt", zorder=12)
    axes.text(left + length / 2, base + 1.0 / mm_per_um, f"{length:g} µm", ha="center", va="bottom", fontsize=6.5)


def _caption(plane: str, mm_per_um: float) -> str:
    least = THINNEST_PT / PT_PER_MM / mm_per_um
    if plane == TURNED:
        seen = "Turned so that the cell lies flattest"
    else:
        right, up = ("xyz"[axis] for axis in PLANES[plane])
        seen = f"{right} to the right, {up} up"
    return (
        f"{seen}. Diameters to scale, but none thinner than {THINNEST_PT:g} pt "
        f"({least:.2g} µm here). The soma is outlined."
    )
