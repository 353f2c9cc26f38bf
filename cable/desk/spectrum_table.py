"""A spectrum as a table and as sentences."""

from __future__ import annotations

import math
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from cable.desk.messages import shown
from cable.desk.tables import Table

if TYPE_CHECKING:
    from cable.noise.spectra import Spectrum


def spectrum_table(
    spectrum: Spectrum, temperature_C: float | None = None, after: NDArray[np.float64] | None = None
) -> Table:
    """One row per frequency: density in all and by input, impedance as size and phase.

    Thermal noise and the density to the next order, `after` (F,), are there if they are given.
    """
    z = spectrum.input_impedance_MOhm
    columns = {"frequency_Hz": spectrum.frequency_Hz, "psd_mV2_per_Hz": spectrum.psd_mV2_per_Hz}
    columns |= {"psd_next_mV2_per_Hz": after} if after is not None else {}
    columns |= {f"psd_{name}_mV2_per_Hz": part for name, part in spectrum.psd_by_input_mV2_per_Hz.items()}
    columns |= {"input_impedance_MOhm": np.abs(z), "input_phase_rad": np.angle(z)}
    if spectrum.transfer_impedance_MOhm is not None:
        transfer = spectrum.transfer_impedance_MOhm
        columns |= {"transfer_impedance_MOhm": np.abs(transfer), "transfer_phase_rad": np.unwrap(np.angle(transfer))}
    if temperature_C is not None:
        columns["psd_thermal_mV2_per_Hz"] = spectrum.thermal_mV2_per_Hz(temperature_C)
    return Table(columns)


def spectrum_sentences(spectrum: Spectrum, temperature_C: float | None = None) -> list[str]:
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
    if temperature_C is not None:
        sentences.append(_thermal(spectrum, temperature_C))
    return sentences


def _thermal(spectrum: Spectrum, temperature_C: float) -> str:
    """How the cell's thermal noise compares."""
    thermal, frequency = spectrum.thermal_mV2_per_Hz(temperature_C), spectrum.frequency_Hz
    told = f"Thermal noise at {temperature_C:g} °C is {thermal[0]:.3g} mV²/Hz at {frequency[0]:g} Hz"
    above = np.flatnonzero(thermal >= spectrum.psd_mV2_per_Hz)
    if not len(above):
        return f"{told} and stays below the synaptic noise up to {frequency[-1]:g} Hz."
    if above[0] == 0:
        return f"{told}, more than the synaptic noise."
    return f"{told} and exceeds the synaptic noise from {frequency[above[0]]:.4g} Hz."
