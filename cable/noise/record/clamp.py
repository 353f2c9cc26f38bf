"""What a voltage clamp at one site sees of the rest of the cell.

With the site held through the resistance R, a steady current injected at x drives the current Z_xs/R through
the electrode, Z the transfer impedance of the clamped cell: the share of x's charge that reaches the clamp. By
reciprocity it is also how far a step of the command reaches (Koch, Poggio & Torre 1982, Phil Trans R Soc B
298:227; from memory), so that the charge of the step's transient is ∫ C·share² (its first moment; derived here).
"""

from __future__ import annotations

import math
from dataclasses import dataclass, replace
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from cable.noise.cross import cross_spectra
from cable.noise.integral import integrate_spectra
from cable.noise.operating_point import OperatingPoint
from cable.noise.population import couplings
from cable.noise.steepness import falls_as
from cable.theory.cylinder import mean_square_along
from cable.theory.electrode import Electrode

if TYPE_CHECKING:
    from cable.noise.model import CableModel

Floats = NDArray[np.float64]


@dataclass(frozen=True, eq=False)
class ClampShares:
    """What the clamp at one site sees.

    Attributes:
        electrode: the clamp.
        charge_share: (N,) per point of the tree, the share of a synaptic current's charge there that passes
            through the electrode.
        charge_share_by_input: per input, the mean of that share over its synapses.
        noise_share_by_input: per input, the variance of the clamp's current over what it would be with all its
            synapses at the clamp, the conductances of the cell as they are; NaN where they would be silent there.
        noise_share: the same for all inputs together.
        capacitance_seen_pF: the charge of the transient after a step of the command, over the step.
        capacitance_pF: the capacitance of the whole cell.
    """

    electrode: Electrode
    charge_share: Floats
    charge_share_by_input: dict[str, float]
    noise_share_by_input: dict[str, float]
    noise_share: float
    capacitance_seen_pF: float
    capacitance_pF: float


def clamp_shares(model: CableModel, site: str, tolerance: float = 1e-9) -> ClampShares:
    """See `CableModel.clamp_shares`."""
    clamp = model.electrode_at(site)
    if not clamp.clamps:
        raise ValueError(f"the electrode at {site!r} is no voltage clamp")
    others = tuple(one for one in model.electrodes if one.site != site)
    clamped = model if model.electrodes[0] == clamp else replace(model, electrodes=(clamp, *others))
    point = clamped.refined.point
    node = clamped.node_of(site)
    reach = point.steady.column(node)[:, 0].real / clamp.resistance_GOhm
    by_input, total = _noise_shares(point, node, clamp, tolerance)
    names = [one.name for one in model.inputs]
    return ClampShares(
        electrode=clamp,
        charge_share=reach[point.layout.row_node],
        charge_share_by_input=dict(zip(names, _mean_shares(point, node, clamp), strict=True)),
        noise_share_by_input=dict(zip(names, by_input, strict=True)),
        noise_share=total,
        capacitance_seen_pF=_capacitance_seen_pF(point, reach),
        capacitance_pF=float(point.network.capacitance_pF.sum() + point.network.node_capacitance_pF.sum()),
    )


def _mean_shares(point: OperatingPoint, node: int, clamp: Electrode) -> list[float]:
    """Per input, the current through the clamp when each of its synapses injects one unit, over their number."""
    shares = []
    for one, (on_pieces, at_nodes) in zip(point.model.inputs, point.numbers, strict=True):
        lean = point.layout.lean_of_area if one.by_area else point.layout.lean_of_length
        arriving = point.steady.voltages(on_pieces, on_pieces * lean, at_nodes)[node, 0].real
        shares.append(float(arriving / clamp.resistance_GOhm / (on_pieces.sum() + at_nodes.sum())))
    return shares


def _noise_shares(point: OperatingPoint, node: int, clamp: Electrode, tolerance: float) -> tuple[list[float], float]:
    """Variance of the current through the clamp over its variance with all synapses there, by input and in all."""
    count, parts = len(point.model.inputs), len(point.model.part_names)
    if not count:
        return [], math.nan

    def spectra(point: OperatingPoint, omega: Floats) -> Floats:
        seen = cross_spectra(point, [node], 1j * omega)[:, 0, 0].real / clamp.resistance_GOhm**2
        own = point.network.columns_at(1j * omega, [node]).impedance_GOhm[0, node] / clamp.resistance_GOhm
        return np.concatenate([seen, np.abs(own) ** 2 * _currents_at_clamp(point, node, 1j * omega)])

    def scale(integrals: Floats) -> Floats:
        return np.repeat([integrals[:parts].sum(), integrals[parts:].sum()], parts)

    found = integrate_spectra(point, spectra, scale, tolerance, falls_as(point)[[node]])
    seen, local = found.value[:parts], found.value[parts:]
    with np.errstate(divide="ignore", invalid="ignore"):
        shares = np.where(local > 0, seen / local, np.nan)[:count]
    return shares.tolist(), float(seen.sum() / local.sum()) if local.sum() > 0 else math.nan


def _currents_at_clamp(point: OperatingPoint, node: int, s_per_ms: NDArray[np.complexfloating]) -> Floats:
    """(parts, F) spectra of the currents of populations whose synapses all sit at `node`, pA²·ms."""
    spectra = np.zeros((len(point.model.part_names), len(s_per_ms)))
    in_step = []
    for k, (source, (on_pieces, at_nodes)) in enumerate(zip(point.sources, point.numbers, strict=True)):
        one, number = source.population, on_pieces.sum() + at_nodes.sum()
        amplitude = one.event_current_pA
        if one.conductance_nS is not None and one.reversal_mV is not None:
            amplitude = one.conductance_nS * (one.reversal_mV - point.reference_mV - point.deviation_mV[node])
        together = math.sqrt(one.rate_per_ms) * amplitude * number
        common = one.correlation * source.common(source, s_per_ms).real
        spectra[k] = together**2 * (source.alone(s_per_ms).real / number + common)
        in_step.append(together)
    for i, j, correlation in couplings(point.sources):
        common = point.sources[i].common(point.sources[j], s_per_ms).real
        spectra[-1] += 2 * correlation * in_step[i] * in_step[j] * common
    return spectra


def _capacitance_seen_pF(point: OperatingPoint, reach: Floats) -> float:
    """Σ C·share², with the share between the ends of each piece as the steady cable equation has it."""
    network, steady = point.network, point.steady
    near, far = reach[network.parent[1:]], reach[1:]
    share, own, cross = steady.share[:, 0].real, steady.noise_self[:, 0], steady.noise_cross[:, 0]
    square = mean_square_along(share, own, cross, near, far, np.zeros_like(near))
    lean = network.lean * (far**2 - near**2)  # membrane and share that lean the same way meet
    on_pieces = network.capacitance_pF @ (square + lean)
    loads = sum(load.capacitance_pF * reach[load.node] ** 2 for load in network.loads)
    return float(on_pieces + network.node_capacitance_pF @ reach**2 + loads)
