"""The sections of a scenario beside its inputs, and the whole of it.

Values become those of `cable` and `morphology` here; what needs the cell itself is checked in `scenario`.
"""

from __future__ import annotations

from typing import Self

from pydantic import Field, model_validator

from cable.desk.messages import choices
from cable.desk.schema.base import Kind, Name, Number, Positive, Repair, Section
from cable.desk.schema.electrodes import ElectrodeSection
from cable.desk.schema.inputs import InputSection
from cable.desk.schema.places import AtSection, ZoneSection
from cable.theory.membrane import MEMBRANE_VALUES, Membrane, MembraneZone


class Shrinkage(Section):
    """Factors from measured to living size."""

    xy: Positive = Field(default=1.0, description="living size over measured size in x and y")
    z: Positive = Field(default=1.0, description="living size over measured size in z")


class Cell(Section):
    """[cell]"""

    morphology: str = Field(min_length=1, max_length=1000, description="the SWC file, relative to the scenario")
    omit: list[Kind] = Field(default=[], description="kinds left out of the electrical model")
    repairs: list[Repair] = Field(default=[], description="named repairs")
    shrinkage: Shrinkage = Field(default=Shrinkage(), description="{ xy = 1.0, z = 1.0 }")


class MembraneZoneSection(Section):
    """[[membrane.zone]]"""

    where: ZoneSection = Field(description="the filters of the zone")
    axial_resistivity_ohm_cm: Positive | None = Field(default=None, description="axial resistivity, Ω cm")
    capacitance_uF_cm2: Positive | None = Field(default=None, description="specific capacitance, µF/cm²")
    resistance_ohm_cm2: Positive | None = Field(default=None, description="specific membrane resistance, Ω cm²")
    rest_mV: Number | None = Field(default=None, description="resting potential, mV")
    spine_factor: Positive | None = Field(default=None, description="membrane area per bare area")

    @model_validator(mode="after")
    def _sets_something(self) -> Self:
        if all(getattr(self, name) is None for name in MEMBRANE_VALUES):
            raise ValueError(f"found no value that differs here, expected at least one of {choices(MEMBRANE_VALUES)}")
        return self

    def membrane_zone(self) -> MembraneZone:
        """The zone of `cable`, which still knows only filters."""
        return MembraneZone(where=self.where.zone(), **{name: getattr(self, name) for name in MEMBRANE_VALUES})


class MembraneSection(Section):
    """[membrane]"""

    axial_resistivity_ohm_cm: Positive = Field(description="axial resistivity, Ω cm")
    capacitance_uF_cm2: Positive = Field(description="specific capacitance, µF/cm²")
    resistance_ohm_cm2: Positive = Field(description="specific membrane resistance, Ω cm²")
    rest_mV: Number = Field(description="resting potential, mV")
    spine_factor: Positive = Field(default=1.0, description="membrane area per bare area")
    zone: list[MembraneZoneSection] = Field(default=[], description="sections [[membrane.zone]]")

    def membrane(self) -> Membrane:
        """The membrane of `cable`."""
        values = {name: getattr(self, name) for name in MEMBRANE_VALUES}
        return Membrane(**values, zones=tuple(z.membrane_zone() for z in self.zone))


class SiteSection(Section):
    """[[site]]"""

    name: Name
    at: AtSection = Field(description="such as { swc_id = 231 }, or a path_um with filters")


class Threshold(Section):
    """[threshold]"""

    level_mV: Number = Field(description="the level that counts as near a spike, mV")


class Document(Section):
    """A whole scenario."""

    title: str = Field(default="", description="a title")
    cell: Cell = Field(description="the section [cell]")
    membrane: MembraneSection = Field(description="the section [membrane]")
    input: list[InputSection] = Field(default=[], description="sections [[input]]")
    site: list[SiteSection] = Field(default=[], description="sections [[site]]")
    electrode: list[ElectrodeSection] = Field(default=[], description="sections [[electrode]]")
    threshold: Threshold | None = Field(default=None, description="the section [threshold]")
