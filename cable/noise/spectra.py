"""One electrode by frequency: spectrum of the voltage, input and transfer impedance, slope at high frequency."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from cable.noise.cross import BLOCK, by_frequency
from cable.noise.steepness import falls_as
from cable.theory.units import MOHM_PER_GOHM, OMEGA_PER_MS_PER_HZ, one_sided_per_Hz, thermal_psd_mV2_per_Hz

if TYPE_CHECKING:
    from cable.noise.model import CableModel

Floats = NDArray[np.float64]
LOWEST_HZ, HIGHEST_HZ, POINTS = 0.1, 1000.0, 61  # where nothing else is asked for


@dataclass(frozen=True, eq=False)
class Spectrum:
    """What one site does by frequency.

    Attributes:
        site: its name.
        frequency_Hz: (F,) frequencies.
        psd_by_input_mV2_per_Hz: per input, and for shared spikes, (F,) one-sided power spectral density; the
            parts add up.
        input_impedance_MOhm: (F,) complex input impedance.
        to: name of the site of the transfer impedance, or None.
        transfer_impedance_MOhm: (F,) complex transfer impedance between the two, or None.
        falls_as: the power of 1/frequency that the spectrum falls with in the end; infinite where no synapse
            is at hand, where it falls faster than any power.
    """

    site: str
    frequency_Hz: Floats
    psd_by_input_mV2_per_Hz: dict[str, Floats]
    input_impedance_MOhm: NDArray[np.complex128]
    to: str | None
    transfer_impedance_MOhm: NDArray[np.complex128] | None
    falls_as: float

    @property
    def psd_mV2_per_Hz(self) -> Floats:
        """(F,) one-sided power spectral density of all inputs together, mV²/Hz."""
        return np.sum([*self.psd_by_input_mV2_per_Hz.values(), np.zeros(len(self.frequency_Hz))], axis=0)

    def thermal_mV2_per_Hz(self, temperature_C: float) -> Floats:
        """(F,) one-sided density of the thermal noise of membrane and cytoplasm at a temperature, mV²/Hz.

        Every resistance of the cell makes it, so it is 4kT times the real part of the input impedance (Nyquist 1928,
        Phys Rev 32:110). Synaptic conductances count as ordinary resistances at the same temperature.

        Raises:
            ValueError: a temperature at or below absolute zero.
        """
        return thermal_psd_mV2_per_Hz(self.input_impedance_MOhm.real, temperature_C)

    @property
    def slope(self) -> float:
        """Slope of log density against log frequency over the top decade of the frequencies; NaN for fewer than 3."""
        top = self.frequency_Hz >= self.frequency_Hz.max(initial=0.0) / 10
        top &= (self.frequency_Hz > 0) & (self.psd_mV2_per_Hz > 0)
        if np.count_nonzero(top) < 3:
            return float("nan")
        return float(np.polyfit(np.log(self.frequency_Hz[top]), np.log(self.psd_mV2_per_Hz[top]), 1)[0])


def spectrum(model: CableModel, site: str, frequency_Hz: Floats | None = None, to: str | None = None) -> Spectrum:
    """See `CableModel.spectrum`."""
    grid = np.geomspace(LOWEST_HZ, HIGHEST_HZ, POINTS) if frequency_Hz is None else frequency_Hz
    frequency = np.asarray(grid, dtype=float)
    if not (np.isfinite(frequency) & (frequency >= 0)).all():
        raise ValueError("frequency_Hz: expected finite frequencies of at least 0")
    point = model.refined.point
    nodes = [model.node_of(site)] if to is None else [model.node_of(site), model.node_of(to)]
    psd = one_sided_per_Hz(by_frequency(point, nodes[:1], frequency)[:, 0, 0].real)
    s = 1j * OMEGA_PER_MS_PER_HZ * frequency
    blocks = [
        point.network.columns_at(s[k : k + BLOCK], nodes[:1]).impedance_GOhm[0][nodes] for k in range(0, len(s), BLOCK)
    ]
    z = MOHM_PER_GOHM * np.concatenate(blocks, axis=-1)
    return Spectrum(
        site=site,
        frequency_Hz=frequency,
        psd_by_input_mV2_per_Hz=dict(zip(model.part_names, psd, strict=True)),
        input_impedance_MOhm=z[0],
        to=to,
        transfer_impedance_MOhm=None if to is None else z[1],
        falls_as=float(falls_as(point)[nodes[0]]),
    )
