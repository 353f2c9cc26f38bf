"""Correlation of every point with one site: a map of what an electrode there knows of the cell.

The covariances of all points with site b are the column P e_b = Z W Zᴴ e_b: one solve for the site's own
column, the noise applied to it, one more solve. That is O(points) per frequency, and no matrix.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from cable.network.elimination import solve
from cable.network.network import Response
from cable.noise.integral import integrate_spectra, slowest_rate_per_ms
from cable.noise.operating_point import Source, total_spectrum
from cable.noise.steepness import falls_as

if TYPE_CHECKING:
    from cable.noise.model import CableModel

Floats = NDArray[np.float64]
Complexes = NDArray[np.complex128]
SLOW = 1e-3  # of the slowest rate: the frequency at which the lag is read from the phase


@dataclass(frozen=True, eq=False)
class CorrelationMap:
    """How every point of the tree moves with one site.

    Attributes:
        site: its name.
        correlation: (N,) correlation at lag 0; NaN where nothing fluctuates.
        lag_ms: (N,) centroid of the cross-covariance over lag, the slow components' delay of the point behind
            the site.
        relative_error: certified bound of the frequency integral.
    """

    site: str
    correlation: Floats
    lag_ms: Floats
    relative_error: float


def spectra_with(sources: tuple[Source, ...], response: Response, node: int) -> Complexes:
    """(E + 1, F) cross-spectra S_xb = E[V_x V_b*] of all nodes x with the node b, all inputs together, mV²·ms."""
    pick = np.zeros(len(response.network.parent))
    pick[node] = 1.0
    return apply_spectra(sources, response, pick)


def apply_spectra(sources: tuple[Source, ...], response: Response, vector: Floats) -> Complexes:
    """(E + 1, F) product of the matrix of all cross-spectra, Z W Zᴴ, with a real vector (E + 1,)."""
    network, omega = response.network, response.omega_per_ms
    parent = network.parent[1:]
    spread = np.repeat(vector[:, None], len(omega), axis=1).astype(np.complex128)
    heard = solve(response.factors, spread).conj()
    near, far = heard[parent], heard[1:]
    own, cross = response.noise_self, response.noise_cross
    current, in_step = np.zeros(heard.shape, dtype=np.complex128), np.zeros(heard.shape, dtype=np.complex128)
    for source in sources:
        correlation, colour = source.population.correlation, source.colour(omega)
        strength = source.piece_strength[:, None] * ((1 - correlation) * colour)
        uneven = 3 * source.piece_lean[:, None]
        current += network.to_nodes(
            strength * (own * (1 - uneven) * near + cross * far), strength * (own * (1 + uneven) * far + cross * near)
        )
        current += source.node_strength[:, None] * ((1 - correlation) * colour) * heard
        if correlation > 0:
            voltage = response.voltages(source.piece_amplitude, source.piece_moment, source.node_amplitude)
            in_step += correlation * colour * voltage * (vector @ voltage.conj())
    return solve(response.factors, current) + in_step


def correlation_map(model: CableModel, site: str, tolerance: float = 1e-6) -> CorrelationMap:
    """See `CableModel.correlation_map`."""
    point = model.refined.point
    node, rows = model.node_of(site), point.layout.row_node

    def both(omega: Floats) -> Floats:
        response = point.network.at(omega)
        covariance = spectra_with(point.sources, response, node)[rows].real
        return np.stack([covariance, total_spectrum(point.sources, response)[rows]], axis=1)

    here = int(np.argmax(rows == node)) if (rows == node).any() else None

    def scale(integrals: Floats) -> Floats:
        variance = integrals[:, 1]
        at_site = variance[here] if here is not None else variance.min(where=variance > 0, initial=np.inf)
        return np.stack([np.sqrt(variance * at_site), variance], axis=1)

    result = integrate_spectra(point, both, scale, tolerance, falls_as(point)[rows])
    own = model.fluctuations(tolerance).at(site).variance_mV2
    slow = np.array([SLOW * slowest_rate_per_ms(point)])
    with np.errstate(divide="ignore", invalid="ignore"):
        correlation = result.value[:, 0] / np.sqrt(result.value[:, 1] * own)
    spectrum = spectra_with(point.sources, point.network.at(slow), node)[rows, 0]
    lag = -np.angle(spectrum) / slow[0]
    return CorrelationMap(site, correlation, lag, result.relative_error)
