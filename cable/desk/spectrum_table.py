"""A spectrum as a table and as sentences."""

from __future__ import annotations

import math
from typing import TYPE_CHECKING

import numpy as np

from cable.desk.messages import shown
from cable.desk.tables import Table

if TYPE_CHECKING:
    from cable.noise.spectra import Spectrum


def spectrum_table(spectrum: Spectrum) -> Table:
    """One row per frequency: density in all and by input, impedance as size and phase."""
    z = spectrum.input_impedance_MOhm
    columns = {"frequency_Hz": spectrum.frequency_Hz, "psd_mV2_per_Hz": spectrum.psd_mV2_per_Hz}
    columns |= {f"psd_{name}_mV2_per_Hz": part for name, part in spectrum.psd_by_input_mV2_per_Hz.items()}
    columns |= {"input_impedance_MOhm": np.abs(z), "input_phase_rad": np.angle(z)}
    if spectrum.transfer_impedance_MOhm is not None:
        transfer = spectrum.transfer_impedance_MOhm
        columns |= {"transfer_impedance_MOhm": np.abs(transfer), "transfer_phase_rad": np.unwrap(np.angle(transfer))}
    return Table(columns)


def spectrum_sentences(spectrum: Spectrum) -> list[str]:
    """What a person wants to know of a spectrum first."""
    psd, frequency = spectrum.psd_mV2_per_Hz, spectrum.frequency_Hz
    half = frequency[psd >= psd[0] / 2]
    sentences = [
        f"At {shown(spectrum.site, 60)} the density is {psd[0]:.4g} mV²/Hz at {frequency[0]:g} Hz"
        + (f" and has fallen to half of that by {half[-1]:.3g} Hz." if half[-1] < frequency[-1] else ".")
    ]
    if math.isfinite(spectrum.slope):
        last = f"; in the end it falls with the power {spectrum.falls_as:g}" if math.isfinite(spectrum.falls_as) else ""
        sentences.append(f"Over the top decade it falls with the power {-spectrum.slope:.2f} of frequency{last}.")
    z = np.abs(spectrum.input_impedance_MOhm)
    sentences.append(
        f"The input impedance is {z[0]:.4g} MΩ at {frequency[0]:g} Hz and {z[-1]:.4g} MΩ at {frequency[-1]:g} Hz."
    )
    return sentences
