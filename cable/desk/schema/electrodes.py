"""[[electrode]]: a pipette at a site, its amplifier's mode and filters, and what the analysis takes off."""

from __future__ import annotations

from typing import Annotated, Any, Literal, Self

from pydantic import BeforeValidator, Field, model_validator

from cable.desk.schema.base import Name, NotNegative, Number, Positive, Section, spoken
from cable.theory.electrode import CURRENT_CLAMP, ONLY_IN, Electrode
from cable.theory.filters import MAX_CORNER_HZ, MAX_ORDER, LowPass

Share = Annotated[float, Field(ge=0, le=1)]


class FilterSection(Section):
    """The amplifier's low-pass filter."""

    family: Annotated[Literal["bessel", "butterworth"], BeforeValidator(spoken)] = Field(
        description="the filter's family"
    )
    order: int = Field(ge=1, le=MAX_ORDER, description="number of poles")
    corner_Hz: float = Field(gt=0, le=MAX_CORNER_HZ, description="where the power has fallen to one half, Hz")

    def low_pass(self) -> LowPass:
        """The filter of `cable`."""
        return LowPass(self.family, self.order, self.corner_Hz)


def _share(balance: object) -> object:
    return float(balance) if isinstance(balance, bool) else balance


class ElectrodeSection(Section):
    """One electrode; which keys go together depends on its mode."""

    site: Name = Field(description='a site of this scenario, or "soma"')
    mode: Annotated[Literal["current clamp", "voltage clamp"], BeforeValidator(spoken)] = Field(
        default="current clamp", description="the amplifier's mode"
    )
    series_resistance_MOhm: NotNegative = Field(default=0.0, description="from the site to the amplifier, MΩ")
    pipette_capacitance_pF: NotNegative | None = Field(default=None, description="after neutralisation, pF")
    seal_GOhm: Positive | None = Field(default=None, description="resistance of the seal, GΩ")
    bridge_balance: Annotated[Share, BeforeValidator(_share)] | None = Field(
        default=None, description="share of the series resistance that the bridge takes off"
    )
    compensation: Share | None = Field(default=None, description="share of the series resistance compensated")
    holding_mV: Number | None = Field(default=None, description="the potential that is held, mV")
    filter: FilterSection | None = Field(
        default=None, description='such as { family = "bessel", order = 4, corner_Hz = 3000 }'
    )
    high_pass_Hz: Positive | None = Field(default=None, description="corner of AC coupling, Hz")
    window_s: Positive | None = Field(default=None, description="windows from which a trend is taken off, s")
    trend: Annotated[Literal["mean", "line"], BeforeValidator(spoken)] | None = Field(
        default=None, description="what is taken off each window"
    )

    @model_validator(mode="after")
    def _goes_together(self) -> Self:
        for name, (mode, reason) in ONLY_IN.items():
            if self.mode != mode and getattr(self, name) is not None:
                raise ValueError(f"found {name}, which means nothing in {self.mode}, where {reason}; take it out")
        if self.mode != CURRENT_CLAMP and self.holding_mV is None:
            raise ValueError("found a voltage clamp without holding_mV, expected the potential that it holds; add it")
        if self.trend is not None and self.window_s is None:
            raise ValueError("found trend without window_s, expected both; add window_s or take trend out")
        return self

    def electrode(self) -> Electrode:
        """The electrode of `cable`."""
        given: dict[str, Any] = {
            name: getattr(self, name) for name in type(self).model_fields if getattr(self, name) is not None
        }
        if self.filter is not None:
            given["low_pass"] = self.filter.low_pass()
        given.pop("filter", None)
        return Electrode(**given)
