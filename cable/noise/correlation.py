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
from cable.noise.integral import VARIANCE_FINITE_ABOVE, integrate_spectra, slowest_rate_per_ms
from cable.noise.operating_point import OperatingPoint
from cable.noise.population import Source, couplings, total_spectrum
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
        correlation: (N,) correlation at lag 0; NaN where nothing fluctuates or the variance is infinite.
        lag_ms: (N,) centroid of the cross-covariance over lag, the slow components' delay of the point behind
            the site; NaN where nothing fluctuates.
        correlation_at, lag_at_ms: the same at every named site, by name.
        relative_error: certified bound of the frequency integral.
    """

    site: str
    correlation: Floats
    lag_ms: Floats
    correlation_at: dict[str, float]
    lag_at_ms: dict[str, float]
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
    s = 1j * omega
    coupled = couplings(sources)
    busy = {k for k, source in enumerate(sources) if source.population.correlation > 0}
    in_steps = {k: sources[k].in_step(response) for k in busy.union(*(pair[:2] for pair in coupled))}
    for i, source in enumerate(sources):
        alone = source.alone(s).real
        strength = source.piece_strength[:, None] * alone
        uneven = 3 * source.piece_lean[:, None]
        current += network.to_nodes(
            strength * (own * (1 - uneven) * near + cross * far), strength * (own * (1 + uneven) * far + cross * near)
        )
        current += source.node_strength[:, None] * alone * heard
        if source.population.correlation > 0:
            here = in_steps[i]
            in_step += source.population.correlation * source.common(source, s) * here * (vector @ here.conj())
    for a, b, correlation in coupled:
        for i, j in ((a, b), (b, a)):
            in_step += correlation * sources[i].common(sources[j], s) * in_steps[i] * (vector @ in_steps[j].conj())
    return solve(response.factors, current) + in_step


def correlation_map(model: CableModel, site: str, tolerance: float = 1e-6) -> CorrelationMap:
    """See `CableModel.correlation_map`."""
    point = model.refined.point
    places = {name: model.node_of(name) for name in model.site_names}
    node, points = model.node_of(site), len(model.tree)
    rows = np.r_[point.layout.row_node, list(places.values())]
    here = points + model.site_names.index(site)
    power = falls_as(point)[rows]
    infinite = power <= VARIANCE_FINITE_ABOVE

    def both(seen: OperatingPoint, omega: Floats) -> Floats:
        response = point.network.at(omega)
        covariance = spectra_with(seen.sources, response, node)[rows].real
        values = np.stack([covariance, total_spectrum(seen.sources, response)[rows]], axis=1)
        values[infinite] = 0.0
        return values

    def scale(integrals: Floats) -> Floats:
        variance = integrals[:, 1]
        return np.stack([np.sqrt(variance * variance[here]), variance], axis=1)

    result = integrate_spectra(point, both, scale, tolerance, np.where(infinite, np.inf, power))
    covariance, variance = np.where(infinite[:, None], np.nan, result.value).T
    slow = np.array([SLOW * slowest_rate_per_ms(point)])
    spectrum = spectra_with(point.sources, point.network.at(slow), node)[rows, 0]
    with np.errstate(divide="ignore", invalid="ignore"):
        correlation = covariance / np.sqrt(variance * variance[here])
        spectrum[here] = spectrum[here].real  # its own lag is 0, not the rounding of it
        # not the angle, which jumps by π where places move against each other
        lag = -spectrum.imag / spectrum.real / slow[0]
    return CorrelationMap(
        site=site,
        correlation=correlation[:points],
        lag_ms=lag[:points],
        correlation_at=dict(zip(places, correlation[points:].tolist(), strict=True)),
        lag_at_ms=dict(zip(places, lag[points:].tolist(), strict=True)),
        relative_error=result.relative_error,
    )
