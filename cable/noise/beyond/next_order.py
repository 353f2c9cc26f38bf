"""Mean and SD at all points to the next order beyond the linear theory; `next_medium` has the terms."""

from __future__ import annotations

import math
from collections.abc import Callable
from concurrent.futures import ThreadPoolExecutor
from dataclasses import dataclass, replace
from functools import cached_property, partial
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from cable.noise.beyond.events import fastest_rate_per_ms
from cable.noise.beyond.next_medium import NextMedium, bare_medium, linear_spectra, with_multiplicative
from cable.noise.beyond.sinc_rule import SincRule
from cable.noise.integral import VARIANCE_FINITE_ABOVE, block_for, cell_rate_per_ms, cell_strip, range_u
from cable.noise.operating_point import OperatingPoint, operating_point
from cable.noise.smoothing import Smoothing
from cable.noise.steepness import falls_as

if TYPE_CHECKING:
    from cable.noise.fluctuations import Fluctuations
    from cable.noise.model import CableModel

Floats = NDArray[np.float64]
TOLERANCE = 1e-5  # of the integrals over frequency, relative to the variance
PIECE = 0.3  # electrotonic length of pieces at the fastest rate of the kernels, at most
MODES = 100  # of which the error falls about as the number; their cost grows with its third power and more


class NotKnown(ValueError):
    """A model for which the next order is not known."""


@dataclass(frozen=True, eq=False)
class NextOrder:
    """Mean and SD to the next order. Arrays are (P,): the N points of the tree, then the model's sites.

    Attributes:
        linear: the linear answer.
        medium: the cell to the next order, for spectra and covariances.
        rule: the frequencies that the variance is integrated over.
        at_rule: the same cell, with spectra of regular spike trains smoothed to the rule's frequencies.
        warnings: what the next order leaves out here, in words.
    """

    linear: Fluctuations
    medium: NextMedium
    rule: SincRule
    at_rule: NextMedium
    warnings: tuple[str, ...]
    _mean: Floats
    _variance: Floats
    _error: Floats

    @property
    def relative_error(self) -> float:
        """The largest estimate of `relative_error_at`, over all points and sites."""
        return float(np.nanmax(self._error, initial=0.0))

    @cached_property
    def relative_error_at(self) -> dict[str, float]:
        """Estimate of the numerical error of the variance's change at each site, relative to the variance."""
        return dict(zip(self.linear.model.site_names, self._error[len(self.linear.model.tree) :].tolist(), strict=True))

    @property
    def mean_mV(self) -> Floats:
        """(N,) mean voltage, mV."""
        return self._mean[: len(self.linear.model.tree)]

    @property
    def variance_mV2(self) -> Floats:
        """(N,) variance of the voltage, mV²; NaN where it is infinite."""
        return self._variance[: len(self.linear.model.tree)]

    @property
    def sd_mV(self) -> Floats:
        """(N,) standard deviation of the voltage, mV; NaN where it is infinite."""
        return np.sqrt(self.variance_mV2)

    @cached_property
    def at_sites(self) -> dict[str, tuple[float, float]]:
        """Mean and SD, mV, of every site."""
        n, names = len(self.linear.model.tree), self.linear.model.site_names
        sd = np.sqrt(self._variance[n:])
        return {name: (float(self._mean[n + k]), float(sd[k])) for k, name in enumerate(names)}

    def sd_change(self, site: str) -> float:
        """Relative change of the SD at a site by the next order; NaN where there is none."""
        linear = self.linear.at(site).sd_mV
        return self.at_sites[site][1] / linear - 1 if linear > 0 else math.nan

    def left_over(self, site: str) -> float:
        """About how far the SD at a site may still be off, in %: the square of the linear theory's possible error."""
        return float(100 * self.linear.model.small_fluctuation((site,)).sd_relative_error[0] ** 2)

    def field(self) -> Fluctuations:
        """The linear answer with mean and variance replaced, each input with its linear share of the variance."""
        linear = self.linear
        with np.errstate(divide="ignore", invalid="ignore"):
            ratio = np.where(linear._variance > 0, self._variance / linear._variance, 1.0)
        return replace(linear, _mean=self._mean, _by_input=linear._by_input * ratio[:, None])


def next_order(model: CableModel, tolerance: float = 1e-9) -> NextOrder:
    """See `CableModel.next_order`."""
    warnings = check_known(model)
    linear = model.fluctuations(tolerance)
    point = short_pieces(model)
    rule, layout = rule_for(point), point.layout
    nodes = np.r_[layout.row_node, [layout.node_at(place) for place in model.site_places.values()]].astype(np.int64)
    regular = any(one.spike_train.process != "poisson" and one.rate_Hz > 0 for one in model.inputs)
    at_rule = replace(point, smoothing=Smoothing(rule.omega0_per_ms, rule.step)) if regular else point
    start = bare_medium(at_rule)
    medium = with_multiplicative(start, rule, _everywhere(point, rule, start.spectra), MODES)
    before = _everywhere(point, rule, partial(linear_spectra, at_rule))
    crossed = medium.crossed
    assert crossed is not None
    # the sum over frequencies of what the modes bring is one matrix for all nodes
    change = (_everywhere(point, rule, partial(medium.spectra, across=False)) - before)[nodes]
    gained = change @ rule.weights + crossed.variance(rule, nodes)
    size = np.where(linear._variance > 0, linear._variance, 1.0)
    # halving the step squares what is left of the error
    thinned = 2 * (change[:, ::2] @ rule.weights[::2])
    error = ((change @ rule.weights - thinned) / size) ** 2
    last = np.zeros(len(nodes))
    if (count := len(crossed.rates_per_ms)) < len(point.layout.parent):
        # the sum over modes converges about as their number: their second half brings what is still missing
        half = crossed.slowest(count // 2)
        less = partial(replace(medium, crossed=half).spectra, across=False)
        last = gained - (_everywhere(point, rule, less) - before)[nodes] @ rule.weights - half.variance(rule, nodes)
    missing = np.abs(last) / size
    # at single points the second half may bring little by chance
    missing = np.maximum(missing, np.median(missing))
    return NextOrder(
        linear=linear,
        medium=replace(medium, point=point),
        rule=rule,
        at_rule=medium,
        warnings=warnings,
        _mean=linear._mean + medium.mean_shift_mV[nodes],
        _variance=linear._variance + gained,
        _error=error + missing,
    )


def _everywhere(point: OperatingPoint, rule: SincRule, spectra: Callable[[Floats], Floats]) -> Floats:
    """(E + 1, M) spectra at the rule's frequencies, 0 where a variance is infinite."""
    width, omega = block_for(point), rule.omega_per_ms
    with ThreadPoolExecutor(2) as pool:
        found = list(pool.map(spectra, [omega[k : k + width] for k in range(0, len(omega), width)]))
    together = np.concatenate(found, axis=-1)
    together[falls_as(point) <= VARIANCE_FINITE_ABOVE] = 0.0
    return together


def check_known(model: CableModel) -> tuple[str, ...]:
    """What the next order leaves out for this model, in words.

    Raises:
        NotKnown: conductances whose spikes are correlated.
    """
    told = []
    for one in model.inputs:
        if one.conductance_nS is None or one.rate_Hz == 0:
            continue
        if one.correlation > 0:  # and so where spikes are shared, which needs correlation
            raise NotKnown(
                f"the spikes of {one.name!r} are correlated, and the next order is known for independent synapses; "
                "take the correlation out, or simulate"
            )
        if one.spike_train.process != "poisson":
            told.append(
                f"the spike trains of {one.name!r} ({one.spike_train.process}) are taken as Poisson trains in what "
                "goes beyond linear order"
            )
    return tuple(told)


def rule_for(point: OperatingPoint) -> SincRule:
    """Frequencies that serve the spectra around a point to `TOLERANCE`."""
    omega0 = cell_rate_per_ms(point)
    step = math.pi * cell_strip(point, omega0) / math.log(10 / TOLERANCE)
    power = falls_as(point)
    reach = range_u(point, np.where(power <= VARIANCE_FINITE_ABOVE, np.inf, power), False, TOLERANCE, omega0)
    return SincRule(omega0, step, 2 * math.ceil(reach / step / 2) + 1)


def short_pieces(model: CableModel) -> OperatingPoint:
    """The converged operating point with pieces short enough that what is local varies little along each."""
    point = model.refined.point
    network, layout = point.network, point.layout
    fastest = fastest_rate_per_ms(model.inputs)
    if fastest == 0 or not len(layout.row):
        return point
    length = np.sqrt(network.resistance_GOhm * np.hypot(network.conductance_nS, fastest * network.capacitance_pF))
    longest = np.zeros(layout.segments)
    np.maximum.at(longest, layout.segment, length)
    times = np.maximum(1, np.ceil(longest / PIECE)).astype(np.int64)
    if (times == 1).all():
        return point
    return operating_point(model, np.bincount(layout.segment, minlength=layout.segments) * times)
