"""A cell with its membrane, inputs, sites and electrodes, checked, and resolved to places on its tree."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property

from cable.network.layout import lay_out
from cable.theory.electrode import Electrode
from cable.theory.membrane import Membrane
from cable.theory.sharing import SHARED, SharingError, correlations
from cable.theory.synapse import SynapticInput
from morphology import CellTree, Place, PlaceError, Site, Zone, ZonePart


class ModelError(ValueError):
    """Parts of a model that do not fit together; `key` says which, as in "input[1].where"."""

    def __init__(self, key: str, message: str) -> None:
        super().__init__(f"{key}: {message}")
        self.key, self.message = key, message


@dataclass(frozen=True, eq=False)
class CellSetup:
    """What a model is made of; see `cable.noise.model.CableModel`, which answers for it."""

    tree: CellTree
    membrane: Membrane
    inputs: tuple[SynapticInput, ...] = ()
    sites: tuple[Site, ...] = ()
    threshold_mV: float | None = None
    title: str = ""
    electrodes: tuple[Electrode, ...] = ()

    def __post_init__(self) -> None:
        object.__setattr__(self, "inputs", tuple(self.inputs))
        object.__setattr__(self, "sites", tuple(self.sites))
        object.__setattr__(self, "electrodes", tuple(self.electrodes))
        for key, names in (
            ("input", [i.name for i in self.inputs]),
            ("site", ["soma", *(s.name for s in self.sites)]),
        ):
            for index, name in enumerate(names):
                if name in names[:index]:
                    place = index - 1 if key == "site" else index
                    extra = " (soma is always a site)" if key == "site" and name == "soma" else ""
                    raise ModelError(f"{key}[{place}].name", f"the name {name!r} is used twice{extra}; choose another")
        self.membrane_parts, self.input_parts, self.input_places, self.site_places  # noqa: B018 - checks them now
        try:
            correlations(self.inputs)
        except SharingError as error:
            entry = f"[{error.entry}]" if error.entry >= 0 else ""
            raise ModelError(f"input[{error.index}].shares{entry}", error.message) from None
        self._check_electrodes()

    def _part(self, zone: Zone, key: str) -> ZonePart:
        try:
            part = zone.resolve(self.tree)
        except PlaceError as error:
            raise ModelError(f"{key}.subtree_of", str(error)) from None
        if part.empty:
            raise ModelError(key, "the zone selects nothing of this cell; widen its ranges or check its kinds")
        return part

    def _place(self, site: Site, key: str) -> Place:
        try:
            return site.resolve(self.tree)
        except PlaceError as error:
            raise ModelError(key, str(error)) from None

    @cached_property
    def membrane_parts(self) -> list[ZonePart]:
        """The membrane's zones, resolved."""
        return [self._part(zone.where, f"membrane.zone[{k}].where") for k, zone in enumerate(self.membrane.zones)]

    @cached_property
    def input_parts(self) -> list[ZonePart | None]:
        """Each input's zone, resolved; None for point synapses."""
        parts: list[ZonePart | None] = []
        for k, one in enumerate(self.inputs):
            part = None if one.where is None else self._part(one.where, f"input[{k}].where")
            if part is not None and not one.by_area and not (part.high > part.low).any():
                density = "density_per_um2" if one.count is None else 'spread = "area"'
                raise ModelError(
                    f"input[{k}].where",
                    f"the zone holds only a one-point soma, which has no length; use {density}",
                )
            parts.append(part)
        return parts

    @cached_property
    def input_places(self) -> list[list[Place]]:
        """Each input's point synapses, resolved."""
        return [
            [self._place(p.site, f"input[{k}].at[{j}]") for j, p in enumerate(one.at)]
            for k, one in enumerate(self.inputs)
        ]

    @cached_property
    def site_places(self) -> dict[str, Place]:
        """Every site's place, "soma" first."""
        places = {"soma": Place(self.tree.shape.soma)}
        return places | {site.name: self._place(site, f"site[{k}].at") for k, site in enumerate(self.sites)}

    @property
    def site_names(self) -> tuple[str, ...]:
        """Names of all sites, "soma" first."""
        return tuple(self.site_places)

    def _check_electrodes(self) -> None:
        for k, one in enumerate(self.electrodes):
            key, before = f"electrode[{k}].site", self.electrodes[:k]
            if one.site not in self.site_places:
                known = ", ".join(self.site_names)
                raise ModelError(key, f"found {one.site!r}, expected a site: {known}; correct it, or add a [[site]]")
            if any(other.site == one.site for other in before):
                raise ModelError(
                    key, f"found a second electrode at {one.site!r}, expected one; name another [[site]] at the place"
                )
            rivals = [other.site for other in before if other.clamps and one.clamps]
            if rivals:
                layout = lay_out(self.tree, self.parts, self.places)
                here = layout.node_at(self.site_places[one.site])
                rivals = [name for name in rivals if layout.node_at(self.site_places[name]) == here]
            if rivals:
                raise ModelError(
                    key,
                    f"found a voltage clamp where {rivals[0]!r} is one already, expected one clamp a place; "
                    "two would drive current through each other; move one or make it a current clamp",
                )

    @property
    def electrode_places(self) -> list[tuple[Electrode, Place]]:
        """Every electrode with its place."""
        return [(one, self.site_places[one.site]) for one in self.electrodes]

    @property
    def reference_mV(self) -> float:
        """The potential from which voltages count inside: what the first clamp holds, or else the rest.

        Beside a clamp the current through it follows from a small difference to the potential that is held.
        """
        held = [one.holding_mV for one in self.electrodes if one.holding_mV is not None]
        return float(held[0] if held else self.membrane.rest_mV)

    @property
    def part_names(self) -> tuple[str, ...]:
        """What a variance or spectrum is a sum of: the inputs and, where some share spikes, "shared".

        The last is what the shared spikes add to the inputs by themselves; half of it belongs to either of the two
        inputs of each pair. It is negative where excitation and inhibition share spikes.
        """
        sharing = any(one.fraction > 0 for population in self.inputs for one in population.shares)
        return tuple(one.name for one in self.inputs) + (SHARED,) * sharing

    @property
    def parts(self) -> list[ZonePart]:
        """All resolved zones, whose limits cut the cell."""
        return self.membrane_parts + [part for part in self.input_parts if part is not None]

    @property
    def places(self) -> list[Place]:
        """All places that must be nodes."""
        return list(self.site_places.values()) + [place for places in self.input_places for place in places]
