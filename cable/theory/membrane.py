"""The passive membrane and axoplasm: specific constants of a neurite."""

from __future__ import annotations

import math
from dataclasses import dataclass, fields
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from morphology import Zone


def check_positive(value: float, name: str) -> None:
    """Raise ValueError unless `value` is a finite number above zero."""
    if not (math.isfinite(value) and value > 0):
        raise ValueError(f"{name}: expected a finite number above 0, found {value!r}")


@dataclass(frozen=True, kw_only=True)
class MembraneZone:
    """Values that differ inside one zone; None leaves a value as it is outside.

    Attributes: as in `Membrane`, and `where`, the zone.
    """

    where: Zone
    axial_resistivity_ohm_cm: float | None = None
    capacitance_uF_cm2: float | None = None
    resistance_ohm_cm2: float | None = None
    rest_mV: float | None = None
    spine_factor: float | None = None

    def __post_init__(self) -> None:
        for name in MEMBRANE_VALUES:
            value = getattr(self, name)
            if value is not None and name != "rest_mV":
                check_positive(value, name)
        if all(getattr(self, name) is None for name in MEMBRANE_VALUES):
            raise ValueError(f"a membrane zone must set at least one of {', '.join(MEMBRANE_VALUES)}")


@dataclass(frozen=True, kw_only=True)
class Membrane:
    """Specific passive constants, the same everywhere except in `zones` (later ones win).

    Attributes:
        axial_resistivity_ohm_cm: axial resistivity R_i, Ω·cm.
        capacitance_uF_cm2: specific membrane capacitance C_m, µF/cm².
        resistance_ohm_cm2: specific membrane resistance R_m, Ω·cm².
        rest_mV: reversal potential of the leak, which is the rest of the cell without input, mV.
        spine_factor: membrane area per bare area; multiplies leak and capacitance (Holmes 1989, Brain Res
            478:127; from memory).
        zones: overrides.

    Raises:
        ValueError: a constant that is not a finite number above zero.
    """

    axial_resistivity_ohm_cm: float
    capacitance_uF_cm2: float
    resistance_ohm_cm2: float
    rest_mV: float
    spine_factor: float = 1.0
    zones: tuple[MembraneZone, ...] = ()

    def __post_init__(self) -> None:
        for name in MEMBRANE_VALUES:
            if name != "rest_mV":
                check_positive(getattr(self, name), name)
        if not math.isfinite(self.rest_mV):
            raise ValueError(f"rest_mV: expected a finite number, found {self.rest_mV!r}")

    @property
    def time_constant_ms(self) -> float:
        """Membrane time constant R_m·C_m outside the zones, ms."""
        return self.resistance_ohm_cm2 * self.capacitance_uF_cm2 * 1e-3

    def length_constant_um(self, diameter_um: float) -> float:
        """Length constant λ = √(R_m·d/(4·R_i)) of a long cylinder, µm (Rall 1977; from memory)."""
        return math.sqrt(self.resistance_ohm_cm2 / self.axial_resistivity_ohm_cm * 1e4 * diameter_um / 4)


MEMBRANE_VALUES = tuple(f.name for f in fields(Membrane) if f.name != "zones")
