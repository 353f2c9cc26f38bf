"""Names beside marks without overlap: each name takes the free place nearest to its mark."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np
from matplotlib.axes import Axes
from matplotlib.backends.backend_agg import FigureCanvasAgg
from numpy.typing import NDArray

from cable.desk.figures.style import GREY, INK
from cable.desk.messages import shown

Floats = NDArray[np.float64]
GAPS_PT = (5.0, 8.0, 12.0, 17.0, 24.0, 33.0, 44.0, 58.0, 75.0, 95.0, 120.0)
ANGLES = np.deg2rad(np.arange(0, 360, 20))
OVER_NAME, OVER_DRAWING, OUTSIDE = 200.0, 22.0, 60.0  # what it costs, against 1 a point of distance


@dataclass(frozen=True)
class Mark:
    """A name and where it belongs (data units); `quiet` names are small, grey and without a line."""

    name: str
    x: float
    y: float
    quiet: bool = False


def place_names(
    axes: Axes,
    marks: Sequence[Mark],
    drawing: Floats,
    frame: Sequence[float] | None = None,
    avoid: float = OVER_DRAWING,
) -> None:
    """Write the names of `marks` where they hide neither each other nor the drawing more than need be.

    Args:
        drawing: (D, 2) points of what is drawn, data units; names avoid them.
        frame: lowest x, lowest y, highest x, highest y (data units) for the names; the axes if not given.
        avoid: what it costs a name to lie over one point of the drawing, in points of distance from its mark.
    """
    if not marks:
        return
    canvas = FigureCanvasAgg(axes.get_figure(root=True))
    renderer = canvas.get_renderer()
    per_pt = axes.figure.dpi / 72
    to_pixels = axes.transData.transform
    dots = to_pixels(np.asarray(drawing, dtype=float).reshape(-1, 2)) / per_pt
    low, high = to_pixels(np.reshape(frame or _limits(axes), (2, 2))) / per_pt
    places = to_pixels([(m.x, m.y) for m in marks]) / per_pt
    taken = [np.r_[p - 3.0, p + 3.0] for p, m in zip(places, marks, strict=True) if not m.quiet]
    for mark, place in zip(marks, places, strict=True):
        text = _text(axes, mark)
        box = text.get_window_extent(renderer)
        size = np.array([box.width, box.height]) / per_pt
        corner = _best_corner(place, size, taken, dots, low, high, avoid)
        taken.append(np.r_[corner, corner + size])
        text.set_position(axes.transData.inverted().transform((corner + size / 2) * per_pt))
        if not mark.quiet:
            _leader(axes, place, corner, size, per_pt)


def _limits(axes: Axes) -> list[float]:
    (x0, x1), (y0, y1) = axes.get_xlim(), axes.get_ylim()
    return [x0, y0, x1, y1]


def _text(axes: Axes, mark: Mark) -> Any:
    return axes.text(
        mark.x,
        mark.y,
        shown(mark.name, 30),
        ha="center",
        va="center",
        fontsize=6.0 if mark.quiet else 6.5,
        style="italic" if mark.quiet else "normal",
        color=GREY if mark.quiet else INK,
        zorder=20,
        # a stroked halo would turn the letters into outlines in vector files
        bbox={"boxstyle": "square,pad=0.08", "facecolor": "white", "alpha": 0.7, "linewidth": 0},
    )


def _best_corner(
    place: Floats, size: Floats, taken: list[Floats], dots: Floats, low: Floats, high: Floats, avoid: float
) -> Floats:
    """The lower left corner (points) of the cheapest place for a name of this size."""
    best, least = place, np.inf
    for gap in GAPS_PT:
        if gap > least:
            break
        for angle in ANGLES:
            direction = np.array([np.cos(angle), np.sin(angle)])
            middle = place + direction * gap + direction * size / 2
            corner = middle - size / 2
            cost = gap + 0.5 * abs(direction[1])
            cost += OVER_NAME * sum(_overlap(corner, corner + size, t) for t in taken)
            inside = ((dots > corner - 1.5) & (dots < corner + size + 1.5)).all(axis=1)
            cost += avoid * min(int(inside.sum()), 12) ** 0.5
            out = np.maximum(low - corner, 0).sum() + np.maximum(corner + size - high, 0).sum()
            cost += OUTSIDE * (out > 0) + 2 * out
            if cost < least:
                best, least = corner, cost
    return best


def _overlap(low: Floats, high: Floats, other: Floats) -> bool:
    return bool((low < other[2:] + 1.0).all() and (high > other[:2] - 1.0).all())


def _leader(axes: Axes, place: Floats, corner: Floats, size: Floats, per_pt: float) -> None:
    """A thin line from the mark's ring to the nearest edge of its name, where there is a gap."""
    end = np.clip(place, corner, corner + size)
    way = end - place
    far = float(np.linalg.norm(way))
    if far < 6.5:
        return
    ends = np.array([place + way * (2.8 / far), end]) * per_pt
    x, y = axes.transData.inverted().transform(ends).T
    axes.plot(x, y, color=INK, linewidth=0.4, zorder=19, solid_capstyle="butt")
