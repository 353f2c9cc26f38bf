"""The correlation of two records, and how exactly a record of some length knows it.

Bartlett's formula at lag 0 (Bartlett 1946, J R Stat Soc Suppl 8:27; Box & Jenkins 1976, Time Series Analysis;
from memory), with r = ρ_ab(0) and every integral over all lags:
  T·var(r̂) = ∫ρ_aa ρ_bb + ρ_ab(τ)ρ_ab(-τ) + r²[ρ_ab² + ½ρ_aa² + ½ρ_bb²] - 2r[ρ_aa ρ_ab + ρ_bb ρ_ab] dτ.
Each product becomes one of spectra (Parseval): ∫ρ_ab(τ)ρ_ab(-τ) = (1/π)∫₀^∞ Re S_ab² dω/(σ_a²σ_b²), and so on.
"""

from __future__ import annotations

import math
from dataclasses import dataclass, replace
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from cable.noise.cross import cross_spectra
from cable.noise.record.recorded_integral import integral
from cable.noise.record.recordings import ideal
from cable.theory.electrode import Electrode

if TYPE_CHECKING:
    from cable.noise.model import CableModel

Floats = NDArray[np.float64]
DEGREE = np.array([1, 1, 1, 2, 2, 2, 2, 2, 2, 2])


@dataclass(frozen=True, eq=False)
class Correlation:
    """A correlation at lag 0.

    Attributes:
        value: the correlation; NaN where a record does not fluctuate.
        variance_ms: T·var of its estimate, ms.
        relative_error: certified error, relative to the geometric mean of the variances.
    """

    value: float
    variance_ms: float
    relative_error: float

    def error(self, seconds: float) -> float:
        """Standard error of the correlation of a record of this length."""
        return math.sqrt(self.variance_ms / (1e3 * seconds))

    def seconds_for(self, wanted_error: float) -> float:
        """Length of the record whose correlation has this standard error, s."""
        return 1e-3 * self.variance_ms / wanted_error**2


@dataclass(frozen=True, eq=False)
class RecordedPair:
    """Two electrodes: the correlation of the cell without them, loaded by them, and as recorded.

    A voltage clamp records a current, which falls where the voltage would rise.
    """

    sites: tuple[str, str]
    true: Correlation
    loaded: Correlation
    recorded: Correlation


def recorded_pair(model: CableModel, a: str, b: str, tolerance: float = 1e-9) -> RecordedPair:
    """See `CableModel.recorded_pair`."""
    pair = model.electrode_at(a), model.electrode_at(b)
    if a == b:
        raise ValueError(f"a correlation needs two sites, found {a!r} twice")
    if (pair[0].window_s, pair[0].trend) != (pair[1].window_s, pair[1].trend):
        raise ValueError(
            f"the electrodes at {a!r} and {b!r} have different windows; a correlation needs the same window_s and trend"
        )
    bare = replace(model, electrodes=tuple(ideal(one) for one in pair if one.clamps))
    ideals = tuple(ideal(one) for one in pair)
    return RecordedPair(
        sites=(a, b),
        true=_correlation(bare, ideals, tolerance),
        loaded=_correlation(model, ideals, tolerance),
        recorded=_correlation(model, pair, tolerance),
    )


def _correlation(model: CableModel, pair: tuple[Electrode, ...], tolerance: float) -> Correlation:
    point = model.refined.point
    nodes = [model.node_of(one.site) for one in pair]
    signs = [-1.0 if one.clamps else 1.0 for one in pair]
    if not model.inputs:
        return Correlation(math.nan, math.nan, 0.0)
    # the voltage at an ideal clamp is tiny; in units of the steady input resistance nothing under- or overflows
    unit = point.steady.input_impedance_GOhm()[nodes, 0].real

    def products(omega: Floats) -> Floats:
        gain = np.array([sign * one.gain(omega) for sign, one in zip(signs, pair, strict=True)]) / unit[:, None]
        spectrum = cross_spectra(point, nodes, 1j * omega).sum(axis=0) * gain[:, None] * gain[None].conj()
        aa, bb, ab = spectrum[0, 0].real, spectrum[1, 1].real, spectrum[0, 1]
        square, real = np.abs(ab) ** 2, ab.real
        return np.stack([aa, bb, real, aa * aa, bb * bb, aa * bb, (ab * ab).real, square, aa * real, bb * real])

    def scale(integrals: Floats) -> Floats:
        a, b = integrals[0], integrals[1]
        both = math.sqrt(a * b)
        aa, bb = integrals[3], integrals[4]
        cross = math.sqrt(aa * bb)
        mixed = math.sqrt(cross)
        return np.array([a, b, both, aa, bb, cross, cross, cross, math.sqrt(aa) * mixed, math.sqrt(bb) * mixed])

    found = integral(point, nodes, pair, products, DEGREE, scale, tolerance)
    a, b, shared, aa, bb, across, turned, square, with_a, with_b = found.value.tolist()
    if not (a > 0 and b > 0):
        return Correlation(math.nan, math.nan, found.relative_error)
    r = shared / math.sqrt(a * b)
    variance = (
        (across + turned) / (a * b)
        + r * r * (square / (a * b) + 0.5 * aa / a**2 + 0.5 * bb / b**2)
        - 2 * r * (with_a / a + with_b / b) / math.sqrt(a * b)
    )
    return Correlation(r, max(variance, 0.0), found.relative_error)
