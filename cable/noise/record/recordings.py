"""What one electrode records beside what is true, and how exact a record of some length is.

Three stages: true (the cell without any electrode; for a voltage clamp the current of an ideal one), loaded
(the cell with all its electrodes, before any filter) and recorded (behind pipette, filters and removed trends).

The standard errors are those of a Gaussian process in a record that is long beside its correlation time
(Bartlett 1946, J R Stat Soc Suppl 8:27; from memory): with C the autocovariance, S its spectrum,
  var(mean) = (1/T)∫C dτ = S(0)/T,    var(variance) = (2/T)∫C² dτ = (2/T)·(1/π)∫₀^∞ S² dω (Parseval).
"""

from __future__ import annotations

import math
from dataclasses import dataclass, replace
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from cable.noise.cross import by_frequency, cross_spectra
from cable.noise.record.recorded_integral import integral
from cable.theory.electrode import Electrode
from cable.theory.filters import kept_of_trend
from cable.theory.units import MOHM_PER_GOHM, OMEGA_PER_MS_PER_HZ, one_sided_per_Hz

if TYPE_CHECKING:
    from cable.noise.model import CableModel
    from cable.noise.operating_point import OperatingPoint

Floats = NDArray[np.float64]
LONG = 20.0  # correlation times that a record should last for the formulas to hold


@dataclass(frozen=True, eq=False)
class Record:
    """A stationary record in its unit, mV or pA.

    Attributes:
        mean: its mean; NaN where filters or windows have taken it off.
        variance_by_input: per input its part of the variance.
        at_zero: two-sided spectrum at ω = 0, unit²·ms.
        square: ∫C(τ)² dτ over all τ, unit⁴·ms.
        relative_error: certified error of the variance's integral.
    """

    mean: float
    variance_by_input: dict[str, float]
    at_zero: float
    square: float
    relative_error: float

    @property
    def variance(self) -> float:
        """Variance, unit²."""
        return float(sum(self.variance_by_input.values()))

    @property
    def sd(self) -> float:
        """Standard deviation, unit."""
        return math.sqrt(self.variance)

    @property
    def correlation_time_ms(self) -> float:
        """S(0)/(2·variance), ms; NaN where nothing fluctuates."""
        return self.at_zero / (2 * self.variance) if self.variance > 0 else math.nan

    @property
    def square_time_ms(self) -> float:
        """∫ρ² dτ over all τ, ρ the autocorrelation, ms: one degree of freedom lasts so long."""
        return self.square / self.variance**2 if self.variance > 0 else math.nan

    def mean_error(self, seconds: float) -> float:
        """Standard error of the mean of a record of this length, in its unit; NaN where the mean is lost."""
        return math.nan if math.isnan(self.mean) else math.sqrt(self.at_zero / (1e3 * seconds))

    def variance_relative_error(self, seconds: float) -> float:
        """Standard error of the variance of a record of this length, relative."""
        return math.sqrt(2 * self.square_time_ms / (1e3 * seconds))

    def sd_relative_error(self, seconds: float) -> float:
        """Standard error of the SD of a record of this length, relative: half that of the variance."""
        return self.variance_relative_error(seconds) / 2

    def seconds_for_sd(self, relative: float) -> float:
        """Length of the record whose SD has this relative standard error, s."""
        return 1e-3 * self.square_time_ms / (2 * relative**2)

    def seconds_for_mean(self, of_sd: float) -> float:
        """Length of the record whose mean has this standard error in units of the SD, s; NaN where it is lost."""
        return math.nan if math.isnan(self.mean) else 1e-3 * 2 * self.correlation_time_ms / of_sd**2

    @property
    def shortest_s(self) -> float:
        """The length below which the formulas for standard errors no longer hold, s."""
        times = [t for t in (self.correlation_time_ms, self.square_time_ms) if not math.isnan(t)]
        return 1e-3 * LONG * max(times, default=0.0)


@dataclass(frozen=True, eq=False)
class RecordedSpectrum:
    """One-sided spectra of the three stages.

    Attributes:
        frequency_Hz: (F,) frequencies.
        true, loaded, recorded: (F,) power spectral densities, unit²/Hz.
        recorded_by_input: per input, (F,) its part of `recorded`.
        power_gain: (F,) recorded over loaded, |H|² with the windows' share.
    """

    frequency_Hz: Floats
    true: Floats
    loaded: Floats
    recorded: Floats
    recorded_by_input: dict[str, Floats]
    power_gain: Floats


@dataclass(frozen=True, eq=False)
class Recording:
    """What the electrode at one site records.

    Attributes:
        model: the cell with its electrodes, this one first.
        bare: the cell of the stage `true`.
        electrode: the electrode.
        true, loaded, recorded: the three stages.
        input_resistance_MOhm: steady input resistance as the amplifier shows it: with what the bridge leaves of
            R_s in current clamp, with what compensation leaves of it in voltage clamp, and with the seal.
    """

    model: CableModel
    bare: CableModel
    electrode: Electrode
    true: Record
    loaded: Record
    recorded: Record
    input_resistance_MOhm: float

    def spectrum(self, frequency_Hz: Floats) -> RecordedSpectrum:
        """The spectra of the three stages at frequencies (F,), Hz."""
        frequency = np.asarray(frequency_Hz, dtype=float)
        true, loaded = (
            one_sided_per_Hz(by_frequency(m.refined.point, [m.node_of(self.electrode.site)], frequency)[:, 0, 0].real)
            / _ohms2(m.electrode_at(self.electrode.site))
            for m in (self.bare, self.model)
        )
        gain = power_gain(self.electrode, OMEGA_PER_MS_PER_HZ * frequency)
        parts = {name: gain * part for name, part in zip(self.model.part_names, loaded, strict=True)}
        return RecordedSpectrum(frequency, true.sum(axis=0), loaded.sum(axis=0), gain * loaded.sum(axis=0), parts, gain)


def power_gain(electrode: Electrode, omega_per_ms: Floats) -> Floats:
    """(F,) |H|² of an electrode, with the share of the power that windows keep."""
    power = np.abs(electrode.gain(omega_per_ms)) ** 2
    if electrode.window_s is None:
        return power
    return power * kept_of_trend(0.5e3 * electrode.window_s * omega_per_ms, electrode.trend)


def recording(model: CableModel, site: str, tolerance: float = 1e-9) -> Recording:
    """See `CableModel.recording`."""
    here = model.electrode_at(site)
    others = tuple(one for one in model.electrodes if one.site != site)
    bare = replace(model, electrodes=(ideal(here),) if here.clamps else ())
    # first, so that a clamp's current is counted from the potential that it holds
    loaded = model if model.electrodes[:1] in ((), (here,)) else replace(model, electrodes=(here, *others))
    true_point, point = bare.refined.point, loaded.refined.point
    node = loaded.node_of(site)
    return Recording(
        model=loaded,
        bare=bare,
        electrode=here,
        true=_record(true_point, bare.node_of(site), bare.electrode_at(site), False, tolerance),
        loaded=_record(point, node, here, False, tolerance),
        recorded=_record(point, node, here, True, tolerance),
        input_resistance_MOhm=_shown_resistance_MOhm(point, node, here),
    )


def ideal(electrode: Electrode) -> Electrode:
    """The same kind of electrode without load, loss or filter."""
    return Electrode(site=electrode.site, mode=electrode.mode, holding_mV=electrode.holding_mV)


def _ohms2(electrode: Electrode) -> float:
    """What variances of the voltage are divided by for variances of the record."""
    return electrode.resistance_GOhm**2 if electrode.clamps else 1.0


def _record(point: OperatingPoint, node: int, electrode: Electrode, filtered: bool, tolerance: float) -> Record:
    over = _ohms2(electrode)
    mean = float(point.mean_mV[node])
    if electrode.clamps:
        mean = -float(point.deviation_mV[node]) / electrode.resistance_GOhm
    lost = filtered and not electrode.keeps_mean
    names = point.model.part_names
    if not names:
        return Record(math.nan if lost else mean, {}, 0.0, 0.0, 0.0)

    def spectra(omega: Floats) -> Floats:
        parts = cross_spectra(point, [node], 1j * omega)[:, 0, 0].real / over
        if filtered:
            parts = parts * np.abs(electrode.gain(omega)) ** 2
        return np.concatenate([parts, parts.sum(axis=0, keepdims=True) ** 2])

    def scale(integrals: Floats) -> Floats:
        return np.r_[np.full(len(names), integrals[:-1].sum()), integrals[-1]]

    degree = np.r_[np.ones(len(names), dtype=np.int64), 2]
    found = integral(point, [node], (electrode,) if filtered else (), spectra, degree, scale, tolerance)
    return Record(
        mean=math.nan if lost else mean,
        variance_by_input=dict(zip(names, found.value[:-1].tolist(), strict=True)),
        at_zero=float(found.at_zero[:-1].sum()),
        square=float(found.value[-1]),
        relative_error=found.relative_error,
    )


def _shown_resistance_MOhm(point: OperatingPoint, node: int, electrode: Electrode) -> float:
    network, left = point.network, (1 - electrode.bridge_balance) * electrode.resistance_GOhm
    if electrode.clamps:
        conductance = network.node_conductance_nS.copy()
        conductance[node] = _without_clamp_nS(point, node, electrode)
        network, left = replace(network, node_conductance_nS=conductance), electrode.resistance_GOhm
    inside = network.at(np.zeros(1)).input_impedance_GOhm()[node, 0].real
    return float(inside + left) * MOHM_PER_GOHM


def _without_clamp_nS(point: OperatingPoint, node: int, clamp: Electrode) -> float:
    """What is lumped at a node beside the clamp's conductance; summed anew, as a difference would lose it."""
    total = point.passive.node_leak_nS[node] + clamp.seal_nS
    for one, (_, at_nodes) in zip(point.model.inputs, point.numbers, strict=True):
        total += one.mean_conductance_nS * at_nodes[node]
    for other, place in point.model.electrode_places:
        if other != clamp and point.layout.node_at(place) == node:
            total += other.steady_load_nS
    return float(total)
