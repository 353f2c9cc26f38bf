"""The spectrum of the voltage at every point of the tree: one sweep a frequency, all points at once."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from cable.noise.population import total_spectrum
from cable.theory.units import OMEGA_PER_MS_PER_HZ, one_sided_per_Hz

if TYPE_CHECKING:
    from cable.noise.model import CableModel

Floats = NDArray[np.float64]
BLOCK = 8  # frequencies handled at once


def point_spectra_mV2_per_Hz(model: CableModel, frequency_Hz: Floats) -> Floats:
    """(N + S, F) one-sided power spectral density at the N points of the tree, then at the model's S sites, mV²/Hz.

    Raises:
        ValueError: a frequency that is negative or not finite.
    """
    frequency = np.asarray(frequency_Hz, dtype=float)
    if not (np.isfinite(frequency) & (frequency >= 0)).all():
        raise ValueError("frequency_Hz: expected finite frequencies of at least 0")
    point = model.refined.point
    nodes = np.r_[point.layout.row_node, [model.node_of(name) for name in model.site_names]].astype(np.int64)
    density = np.zeros((len(nodes), len(frequency)))
    if not point.sources:
        return density
    for k in range(0, len(frequency), BLOCK):
        response = point.network.at(OMEGA_PER_MS_PER_HZ * frequency[k : k + BLOCK])
        density[:, k : k + BLOCK] = one_sided_per_Hz(total_spectrum(point.sources, response)[nodes])
    return density
