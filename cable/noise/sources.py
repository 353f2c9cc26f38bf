"""Which synapses make what is seen at a site: shares of its variance and of its mean, cylinder by cylinder.

The variance at site b is a sum over places, because independent currents add: each piece contributes its
strength times |Z|² to the ends it feeds. Where the synapses of a population are correlated, their common part
adds up as a voltage; a cylinder is then given the covariance of its own contribution with the whole,
Re[U_piece conj(U)], so that the shares still add to the variance (some may be negative).
"""

from __future__ import annotations

from dataclasses import dataclass, replace
from functools import cached_property
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from cable.network.network import Response
from cable.noise.integral import integrate_spectra
from cable.noise.operating_point import OperatingPoint, Source
from cable.noise.steepness import falls_as

if TYPE_CHECKING:
    from cable.noise.model import CableModel

Floats = NDArray[np.float64]


@dataclass(frozen=True, eq=False)
class Sources:
    """What each cylinder of the tree contributes to one site.

    A cylinder is the cable of one tree edge, named by its far point; synapses on a sphere, and point synapses,
    count with the point or cylinder that they sit on.

    Attributes:
        model: the model.
        site: the site's name.
        variance_by_input_mV2: per input, (N,) variance at the site made by each cylinder.
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
        tree, place = self.model.tree, self.model.site_places[self.site]
        here = tree.path_um[max(int(tree.parent[place.row]), 0)]
        here += place.fraction * (tree.path_um[place.row] - here)
        jump = np.maximum(tree.parent, 0)
        way = tree.path_to(place.row)
        jump[way] = way
        while (jump != jump[jump]).any():
            jump = jump[jump]
        return here + tree.path_um - 2 * np.minimum(tree.path_um[jump], here)

    def half_within_um(self) -> float:
        """The distance from the site within which half of its variance arises, µm."""
        order = np.argsort(self.distance_um, kind="stable")
        reached = np.cumsum(self.variance_share[order])
        return float(self.distance_um[order][np.searchsorted(reached, 0.5).clip(max=len(order) - 1)])


def sources(model: CableModel, site: str, tolerance: float = 1e-9) -> Sources:
    """See `CableModel.sources`."""
    point = model.refined.point
    node, size = model.node_of(site), len(model.tree)

    def by_row(omega: Floats) -> Floats:
        response = point.network.at(omega)
        parts = np.zeros((size, len(point.sources), len(omega)))
        for k, source in enumerate(point.sources):
            parts[:, k] = _parts(source, response, node, point)
        return np.concatenate([parts, parts.sum(axis=0, keepdims=True)])  # the sum is certified too

    def scale(integrals: Floats) -> Floats:
        return np.full(integrals.shape, np.abs(integrals[-1].sum()))

    result = integrate_spectra(point, by_row, scale, tolerance, falls_as(point)[[node]])
    return Sources(
        model=model,
        site=site,
        variance_by_input_mV2={one.name: result.value[:-1, k] for k, one in enumerate(model.inputs)},
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


def _parts(source: Source, response: Response, node: int, point: OperatingPoint) -> Floats:
    """(N, F) spectrum at `node` made by each tree row, for one population."""
    parent = response.network.parent[1:]
    z = response.column(node)
    near, far = z[parent], z[1:]
    correlation = source.population.correlation
    strength, uneven = source.piece_strength[:, None], 3 * source.piece_lean[:, None]
    both_ends = (1 - uneven) * np.abs(near) ** 2 + (1 + uneven) * np.abs(far) ** 2
    crossing = 2 * (near * far.conj()).real
    pieces = (1 - correlation) * strength * (response.noise_self * both_ends + response.noise_cross * crossing)
    nodes = (1 - correlation) * source.node_strength[:, None] * np.abs(z) ** 2
    if correlation > 0:
        first, moment = source.piece_amplitude[:, None], source.piece_moment[:, None]
        own = response.share * ((first - 2 * moment) * near + (first + 2 * moment) * far)
        lumped = source.node_amplitude[:, None] * z
        whole = (own.sum(axis=0) + lumped.sum(axis=0)).conj()
        pieces = pieces + correlation * (own * whole).real
        nodes = nodes + correlation * (lumped * whole).real
    colour = source.colour(response.omega_per_ms)
    return _to_rows(point, pieces * colour, nodes * colour)


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
