"""How a scenario says a part of the cell (`where`) and a point of it (`at`)."""

from __future__ import annotations

from typing import Any, Literal, Self

from pydantic import Field, model_validator

from cable.desk.messages import choices
from cable.desk.schema.base import Kind, NotNegative, Positive, Range, Section
from morphology import Site, Zone

FILTERS = ("kinds", "branch_order", "radius_um", "height_um", "height_axis", "subtree_of")


class Filters(Section):
    """The filters that a zone and a site share; all that are given must hold."""

    kinds: list[Kind] | None = Field(
        default=None, min_length=1, description="kinds such as basal, apical, or SWC codes"
    )
    branch_order: Range | None = Field(default=None, description="[from, to], branch points passed from the root")
    radius_um: Range | None = Field(default=None, description="[from, to], µm")
    height_um: Range | None = Field(default=None, description="[from, to] from the soma along height_axis, µm")
    height_axis: Literal["x", "y", "z"] = Field(default="y", description="the axis of height_um")
    subtree_of: int | None = Field(default=None, description="an SWC id")

    def filters(self) -> dict[str, Any]:
        """The filters by name, as `morphology.Zone` takes them."""
        given = {name: getattr(self, name) for name in FILTERS}
        return {k: tuple(v) if isinstance(v, list) else v for k, v in given.items()}


class ZoneSection(Filters):
    """`where`: a part of the cell."""

    path_um: Range | None = Field(default=None, description="[from, to] along the tree from the root, µm")

    def zone(self) -> Zone:
        """The zone of `morphology`."""
        return Zone(**self.filters(), path_um=(self.path_um[0], self.path_um[1]) if self.path_um else None)


class AtSection(Filters):
    """`at` of a site: an SWC id with a fraction, or one path distance with filters."""

    swc_id: int | None = Field(default=None, description="an SWC id")
    fraction: float = Field(default=1.0, ge=0, le=1, description="0 at the parent of the point, 1 at the point")
    path_um: NotNegative | None = Field(default=None, description="one distance from the root, µm")

    @model_validator(mode="after")
    def _one_way(self) -> Self:
        if (self.swc_id is None) == (self.path_um is None):
            found = "neither" if self.swc_id is None else "both"
            raise ValueError(f"found {found} of swc_id and path_um, expected one of them (path_um with filters)")
        unused = set(FILTERS) if self.swc_id is not None else {"fraction"}
        extra = sorted(unused & self.model_fields_set)
        if extra:
            by = "swc_id" if self.swc_id is not None else "path_um"
            raise ValueError(f"found {choices(extra, 'and')}, which means nothing beside {by}; take it out")
        return self

    def site(self, name: str) -> Site:
        """The site of `morphology`."""
        return Site(
            name,
            swc_id=self.swc_id,
            fraction=self.fraction,
            path_um=self.path_um,
            zone=Zone(**self.filters()),
        )


class PlacedSection(AtSection):
    """One entry of `at` of an input: a place and how many synapses stand there."""

    number: Positive = Field(default=1.0, description="synapses at this place")
