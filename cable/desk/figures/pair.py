"""A pair of sites drawn: covariance against lag above, coherence and phase against frequency below."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np
from matplotlib.figure import Figure

from cable.desk.figures.spectrum import DASHES
from cable.desk.figures.style import COLUMN_MM, GREY, INK, PALE, figure, plain_powers
from cable.desk.messages import shown

if TYPE_CHECKING:
    from cable.noise.beyond.next_pair import NextPair
    from cable.noise.pairs import Pair

HEIGHT_MM, LEFT, RIGHT = 96.0, 0.17, 0.86


def draw_pair(pair: Pair, title: str = "", after: NextPair | None = None) -> Figure:
    """Covariance with its parts, coherence and phase, and those to the next order; call it inside `styled`."""
    page = figure(COLUMN_MM, HEIGHT_MM)
    upper = page.add_axes((LEFT, 0.53, 0.97 - LEFT, 0.36))
    lower = page.add_axes((LEFT, 0.12, RIGHT - LEFT, 0.29))
    upper.axvline(0.0, color=PALE, linewidth=0.6)
    upper.axhline(0.0, color=PALE, linewidth=0.6)
    upper.plot(pair.lag_ms, pair.covariance_mV2, color=INK, linewidth=1.6, label="all inputs")
    if after is not None:
        dots = DASHES[2]
        upper.plot(
            pair.lag_ms, after.covariance_mV2, color=INK, linewidth=1.0, linestyle=dots, label="all inputs, next order"
        )
    parts = pair.covariance_by_input_mV2 if len(pair.covariance_by_input_mV2) > 1 else {}
    for k, (name, part) in enumerate(parts.items()):
        line = DASHES[(k + 1) % len(DASHES)]
        upper.plot(pair.lag_ms, part, color=GREY, linewidth=0.9, linestyle=line, label=shown(name, 22))
    upper.set_xlim(pair.lag_ms[0], pair.lag_ms[-1])
    upper.legend(frameon=False, loc="best", handlelength=2.0, borderaxespad=0.1)
    a, b = (shown(name, 26) for name in pair.sites)
    upper.set_xlabel(f"lag of {b} behind {a} (ms)")
    upper.set_ylabel("covariance (mV²)")
    lower.semilogx(pair.frequency_Hz, pair.coherence, color=INK, linewidth=1.6)
    if after is not None:
        lower.semilogx(pair.frequency_Hz, after.coherence, color=INK, linewidth=1.0, linestyle=DASHES[2])
    lower.set_ylim(0.0, 1.03)
    lower.set_ylabel("coherence")
    lower.set_xlabel("frequency (Hz)")
    seen = pair.coherence > 1e-3  # a phase means nothing where nothing is shared
    phase = lower.twinx()
    phase.spines["right"].set_visible(True)
    phase.semilogx(pair.frequency_Hz[seen], np.unwrap(pair.phase_rad[seen]), color=GREY, linestyle=DASHES[1])
    plain_powers(lower.xaxis, phase.xaxis)
    phase.set_ylabel("phase (rad, dashed)", color=GREY)
    span = max(0.2, float(np.abs(np.unwrap(pair.phase_rad[seen])).max(initial=0.0)) * 1.1)
    phase.set_ylim(-span, span)
    for axes in (upper, lower):
        axes.yaxis.set_label_coords(-0.14 if axes is upper else -0.165, 0.5)
    page.text(0.02, 0.985, shown(title, 52), va="top", fontsize=8, weight="bold")
    text = f"{a} and {b}: correlation {pair.correlation:.3f}".replace("-", "−")
    text += f"; to the next order {after.correlation:.3f}".replace("-", "−") if after else ""
    page.text(0.02, 0.94, text, va="top", fontsize=6.5, color=GREY)
    return page
