"""A recording drawn: the spectrum in its three stages above, the error of the SD against the record's length below."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np
from matplotlib.axes import Axes
from matplotlib.figure import Figure

from cable.desk.figures.style import COLUMN_MM, GREY, INK, PALE, figure, plain_powers
from cable.desk.messages import shown

if TYPE_CHECKING:
    from cable.desk.record_table import RecordStudy

HEIGHT_MM, LEFT, RANGE = 104.0, 0.19, 1e7


def draw_record(study: RecordStudy, title: str = "") -> Figure:
    """Densities, and the relative standard error of the SD; call it inside `styled`."""
    page = figure(COLUMN_MM, HEIGHT_MM)
    upper = page.add_axes((LEFT, 0.52, 0.97 - LEFT, 0.385))
    lower = page.add_axes((LEFT, 0.10, 0.97 - LEFT, 0.30))
    recording, spectrum = study.recording, study.spectrum
    unit, f = recording.electrode.unit, spectrum.frequency_Hz
    ideal = "ideal clamp" if unit == "pA" else "without electrode"
    upper.loglog(f, spectrum.true, color=PALE, linewidth=3.2, label=f"{ideal}, SD {recording.true.sd:.3g} {unit}")
    upper.loglog(
        f, spectrum.loaded, color=GREY, linestyle=(0, (5, 2)), label=f"loaded, SD {recording.loaded.sd:.3g} {unit}"
    )
    upper.loglog(
        f, spectrum.recorded, color=INK, linewidth=1.4, label=f"recorded, SD {recording.recorded.sd:.3g} {unit}"
    )
    top = float(spectrum.true.max(initial=0.0)) or 1.0
    seen = spectrum.recorded[spectrum.recorded > 0]
    bottom = max(float(seen.min(initial=top)), top / RANGE) / 3
    upper.set_ylim(bottom, top * 4)
    upper.set_xlim(f[0], max(f[spectrum.true > bottom].max(initial=f[1]), f[1]))
    # what a high-pass filter or windows take off leaves the lower left corner to the record
    upper.legend(frameon=False, loc="lower left" if recording.electrode.keeps_mean else "lower center")
    upper.set_xlabel("frequency (Hz)")
    upper.set_ylabel(f"density ({unit}²/Hz)")
    _draw_error(study, lower)
    plain_powers(upper.xaxis, upper.yaxis, lower.xaxis, lower.yaxis)
    for axes in (upper, lower):
        axes.yaxis.set_label_coords(-0.16, 0.5)
    page.text(0.02, 0.985, shown(title, 52), va="top", fontsize=8, weight="bold")
    page.text(
        0.02,
        0.945,
        f"{recording.electrode.mode} at {shown(recording.electrode.site, 50)}",
        va="top",
        fontsize=6.5,
        color=GREY,
    )
    return page


def _draw_error(study: RecordStudy, axes: Axes) -> None:
    """Standard error of the SD against the length of the record, with the wanted one marked."""
    record, wanted = study.recording.recorded, study.wanted_error
    axes.set_xlabel("length of the record (s)")
    axes.set_ylabel("standard error of the SD (%)")
    axes.set_xscale("log")
    axes.set_yscale("log")
    if record.variance == 0:
        return
    needed = record.seconds_for_sd(wanted)
    marks = [needed, record.shortest_s] + ([] if study.seconds is None else [study.seconds])
    lengths = np.geomspace(min(marks) / 10, max(marks) * 30, 100)
    error = np.array([100 * record.sd_relative_error(t) for t in lengths])
    good = lengths >= record.shortest_s
    axes.plot(lengths[good], error[good], color=INK, linewidth=1.4)
    axes.plot(lengths[~good], error[~good], color=PALE, linewidth=1.4)
    axes.set_xlim(lengths[0], lengths[-1])
    axes.set_ylim(error[-1], error[0])
    axes.text(0.02, 0.04, "pale: too short for this formula", transform=axes.transAxes, fontsize=6.5, color=GREY)
    for k, (t, said) in enumerate(_marks(study, needed)):
        level = 100 * record.sd_relative_error(t)
        near = k > 0 and needed / 5 < t < needed * 5
        axes.plot([t], [level], marker="o", color=INK, markersize=3.2)
        shift, side = ((-5, -8), "right") if near else ((5, 3), "left")
        axes.annotate(said, (t, level), shift, textcoords="offset points", ha=side, fontsize=6.5)


def _marks(study: RecordStudy, needed: float) -> list[tuple[float, str]]:
    marks = [(needed, f"{100 * study.wanted_error:g} %: {needed:.3g} s")]
    if study.seconds is not None:
        error = 100 * study.recording.recorded.sd_relative_error(study.seconds)
        marks.append((study.seconds, f"{study.seconds:g} s: {error:.2g} %"))
    return marks
