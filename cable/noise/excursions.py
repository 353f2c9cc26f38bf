"""How skewed the voltage is at a site, and how often and how long it goes beyond a level.

Rates of crossings are Rice's, for a Gaussian voltage (Rice 1945, Bell Syst Tech J 24:46; from memory). The share of
time above the level is corrected for skewness and kurtosis by Edgeworth's series, and the level that is exceeded
for a share of the time by that of Cornish & Fisher (Cornish & Fisher 1938, Rev Inst Int Stat 5:307; both series as
in Abramowitz & Stegun 1964, ch. 26; from memory).
"""

from __future__ import annotations

import math
from dataclasses import dataclass, replace
from typing import TYPE_CHECKING

import numpy as np
from numpy.polynomial.hermite_e import hermeval
from numpy.typing import ArrayLike, NDArray
from scipy.special import ndtr, ndtri

from cable.noise.cumulants import FINITE_ABOVE, cumulants
from cable.noise.fluctuations import SiteFluctuations
from cable.noise.operating_point import OperatingPoint
from cable.noise.steepness import falls_as

if TYPE_CHECKING:
    from cable.noise.model import CableModel

SKEWED = 0.5  # the size of the skewness from which first corrections no longer do
NEAR = 4.0  # SDs between mean and reversal potential below which the driving force cannot be taken as fixed


@dataclass(frozen=True)
class Excursions:
    """The voltage's distribution at one site, and its excursions beyond a level.

    Attributes:
        site: the site's name.
        mean_mV, sd_mV: mean and SD; the SD is NaN where it is infinite.
        skewness: third cumulant over SD³; NaN where it is not known, see `warnings`.
        excess_kurtosis: fourth cumulant over SD⁴; NaN likewise.
        cumulant_relative_error: estimated error of these two, relative.
        level_mV: the level, or None.
        upcrossing_Hz: rate of upward crossings of the level; NaN where undefined or without a level.
        warnings: why a number is missing, and where the linear picture is doubtful.
    """

    site: str
    mean_mV: float
    sd_mV: float
    skewness: float
    excess_kurtosis: float
    cumulant_relative_error: float
    level_mV: float | None
    upcrossing_Hz: float
    warnings: tuple[str, ...]

    @property
    def level_sd(self) -> float:
        """Distance of the level from the mean in SDs; NaN without level or fluctuations."""
        return math.nan if self.level_mV is None or not self.sd_mV > 0 else (self.level_mV - self.mean_mV) / self.sd_mV

    @property
    def between_upcrossings_s(self) -> float:
        """Mean time between upward crossings, s; infinite where there are none."""
        return 1 / self.upcrossing_Hz if self.upcrossing_Hz != 0 else math.inf

    @property
    def share_above(self) -> float:
        """Share of the time above the level for a Gaussian voltage; NaN without a level."""
        if self.sd_mV == 0 and self.level_mV is not None:
            return float(self.mean_mV > self.level_mV)
        return float(ndtr(-self.level_sd))

    @property
    def share_above_corrected(self) -> float:
        """The same corrected for skewness and kurtosis; NaN where that is unknown or the series fails."""
        return edgeworth_tail(self.level_sd, self.skewness, self.excess_kurtosis)

    def exceeded_mV(self, share: float) -> float:
        """The level that is exceeded for this share of the time, for a Gaussian voltage, mV."""
        return self.mean_mV - self.sd_mV * float(ndtri(share))

    def exceeded_corrected_mV(self, share: float) -> float:
        """The same corrected for skewness and kurtosis, mV; NaN where they are unknown."""
        return self.mean_mV + self.sd_mV * cornish_fisher(-float(ndtri(share)), self.skewness, self.excess_kurtosis)


def edgeworth_density(z: ArrayLike, skewness: float, excess_kurtosis: float) -> NDArray[np.float64]:
    """(...) density of a distribution of mean 0 and SD 1 at z (...); Edgeworth's series may make it negative."""
    g, k = skewness / 6, excess_kurtosis / 24
    x = np.asarray(z, dtype=float)
    return np.asarray(_bell(x) * hermeval(x, [1, 0, 0, g, k, 0, g * g / 2]))


def edgeworth_tail(z: float, skewness: float, excess_kurtosis: float) -> float:
    """Share of a distribution of mean 0 and SD 1 above z; NaN where the series has no positive density there."""
    g, k = skewness / 6, excess_kurtosis / 24
    tail = float(ndtr(-z)) + float(_bell(z) * hermeval(z, [0, 0, g, k, 0, g * g / 2]))
    return tail if edgeworth_density(z, skewness, excess_kurtosis) > 0 and 0 <= tail <= 1 else math.nan


def _bell(z: ArrayLike) -> NDArray[np.float64]:
    return np.asarray(np.exp(-0.5 * np.square(z)) / math.sqrt(2 * math.pi))


def cornish_fisher(z: float, skewness: float, excess_kurtosis: float) -> float:
    """The value which a distribution of mean 0 and SD 1 exceeds as rarely as a Gaussian one exceeds z."""
    curve = (z * z - 1) * skewness / 6 + (z**3 - 3 * z) * excess_kurtosis / 24
    return z + curve - (2 * z**3 - 5 * z) * skewness**2 / 36


def excursions(
    model: CableModel, sites: tuple[str, ...], level_mV: float | None, tolerance: float
) -> tuple[Excursions, ...]:
    """See `CableModel.excursions`."""
    if level_mV is not None and not math.isfinite(level_mV):
        raise ValueError(f"level_mV: expected a finite number, found {level_mV!r}")
    level = model.threshold_mV if level_mV is None else level_mV
    asked = model if level == model.threshold_mV else replace(model, threshold_mV=level)
    nodes = [asked.node_of(site) for site in sites]
    field = asked.fluctuations(tolerance)
    return tuple(
        _at(asked.refined.point, node, field.at(site), level, field.variance_note)
        for site, node in zip(sites, nodes, strict=True)
    )


def _at(point: OperatingPoint, node: int, at: SiteFluctuations, level: float | None, infinite: str) -> Excursions:
    unknown = _unknown(point, node, at, infinite)
    skewness = kurtosis = error = math.nan
    if not unknown:
        found = cumulants(point, node)
        second, third, fourth = found.by_input.sum(axis=0).tolist()
        skewness, kurtosis = third / at.sd_mV**3, fourth / at.variance_mV2**2
        # both ways to the second cumulant must meet; the sums of sizes bound what signs that cancel may hide
        error = max(abs(second / at.variance_mV2 - 1), *found.relative_error[1:].tolist())
    result = Excursions(
        site=at.name,
        mean_mV=at.mean_mV,
        sd_mV=at.sd_mV,
        skewness=skewness,
        excess_kurtosis=kurtosis,
        cumulant_relative_error=error,
        level_mV=level,
        upcrossing_Hz=_upcrossing_Hz(at, level),
        warnings=(unknown,) if unknown else (),
    )
    return replace(result, warnings=(*result.warnings, *_doubts(point, result)))


def _upcrossing_Hz(at: SiteFluctuations, level: float | None) -> float:
    if level is not None and at.sd_mV == 0:
        return 0.0
    return math.nan if level is None or at.upcrossing_Hz is None else at.upcrossing_Hz


def _unknown(point: OperatingPoint, node: int, at: SiteFluctuations, infinite: str) -> str:
    """Why skewness and kurtosis cannot be given; "" where they can."""
    if at.sd_mV == 0:
        return "nothing fluctuates here"
    if math.isnan(at.sd_mV):
        return infinite
    for one in point.model.inputs:
        others = [s for other in point.model.inputs for s in other.shares if one.name == s.input]
        shares = any(s.fraction > 0 for s in (*one.shares, *others))
        reason = (
            "its spikes are shared with another input"
            if shares
            else f"its spike trains are no Poisson trains ({one.spike_train.process})"
        )
        if one.rate_Hz > 0 and (shares or one.spike_train.process != "poisson"):
            return (
                f"skewness and kurtosis are known for Poisson trains only; of {one.name!r}, {reason}, so no skewness "
                "is given, nor anything corrected for it"
            )
    if falls_as(point)[node] <= FINITE_ABOVE:
        return (
            "the third cumulant is infinite: synapses whose charge comes at once sit on the neurite here; "
            "give them a kernel"
        )
    return ""


def _doubts(point: OperatingPoint, found: Excursions) -> tuple[str, ...]:
    """Where the linear, nearly Gaussian picture is doubtful, in words."""
    told = []
    conductances = [one for one in point.model.inputs if one.reversal_mV is not None and one.rate_Hz > 0]
    reversals = [one.reversal_mV for one in conductances if one.reversal_mV is not None]
    only = reversals and len(reversals) == sum(one.rate_Hz > 0 for one in point.model.inputs)
    if found.level_mV is not None and only:
        highest = max([*reversals, point.model.membrane.rest_mV])
        if found.level_mV >= highest:
            told.append(
                f"the level {found.level_mV:g} mV lies beyond every reversal potential (the highest is {highest:g} "
                "mV): synaptic conductances cannot bring the voltage there, though the linear theory lets them"
            )
    volleys = [repr(one.name) for one in point.model.inputs if one.correlation > 0 and one.rate_Hz > 0]
    if volleys and not math.isnan(found.skewness):
        told.append(
            f"synapses of {' and '.join(volleys)} are correlated in pairs, which does not fix the skewness: it is "
            "given for spikes that are copied from one common train"
        )
    for one in conductances:
        assert one.reversal_mV is not None
        distance = abs(one.reversal_mV - found.mean_mV)
        if distance < NEAR * found.sd_mV:
            told.append(
                f"the reversal potential of {one.name!r} is {distance / found.sd_mV:.1f} SD from the mean: its driving "
                "force varies with the voltage, which the linear theory leaves out"
            )
    if abs(found.skewness) > SKEWED:
        told.append(
            f"the skewness {found.skewness:.2g} is large: events are too few or too big for a nearly Gaussian voltage, "
            "so crossing rates and shares of time are rough"
        )
    if not math.isnan(found.skewness) and not math.isnan(found.level_sd) and math.isnan(found.share_above_corrected):
        told.append(
            f"the corrected density is negative at the level, {found.level_sd:.1f} SD from the mean: no corrected "
            "share of time is given"
        )
    return tuple(told)
