"""How far a site is from small fluctuations: two numbers that tell where the linear theory ends.

Conductance seen. A conductance that fluctuates by δg at y changes the input conductance at x by δg (Z_xy/Z_xx)². The
number is the SD of the input conductance at x over its mean, as far as the membrane follows it:
    κ² = Σ_y ∫ C_g,y(τ) Z_xy³ z_xy(τ) dτ / Z_xx²,
in which one factor Z_xy of the quasi-static sum Σ σ_g² Z_xy⁴/Z_xx² has the membrane's memory (derived here; for an
isopotential cell it is σ_g²/G² · τ_s/(τ_s + τ_eff), to which the second-order shift of the mean is proportional).
Where synapses of an input are correlated, what they have in common adds C(τ) Σ_y Z_xy² · Σ_y Z_xy z_xy(τ), each sum
over the synapses; spikes that two inputs share are left out.

Saturation. A single event at y takes the share b/(1 + b) of its own driving force away, b = Σ c ĥ(p) Z_yy(p)/ĥ(0)
(`beyond.events`). The number is its mean over the synapses, weighted with what each makes of the variance at x.

The error of a linear SD is of the order of both. Their sum, with `CONDUCTANCE_WEIGHT` for κ², was at least as large
as the error in nearly all cases that were tried, from weak to strong, on spheres and trees (on a motoneuron with fast
synapses it was 4 % where the error was 5 %); often it is several times larger, as saturation and conductance pull in
opposite directions.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from cable.noise.beyond.events import conductance_covariance, exponentials
from cable.noise.operating_point import OperatingPoint

if TYPE_CHECKING:
    from cable.noise.model import CableModel

Floats = NDArray[np.float64]
CONDUCTANCE_WEIGHT = 0.5


@dataclass(frozen=True, eq=False)
class SmallFluctuation:
    """The index at some sites.

    Attributes:
        sites: their names.
        relative_conductance: (S,) SD of the conductance seen over its mean, as far as the membrane follows it.
        saturation: (S,) share of its driving force that an event takes away by itself.
        only_currents: whether nothing multiplies the voltage, so that the linear theory is exact.
    """

    sites: tuple[str, ...]
    relative_conductance: Floats
    saturation: Floats
    only_currents: bool

    @property
    def sd_relative_error(self) -> Floats:
        """(S,) about how far an SD of the linear theory may be off, relative to it; 0 where only currents act."""
        return np.minimum(self.saturation + CONDUCTANCE_WEIGHT * self.relative_conductance**2, 1.0)

    def as_dict(self) -> dict[str, object]:
        """The numbers by site."""
        columns = {
            "relative_conductance_fluctuation": self.relative_conductance,
            "event_saturation": self.saturation,
            "linear_sd_relative_error": self.sd_relative_error,
        }
        by_site = {key: dict(zip(self.sites, values.tolist(), strict=True)) for key, values in columns.items()}
        return {"only_currents": self.only_currents, **by_site}

    def sentence(self) -> str:
        """What it means for the linear answer, in plain words."""
        if self.only_currents:
            return "Linear theory is exact here: only currents, no conductances."
        if not self.relative_conductance.any():
            return ""  # no input acts
        k = int(np.argmax(self.sd_relative_error))
        error = self.sd_relative_error[k]
        return (
            f"Linear theory: the SD at {self.sites[k]} may be about {100 * error:.2g} % off (one event takes "
            f"{100 * self.saturation[k]:.2g} % of its own driving force, the conductance seen fluctuates by "
            f"{100 * self.relative_conductance[k]:.2g} %)"
            + ("." if len(self.sites) == 1 else "; at the other sites less.")
        )


def small_fluctuation(model: CableModel, sites: tuple[str, ...]) -> SmallFluctuation:
    """See `CableModel.small_fluctuation`."""
    nodes = [model.node_of(site) for site in sites]
    point = model.refined.point
    active = [k for k, one in enumerate(model.inputs) if one.conductance_nS is not None and one.rate_Hz > 0]
    none = np.zeros(len(sites))
    if not active or not sites:
        acts = any(one.rate_Hz > 0 for one in model.inputs)
        return SmallFluctuation(sites, none, none, acts and not active)
    rates = np.concatenate([exponentials(model.inputs[k].kernel).rates_per_ms for k in active])
    s = np.r_[0.0, point.network.slowest_rate_per_ms, rates]
    column = point.network.columns_at(s, nodes).impedance_GOhm
    local = point.network.input_impedance_at(rates)
    seen, shares, weights, first = none, none, none, 0
    for k in active:
        one, source = model.inputs[k], point.sources[k]
        b, p = conductance_covariance(one)
        slow = column[:, :, 0].real
        followed = (column[:, :, 2 + first : 2 + first + len(p)] @ b).real
        seen = seen + _total(point, slow**3 * followed, *point.numbers[k])
        if one.correlation > 0:
            in_step = _total(point, slow**2, *point.numbers[k]) * _total(point, slow * followed, *point.numbers[k])
            seen = seen + one.correlation / one.size_moment(2) * in_step
        lost = _lost(model, k, local[:, first : first + len(p)])
        alone = float(source.alone(np.zeros(1, dtype=complex)).real[0])
        reach = column[:, :, 1].real ** 2 * alone
        shares = shares + _total(point, reach * lost, source.piece_strength, source.node_strength)
        weights = weights + _total(point, reach, source.piece_strength, source.node_strength)
        first += len(p)
    own = column[np.arange(len(nodes)), nodes, 0].real
    saturation = np.divide(shares, weights, out=np.zeros_like(shares), where=weights > 0)
    return SmallFluctuation(sites, np.sqrt(np.maximum(seen, 0.0)) / own, saturation, False)


def _lost(model: CableModel, index: int, local: NDArray[np.complex128]) -> Floats:
    """(E + 1,) the share of its driving force that an event of one input takes away."""
    one = model.inputs[index]
    parts = exponentials(one.kernel)
    size = (one.conductance_nS or 0.0) * one.size_moment(2) / one.kernel.area_ms
    first = size * (local @ parts.covariance_factors).real
    return np.asarray(first / (1 + first))


def _total(point: OperatingPoint, values: Floats, on_pieces: Floats, at_nodes: Floats) -> Floats:
    """(S,) sums over pieces and nodes of values (S, E + 1) times what sits there."""
    ends = 0.5 * (values[:, point.network.parent[1:]] + values[:, 1:])
    return np.asarray(ends @ on_pieces + values @ at_nodes)
