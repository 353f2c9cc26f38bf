"""A simulation drawn: a stretch of voltage at each site with the computed mean ± SD, and histograms beside."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np
from matplotlib.figure import Figure

from cable.desk.figures.style import GREY, INK, PAGE_MM, figure
from cable.desk.messages import shown
from cable.noise.excursions import edgeworth_density

if TYPE_CHECKING:
    from cable.simulation.simulation import Simulation

ROW_MM, ABOVE_MM, BELOW_MM, GAP_MM = 24.0, 12.0, 10.0, 4.0
LEFT, TRACE_TO, FROM, TO = 0.085, 0.77, 0.785, 0.985
BAND, BINS, MOST_SITES = "#dde4ea", 60, 8


def draw_trace(found: Simulation, title: str = "") -> Figure:
    """The first sites of a simulation, one row each; call it inside `styled`."""
    sites = found.sites[:MOST_SITES]
    height = ABOVE_MM + len(sites) * (ROW_MM + GAP_MM) - GAP_MM + BELOW_MM
    page = figure(PAGE_MM, height)
    for k, one in enumerate(sites):
        bottom = (height - ABOVE_MM - (k + 1) * ROW_MM - k * GAP_MM) / height
        axes = page.add_axes((LEFT, bottom, TRACE_TO - LEFT, ROW_MM / height))
        beside = page.add_axes((FROM, bottom, TO - FROM, ROW_MM / height), sharey=axes)
        mean, sd = one.mean_mV.computed, one.sd_mV.computed
        voltage = found.trace_mV[:, k]
        axes.axhspan(mean - sd, mean + sd, color=BAND, linewidth=0)
        axes.axhline(mean, color=GREY, linewidth=0.7)
        axes.plot(found.trace_ms, voltage, color=INK, linewidth=0.5, rasterized=len(voltage) > 5000)
        axes.set_xlim(0.0, max(float(found.trace_ms[-1]), 1e-9))
        axes.set_ylabel("mV")
        axes.yaxis.set_label_coords(-0.075, 0.5)
        axes.set_title(shown(one.site, 60), loc="left", fontsize=6.5, pad=2.0)
        beside.hist(voltage, bins=BINS, density=True, orientation="horizontal", color="#b8b8b8")
        if sd > 0:
            level = np.linspace(mean - 5 * sd, mean + 5 * sd, 300)
            beside.plot(edgeworth_density((level - mean) / sd, 0.0, 0.0) / sd, level, color=INK, linewidth=0.9)
        beside.set_xticks([])
        beside.spines["bottom"].set_visible(False)
        beside.tick_params(labelleft=False)
        if k < len(sites) - 1:
            axes.tick_params(labelbottom=False)
        else:
            axes.set_xlabel("time (ms)")
    page.text(0.012, 1 - 1.5 / height, shown(title, 100), va="top", fontsize=8, weight="bold")
    mode = "driving force frozen" if found.frozen else "conductances"
    told = f"simulated ({mode}); band: computed mean ± SD; beside: all of the trace, and the computed Gaussian"
    page.text(0.012, 1 - 6.0 / height, told, va="top", fontsize=6.5, color=GREY)
    return page
