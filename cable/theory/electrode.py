"""One pipette and its amplifier as a circuit.

                 R_s
    site o---+--/\\/\\/--+---o amplifier -> low-pass -> high-pass -> record
             |          |
           seal        C_p
             |          |
           bath        bath

In current clamp no current flows into the amplifier's input: the site is loaded with iωC_p/(1 + iωR_sC_p) and the
amplifier reads V_site/(1 + iωR_sC_p). C_p is the pipette's capacitance that neutralisation has left.

In voltage clamp the amplifier holds its side of R_s at a constant potential and charges C_p itself, so that the
site is loaded with the resistance that compensation has left of R_s, and the record is the current through it.

The seal, where it is given, is an unselective leak from the site to the bath: it reverses at 0 mV.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from cable.theory.filters import TRENDS, LowPass, high_pass
from cable.theory.membrane import check_positive
from cable.theory.units import MOHM_PER_GOHM, OMEGA_PER_MS_PER_HZ

Floats = NDArray[np.float64]
Complexes = NDArray[np.complex128]
CURRENT_CLAMP, VOLTAGE_CLAMP = "current clamp", "voltage clamp"
SEAL_REVERSAL_MV = 0.0
IDEAL_GOHM = 1e-12  # what an ideal clamp has left: 1 mΩ, beside which every cell is an open circuit
ONLY_IN = {
    "pipette_capacitance_pF": (CURRENT_CLAMP, "the amplifier charges it"),
    "bridge_balance": (CURRENT_CLAMP, "there is no bridge"),
    "holding_mV": (VOLTAGE_CLAMP, "nothing is held"),
    "compensation": (VOLTAGE_CLAMP, "the bridge does it; use bridge_balance"),
}
USUAL = {"pipette_capacitance_pF": 0.0, "bridge_balance": 1.0, "holding_mV": None, "compensation": 0.0}


@dataclass(frozen=True, kw_only=True)
class Electrode:
    """A pipette at a site, in current or voltage clamp, with the filters of its amplifier and of the analysis.

    Attributes:
        site: name of the site.
        mode: "current clamp" or "voltage clamp".
        series_resistance_MOhm: R_s from the site to the amplifier's input, MΩ.
        pipette_capacitance_pF: C_p at the amplifier's side, after neutralisation, pF (current clamp only).
        seal_GOhm: resistance of the seal, GΩ; None for a perfect one.
        bridge_balance: share of R_s that the bridge takes off where current is injected, 0 to 1 (current
            clamp only). It changes the input resistance that the amplifier shows, not the record of noise.
        compensation: share of R_s that is compensated, 0 to 1 (voltage clamp only).
        holding_mV: the potential that is held, mV (voltage clamp, which needs it).
        low_pass: the amplifier's filter, if any.
        high_pass_Hz: corner of an RC high-pass filter (AC coupling), Hz, if any.
        window_s: length of the windows from each of which a trend is taken off, s, if any.
        trend: what is taken off: the window's "mean", or the "line" fitted to it.

    Raises:
        ValueError: a value outside its limits, or one that means nothing in this mode.
    """

    site: str
    mode: str = CURRENT_CLAMP
    series_resistance_MOhm: float = 0.0
    pipette_capacitance_pF: float = 0.0
    seal_GOhm: float | None = None
    bridge_balance: float = 1.0
    compensation: float = 0.0
    holding_mV: float | None = None
    low_pass: LowPass | None = None
    high_pass_Hz: float | None = None
    window_s: float | None = None
    trend: str = "mean"

    def __post_init__(self) -> None:
        if self.mode not in (CURRENT_CLAMP, VOLTAGE_CLAMP):
            raise ValueError(f'mode: found {self.mode!r}, expected "{CURRENT_CLAMP}" or "{VOLTAGE_CLAMP}"')
        for name in ("series_resistance_MOhm", "pipette_capacitance_pF"):
            value = getattr(self, name)
            if not (math.isfinite(value) and value >= 0):
                raise ValueError(f"{name}: expected a finite number of at least 0, found {value!r}")
        for name in ("seal_GOhm", "high_pass_Hz", "window_s"):
            if getattr(self, name) is not None:
                check_positive(getattr(self, name), name)
        for name in ("bridge_balance", "compensation"):
            if not 0.0 <= getattr(self, name) <= 1.0:
                raise ValueError(f"{name}: expected a share from 0 to 1, found {getattr(self, name)!r}")
        for name, (mode, reason) in ONLY_IN.items():
            if self.mode != mode and getattr(self, name) != USUAL[name]:
                raise ValueError(f"{name}: means nothing in {self.mode}, where {reason}; take it out")
        if self.clamps and (self.holding_mV is None or not math.isfinite(self.holding_mV)):
            found = "nothing" if self.holding_mV is None else repr(self.holding_mV)
            raise ValueError(f"holding_mV: found {found}, expected the potential that is held, mV; add it")
        if self.trend not in TRENDS:
            raise ValueError(f'trend: found {self.trend!r}, expected "mean" or "line"')
        if self.trend != "mean" and self.window_s is None:
            raise ValueError("trend: goes with window_s, found it alone; add window_s or take it out")

    @property
    def clamps(self) -> bool:
        """Whether it holds the site's voltage."""
        return self.mode == VOLTAGE_CLAMP

    @property
    def unit(self) -> str:
        """The unit of the record."""
        return "pA" if self.clamps else "mV"

    @property
    def resistance_GOhm(self) -> float:
        """R_s of a current clamp; of a voltage clamp what compensation has left of it, GΩ."""
        if not self.clamps:
            return self.series_resistance_MOhm / MOHM_PER_GOHM
        return max((1 - self.compensation) * self.series_resistance_MOhm / MOHM_PER_GOHM, IDEAL_GOHM)

    @property
    def time_constant_ms(self) -> float:
        """R_s·C_p, ms."""
        return self.resistance_GOhm * self.pipette_capacitance_pF

    @property
    def seal_nS(self) -> float:
        """Conductance of the seal."""
        return 0.0 if self.seal_GOhm is None else 1 / self.seal_GOhm

    @property
    def steady_load_nS(self) -> float:
        """Conductance from the site to ground at zero frequency: the seal, and a clamp's resistance."""
        return self.seal_nS + (1 / self.resistance_GOhm if self.clamps else 0.0)

    def steady_current_pA(self, reference_mV: float) -> float:
        """Current into the site at `reference_mV`, from the seal and from a clamp."""
        seal = self.seal_nS * (SEAL_REVERSAL_MV - reference_mV)
        return seal + (0.0 if self.holding_mV is None else (self.holding_mV - reference_mV) / self.resistance_GOhm)

    @property
    def poles_per_ms(self) -> tuple[complex, ...]:
        """The p > 0 or complex for which the gain has a pole at iω = -p."""
        poles: list[complex] = [] if self.time_constant_ms == 0 else [1 / self.time_constant_ms]
        poles += [] if self.low_pass is None else self.low_pass.poles_per_ms
        return (*poles, *([] if self.high_pass_Hz is None else [self.high_pass_Hz * OMEGA_PER_MS_PER_HZ]))

    def gain(self, omega_per_ms: Floats) -> Complexes:
        """Complex gain at ω (...), rad/ms, from the site's voltage (or the clamp's current) to the filtered record."""
        omega = np.asarray(omega_per_ms, dtype=float)
        gain = 1 / (1 + 1j * omega * self.time_constant_ms)
        if self.low_pass is not None:
            gain = gain * self.low_pass.response(omega)
        return gain if self.high_pass_Hz is None else gain * high_pass(omega, self.high_pass_Hz)

    @property
    def keeps_mean(self) -> bool:
        """Whether the record still has the mean."""
        return self.high_pass_Hz is None and self.window_s is None
