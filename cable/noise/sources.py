"""Which synapses make what is seen at a site: shares of its variance and of its mean, cylinder by cylinder.

The variance at site b is a sum over places, because independent currents add: each piece contributes its
strength times |Z|² to the ends it feeds. Where the synapses of a population are correlated, their common part
adds up as a voltage; a cylinder is then given the covariance of its own contribution with the whole,
Re[U_piece conj(U)], so that the shares still add to the variance (some may be negative). What two populations
make by spikes that they share is divided alike: half of it goes to the places of either.
"""

from __future__ import annotations

from dataclasses import dataclass, replace
from functools import cached_property
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from cable.network.network import Response
from cable.noise.integral import integrate_spectra
from cable.noise.operating_point import OperatingPoint
from cable.noise.population import Source, couplings
from cable.noise.steepness import falls_as
from morphology import kind_name
from morphology.around import Stretches, branch_ends, distance_from, stretches_around

if TYPE_CHECKING:
    from cable.noise.model import CableModel

Floats = NDArray[np.float64]
Complexes = NDArray[np.complex128]


@dataclass(frozen=True, eq=False)
class Sources:
    """What each cylinder of the tree contributes to one site.

    A cylinder is the cable of one tree edge, named by its far point; synapses on a sphere, and point synapses,
    count with the point or cylinder that they sit on.

    Attributes:
        model: the model.
        site: the site's name.
        variance_by_input_mV2: per input, and for shared spikes, (N,) variance at the site made by each cylinder.
        mean_by_input_mV: per input, (N,) shift of the site's mean voltage made by each cylinder, as the current
            that flows at the mean voltage there times the steady transfer resistance of the passive cell.
        relative_error: certified bound of the frequency integral.
    """

    model: CableModel
    site: str
    variance_by_input_mV2: dict[str, Floats]
    mean_by_input_mV: dict[str, Floats]
    relative_error: float

    @property
    def variance_mV2(self) -> Floats:
        """(N,) variance at the site made by each cylinder, all inputs together."""
        return np.sum([*self.variance_by_input_mV2.values(), np.zeros(len(self.model.tree))], axis=0)

    @property
    def variance_share(self) -> Floats:
        """(N,) the same as a share of the site's variance; the shares add to 1."""
        return self.variance_mV2 / (self.variance_mV2.sum() or np.nan)

    @cached_property
    def distance_um(self) -> Floats:
        """(N,) way along the tree from the site to each point, µm."""
        return distance_from(self.model.tree, self.model.site_places[self.site])

    @cached_property
    def stretches(self) -> Stretches:
        """Where each cylinder lies by distance from the site."""
        return stretches_around(self.model.tree, self.model.site_places[self.site])

    def half_within_um(self, of: str | None = None) -> float:
        """The distance from the site within which half of its variance arises, µm; NaN where nothing fluctuates.

        What arises in a cylinder is taken to arise evenly along it.

        Args:
            of: another site to measure the distance from.

        Raises:
            KeyError: the model has no such site.
        """
        share = self.variance_share
        if not np.isfinite(share).all():
            return float("nan")
        if of is None:
            return self.stretches.reached_um(share, 0.5)
        self.model.node_of(of)  # names the sites where there is none of this name
        return stretches_around(self.model.tree, self.model.site_places[of]).reached_um(share, 0.5)

    def share_by_kind(self) -> dict[str, float]:
        """Share of the variance by the kind of neurite that the synapses sit on."""
        kinds, group = np.unique(self.model.tree.shape.kind, return_inverse=True)
        shares = np.bincount(group, self.variance_share, len(kinds))
        return {kind_name(kind): float(share) for kind, share in zip(kinds, shares, strict=True)}

    def mean_by_kind_mV(self) -> dict[str, float]:
        """Shift of the site's mean voltage by the kind of neurite that the synapses sit on, mV."""
        kinds, group = np.unique(self.model.tree.shape.kind, return_inverse=True)
        shift = np.sum([*self.mean_by_input_mV.values(), np.zeros(len(group))], axis=0)
        shifts = np.bincount(group, shift, len(kinds))
        return {kind_name(kind): float(value) for kind, value in zip(kinds, shifts, strict=True)}

    def share_by_branch(self) -> dict[int, float]:
        """Share of the variance by unbranched run of neurite, named by the SWC id of its last point."""
        ends, group = np.unique(branch_ends(self.model.tree), return_inverse=True)
        shares = np.bincount(group, self.variance_share, len(ends))
        return dict(zip(self.model.tree.ids[ends].tolist(), shares.tolist(), strict=True))


def sources(model: CableModel, site: str, tolerance: float = 1e-9) -> Sources:
    """See `CableModel.sources`."""
    point = model.refined.point
    node, size = model.node_of(site), len(model.tree)

    def by_row(seen: OperatingPoint, omega: Floats) -> Floats:
        response = point.network.at(omega)
        parts = np.zeros((size, len(model.part_names), len(omega)))
        z = response.column(node)
        for k, source in enumerate(seen.sources):
            parts[:, k] = _parts(source, response, z, point)
        for i, j, correlation in couplings(seen.sources):
            for one, other in ((i, j), (j, i)):
                parts[:, -1] += correlation * _in_step(seen.sources[one], seen.sources[other], response, z, point)
        return np.concatenate([parts, parts.sum(axis=0, keepdims=True)])  # the sum is certified too

    def scale(integrals: Floats) -> Floats:
        return np.full(integrals.shape, np.abs(integrals[-1].sum()))

    result = integrate_spectra(point, by_row, scale, tolerance, falls_as(point)[[node]])
    return Sources(
        model=model,
        site=site,
        variance_by_input_mV2=dict(zip(model.part_names, result.value[:-1].T, strict=True)),
        mean_by_input_mV=_mean_parts(point, node),
        relative_error=result.relative_error,
    )


def _to_rows(point: OperatingPoint, pieces: Floats, nodes: Floats) -> Floats:
    """(N, F) sums over pieces (E, F) and nodes (E + 1, F) at the tree rows; a node counts with the piece it ends."""
    both = nodes.copy()
    both[1:] += pieces
    row = np.r_[0, point.layout.row]
    starts = np.flatnonzero(np.r_[True, row[1:] != row[:-1]])
    total = np.zeros((len(point.layout.tree), both.shape[1]))
    total[row[starts]] = np.add.reduceat(both, starts, axis=0)
    return total


def _parts(source: Source, response: Response, z: Complexes, point: OperatingPoint) -> Floats:
    """(N, F) spectrum at the node of the column `z` made by each tree row, for one population."""
    near, far = z[response.network.parent[1:]], z[1:]
    strength, uneven = source.piece_strength[:, None], 3 * source.piece_lean[:, None]
    both_ends = (1 - uneven) * np.abs(near) ** 2 + (1 + uneven) * np.abs(far) ** 2
    crossing = 2 * (near * far.conj()).real
    pieces = strength * (response.noise_self * both_ends + response.noise_cross * crossing)
    nodes = source.node_strength[:, None] * np.abs(z) ** 2
    alone = source.alone(1j * response.omega_per_ms).real
    parts = _to_rows(point, pieces * alone, nodes * alone)
    correlation = source.population.correlation
    return parts + correlation * _in_step(source, source, response, z, point) if correlation > 0 else parts


def _in_step(source: Source, other: Source, response: Response, z: Complexes, point: OperatingPoint) -> Floats:
    """(N, F) covariance of what each row contributes in step with all that `other` contributes."""
    pieces, lumped = _voltages(source, response, z)
    whole = np.sum([part.sum(axis=0) for part in _voltages(other, response, z)], axis=0).conj()
    whole = whole * source.common(other, 1j * response.omega_per_ms)
    return _to_rows(point, (pieces * whole).real, (lumped * whole).real)


def _voltages(source: Source, response: Response, z: Complexes) -> tuple[Complexes, Complexes]:
    """(E, F) and (E + 1, F) what the synapses of pieces and nodes contribute when all act in step."""
    near, far = z[response.network.parent[1:]], z[1:]
    first, moment = source.piece_amplitude[:, None], source.piece_moment[:, None]
    pieces = response.share * ((first - 2 * moment) * near + (first + 2 * moment) * far)
    return pieces, source.node_amplitude[:, None] * z


def _mean_parts(point: OperatingPoint, node: int) -> dict[str, Floats]:
    """Per input, (N,) what the mean synaptic currents of each row do to the mean voltage at `node`."""
    cell = point.passive
    bare = replace(
        point.network,
        conductance_nS=cell.leak_nS,
        node_conductance_nS=cell.node_leak_nS + point.electrode_load_nS,
        tilt_nS=np.zeros_like(cell.leak_nS),
    ).at(np.zeros(1))
    z = bare.column(node).real
    near, far, share = z[point.network.parent[1:]], z[1:], bare.share.real
    parts = {}
    for source in point.sources:
        events = np.sqrt(source.population.rate_per_ms) * source.population.kernel.area_ms
        current, moment = (events * a[:, None] for a in (source.piece_amplitude, source.piece_moment))
        pieces = share * ((current - 2 * moment) * near + (current + 2 * moment) * far)
        parts[source.population.name] = _to_rows(point, pieces, events * source.node_amplitude[:, None] * z)[:, 0]
    return parts
