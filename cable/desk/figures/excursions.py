"""The voltage's distribution at sites drawn: Gaussian and corrected, with the level, one row a site."""

from __future__ import annotations

from collections.abc import Sequence
from typing import TYPE_CHECKING, Any

import numpy as np
from matplotlib.axes import Axes
from matplotlib.figure import Figure
from numpy.typing import NDArray

from cable.desk.figures.style import COLUMN_MM, GREY, INK, PALE, figure
from cable.desk.messages import percent, shown
from cable.noise.excursions import edgeworth_density

if TYPE_CHECKING:
    from cable.noise.excursions import Excursions

ROW_MM, ABOVE_MM, BELOW_MM, GAP_MM = 17.0, 13.0, 10.0, 3.5
LEFT, RIGHT, REACH, POINTS = 0.05, 0.97, 4.5, 1000
UNDER: dict[str, Any] = {
    "facecolor": "white",
    "edgecolor": "none",
    "pad": 0.5,
}  # keeps words readable over the line of the level


def draw_excursions(found: Sequence[Excursions], title: str = "") -> Figure:
    """Probability densities on one axis of voltage; the time above the level is shaded. Call it inside `styled`."""
    count = len(found)
    height = ABOVE_MM + count * ROW_MM + (count - 1) * GAP_MM + BELOW_MM
    page = figure(COLUMN_MM, height)
    level = found[0].level_mV
    low, high = _range(found, level)
    voltage = np.linspace(low, high, POINTS)
    for k, one in enumerate(found):
        bottom = height - ABOVE_MM - (k + 1) * ROW_MM - k * GAP_MM
        axes = page.add_axes((LEFT, bottom / height, RIGHT - LEFT, ROW_MM / height))
        _draw(one, axes, voltage, first=k == 0)
        axes.set_xlim(low, high)
        axes.spines["left"].set_visible(False)
        axes.set_yticks([])
        if k < count - 1:
            axes.set_xticklabels([])
        else:
            axes.set_xlabel("voltage (mV)")
    page.text(0.02, 1 - 1.5 / height, shown(title, 52), va="top", fontsize=8, weight="bold")
    told = "density: solid with skewness, dashed Gaussian"
    page.text(0.02, 1 - 6.0 / height, told, va="top", fontsize=6.5, color=GREY)
    return page


def _range(found: Sequence[Excursions], level: float | None) -> tuple[float, float]:
    spread = [one.sd_mV if one.sd_mV > 0 else 0.0 for one in found]  # NaN where infinite
    low = min(one.mean_mV - REACH * sd for one, sd in zip(found, spread, strict=True))
    high = max(one.mean_mV + REACH * sd for one, sd in zip(found, spread, strict=True))
    margin = 0.04 * (high - low) or 1.0
    near = level is not None and low - (high - low) <= level <= high + (high - low)
    return (min(low, level) if near and level is not None else low) - margin, (
        max(high, level) if near and level is not None else high
    ) + margin


def _draw(one: Excursions, axes: Axes, voltage: NDArray[np.float64], first: bool) -> None:
    name = shown(one.site, 30)
    if not one.sd_mV > 0:
        axes.axvline(one.mean_mV, color=INK, linewidth=1.4)
        axes.text(0.0, 0.98, f"{name}: no finite SD" if one.sd_mV != 0 else f"{name}: still", **_note(axes))
        return
    z = (voltage - one.mean_mV) / one.sd_mV
    gaussian = edgeworth_density(z, 0.0, 0.0)
    corrected = edgeworth_density(z, one.skewness, one.excess_kurtosis)
    known = bool(np.isfinite(one.skewness))
    drawn = _main_part(corrected) if known else gaussian
    if one.level_mV is not None:
        axes.fill_between(voltage, np.where(voltage >= one.level_mV, drawn, np.nan), color=PALE, linewidth=0)
        axes.axvline(one.level_mV, color=GREY, linewidth=0.6)
    axes.plot(voltage, gaussian, color=GREY, linewidth=0.8, linestyle=(0, (4, 3)))
    if known:
        axes.plot(voltage, drawn, color=INK, linewidth=1.3)
    axes.set_ylim(0.0, 1.12 * float(np.nanmax(drawn)))
    text = f"{one.mean_mV:.1f} ± {one.sd_mV:.3g} mV" + (f"\nskewness {one.skewness:.2g}" if known else "")
    axes.text(0.0, 0.98, name + "\n" + text.replace("-", "−"), **_note(axes))
    if one.level_mV is not None:
        share = one.share_above_corrected if not np.isnan(one.share_above_corrected) else one.share_above
        told = f"{percent(share)} above {one.level_mV:g} mV" if first else f"{percent(share)} above"
        axes.text(1.0, 0.98, told.replace("-", "−"), **{**_note(axes), "ha": "right", "bbox": UNDER})


def _main_part(density: NDArray[np.float64]) -> NDArray[np.float64]:
    """A density from Edgeworth's series where it is one: around its peak, up to where the series turns negative."""
    peak, negative = int(density.argmax()), density <= 0
    below, above = np.flatnonzero(negative[:peak]), np.flatnonzero(negative[peak:])
    inside = np.zeros(len(density), dtype=bool)
    inside[below[-1] + 1 if len(below) else 0 : peak + above[0] if len(above) else None] = True
    return np.where(inside, density, np.nan)


def _note(axes: Axes) -> dict[str, Any]:
    return {"transform": axes.transAxes, "va": "top", "ha": "left", "fontsize": 6.5}
