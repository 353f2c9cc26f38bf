"""The sources of a site drawn: how much of its variance arises at which distance from it, by input."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np
from matplotlib.figure import Figure
from numpy.typing import NDArray

from cable.desk.figures.style import COLUMN_MM, GREY, INK, figure
from cable.desk.messages import shown

if TYPE_CHECKING:
    from cable.noise.sources import Sources

HEIGHT_MM, LEFT, RIGHT, BINS = 70.0, 0.16, 0.955, 30
FILLS = (("#4d4d4d", ""), ("#b8b8b8", ""), ("white", "////"), ("white", "...."), ("#e6e6e6", "xx"))


def draw_sources(sources: Sources, title: str = "") -> Figure:
    """Stacked bars by distance from the site, and the distance within which half arises; call it inside `styled`."""
    page = figure(COLUMN_MM, HEIGHT_MM)
    axes = page.add_axes((LEFT, 0.16, RIGHT - LEFT, 0.68))
    whole = sources.variance_mV2.sum() or 1.0  # where nothing fluctuates the axes stay empty
    edges = _round_bins(float(sources.stretches.far_um.max()) or 1.0)
    top, foot = np.zeros(len(edges) - 1), np.zeros(len(edges) - 1)
    for k, (name, part) in enumerate(sources.variance_by_input_mV2.items()):
        reached = 100 * sources.stretches.within(edges, part / whole)
        reached[0] = 0.0  # what sits on the site itself counts in the first bin
        heights = np.diff(reached)
        fill, hatch = FILLS[k % len(FILLS)]
        axes.bar(
            edges[:-1],
            heights,
            np.diff(edges),
            np.where(heights >= 0, top, foot),
            align="edge",
            color=fill,
            hatch=hatch,
            edgecolor=INK,
            linewidth=0.4,
            label=shown(name, 30),
        )
        top += np.maximum(heights, 0.0)
        foot += np.minimum(heights, 0.0)
    half = sources.half_within_um()
    if np.isfinite(half):
        axes.axvline(half, color=GREY, linewidth=0.8, linestyle=(0, (4, 3)))
        text = f"half within {half:.0f} µm"
        axes.annotate(text, (half, top.max()), (4, 5), textcoords="offset points", fontsize=6.5, color=GREY)
    if foot.any():
        axes.axhline(0.0, color=INK, linewidth=0.6)
    axes.set_xlim(0.0, edges[-1])
    axes.set_ylim(1.12 * float(foot.min()), float(top.max()) * 1.25 or 1.0)  # room for the words
    axes.set_xlabel(f"distance from {shown(sources.site, 40)} along the tree (µm)")
    axes.set_ylabel(f"% of the variance per {edges[1]:.3g} µm")
    if sources.variance_by_input_mV2:
        axes.legend(frameon=False, loc="upper right")
    page.text(0.02, 0.98, shown(title, 52), va="top", fontsize=8, weight="bold")
    page.text(0.02, 0.92, f"sources of the variance at {shown(sources.site, 50)}", va="top", fontsize=6.5, color=GREY)
    return page


def _round_bins(reach_um: float) -> NDArray[np.float64]:
    """Edges of at most about `BINS` bins of a round width that cover `reach_um`."""
    power = 10.0 ** np.floor(np.log10(reach_um / BINS))
    width = power * next(step for step in (1, 2, 2.5, 5, 10) if power * step * BINS >= reach_um)
    return width * np.arange(int(np.floor(reach_um / width)) + 2)
