"""A spectrum drawn: density in all and by input above, impedance below."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np
from matplotlib.figure import Figure
from numpy.typing import NDArray

from cable.desk.figures.style import COLUMN_MM, GREY, INK, PALE, figure, plain_powers
from cable.desk.messages import shown

if TYPE_CHECKING:
    from cable.noise.spectra import Spectrum

Floats = NDArray[np.float64]
HEIGHT_MM, LEFT, RANGE = 96.0, 0.19, 1e7
DASHES = ((0, ()), (0, (5, 2)), (0, (1.5, 1.5)), (0, (6, 2, 1.5, 2)), (0, (3, 1.2)))


def draw_spectrum(
    spectrum: Spectrum, title: str = "", temperature_C: float | None = None, after: Floats | None = None
) -> Figure:
    """Density and impedance against frequency, both on logarithmic axes; call it inside `styled`.

    `after` (F,) is the density to the next order.
    """
    page = figure(COLUMN_MM, HEIGHT_MM)
    upper = page.add_axes((LEFT, 0.44, 0.97 - LEFT, 0.46))
    lower = page.add_axes((LEFT, 0.12, 0.97 - LEFT, 0.27), sharex=upper)
    f = spectrum.frequency_Hz
    upper.loglog(f, spectrum.psd_mV2_per_Hz, color=INK, linewidth=1.6, label="all inputs")
    if after is not None:
        upper.loglog(f, after, color=INK, linewidth=1.0, linestyle=DASHES[2], label="all inputs, next order")
    parts = spectrum.psd_by_input_mV2_per_Hz if len(spectrum.psd_by_input_mV2_per_Hz) > 1 else {}
    for k, (name, part) in enumerate(parts.items()):
        upper.loglog(f, part, color=GREY, linewidth=0.9, linestyle=DASHES[(k + 1) % len(DASHES)], label=shown(name, 30))
    if temperature_C is not None:
        label = f"thermal, {temperature_C:g} °C".replace("-", "−")
        upper.loglog(f, spectrum.thermal_mV2_per_Hz(temperature_C), color=PALE, linewidth=1.6, label=label)
    top = float(spectrum.psd_mV2_per_Hz.max(initial=0.0)) or 1.0
    bottom = max(float(spectrum.psd_mV2_per_Hz.min(initial=top)), top / RANGE)
    if temperature_C is not None:
        bottom = min(bottom, float(spectrum.thermal_mV2_per_Hz(temperature_C).min())) / 1e3  # room for the names
    upper.set_ylim(bottom / 3, top * 2)
    upper.legend(frameon=False, loc="lower left")
    lower.loglog(f, np.abs(spectrum.input_impedance_MOhm), color=INK, linewidth=1.3, label="input")
    if spectrum.transfer_impedance_MOhm is not None:
        label = f"transfer to {shown(spectrum.to or '', 24)}"
        lower.loglog(f, np.abs(spectrum.transfer_impedance_MOhm), color=GREY, linestyle=DASHES[1], label=label)
        lower.legend(frameon=False, loc="lower left")
    plain_powers(upper.xaxis, upper.yaxis, lower.yaxis)
    upper.set_ylabel("density (mV²/Hz)")
    lower.set_ylabel("impedance (MΩ)")
    lower.set_xlabel("frequency (Hz)")
    upper.tick_params(labelbottom=False)
    for axes in (upper, lower):
        axes.yaxis.set_label_coords(-0.16, 0.5)
    page.text(0.02, 0.985, shown(title, 52), va="top", fontsize=8, weight="bold")
    text = f"at {shown(spectrum.site, 26)}"
    if np.isfinite(spectrum.slope):
        text += f"; slope {spectrum.slope:.2f} over the top decade".replace("-", "−")
    page.text(0.02, 0.94, text, va="top", fontsize=6.5, color=GREY)
    return page
