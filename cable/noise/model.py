"""A cell with its membrane, inputs and sites: the value from which every answer is computed."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from cable.noise.refinement import Refined, refine
from cable.theory.membrane import Membrane
from cable.theory.synapse import SynapticInput
from morphology import CellTree, Place, PlaceError, Site, Zone, ZonePart

if TYPE_CHECKING:
    from cable.noise.correlation import CorrelationMap
    from cable.noise.fluctuations import Fluctuations
    from cable.noise.modes import Modes
    from cable.noise.pairs import Pair
    from cable.noise.point_neuron import PointNeuron
    from cable.noise.sources import Sources
    from cable.noise.spectra import Spectrum

Floats = NDArray[np.float64]


class ModelError(ValueError):
    """Parts of a model that do not fit together; `key` says which, as in "input[1].where"."""

    def __init__(self, key: str, message: str) -> None:
        super().__init__(f"{key}: {message}")
        self.key, self.message = key, message


@dataclass(frozen=True, eq=False)
class CableModel:
    """A passive dendritic tree under synaptic bombardment.

    Attributes:
        tree: the reconstruction.
        membrane: its passive constants.
        inputs: the populations of synapses.
        sites: named points; "soma" is always the first site and need not be given.
        threshold_mV: the level whose upcrossings are counted, if any.
        title: a title for tables and figures.

    Raises:
        ModelError: a name used twice, a zone that selects nothing, a site that names no place or several.
    """

    tree: CellTree
    membrane: Membrane
    inputs: tuple[SynapticInput, ...] = ()
    sites: tuple[Site, ...] = ()
    threshold_mV: float | None = None
    title: str = ""

    def __post_init__(self) -> None:
        object.__setattr__(self, "inputs", tuple(self.inputs))
        object.__setattr__(self, "sites", tuple(self.sites))
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

    @property
    def parts(self) -> list[ZonePart]:
        """All resolved zones, whose limits cut the cell."""
        return self.membrane_parts + [part for part in self.input_parts if part is not None]

    @property
    def places(self) -> list[Place]:
        """All places that must be nodes."""
        return list(self.site_places.values()) + [place for places in self.input_places for place in places]

    def node_of(self, site: str) -> int:
        """The network node of a named site.

        Raises:
            KeyError: the model has no such site.
        """
        if site not in self.site_places:
            raise KeyError(f"no site {site!r}; the sites are {', '.join(self.site_names)}")
        return self.refined.point.layout.node_at(self.site_places[site])

    @cached_property
    def refined(self) -> Refined:
        """The operating point on a converged layout."""
        return refine(self)

    def fluctuations(self, tolerance: float = 1e-9) -> Fluctuations:
        """Mean, variance and what follows from them at every point of the tree and every site.

        Args:
            tolerance: relative error of each variance that the frequency integral is certified to.

        Raises:
            NotConverged: the tolerance cannot be reached.
        """
        from cable.noise.fluctuations import fluctuations

        return fluctuations(self, tolerance)

    def spectrum(self, site: str, frequency_Hz: Floats, to: str | None = None) -> Spectrum:
        """One-sided spectrum of the voltage at a site, in all and by input, and impedances, at frequencies (F,), Hz.

        Args:
            site: name of the site.
            frequency_Hz: (F,) frequencies, at least 0.
            to: another site, for the transfer impedance.

        Raises:
            KeyError: the model has no such site.
        """
        from cable.noise.spectra import spectrum

        return spectrum(self, site, frequency_Hz, to)

    def pair(self, a: str, b: str, lag_ms: Floats, frequency_Hz: Floats, tolerance: float = 1e-9) -> Pair:
        """Covariance of two sites at lags (L,), ms, and their coherence and phase at frequencies (F,), Hz.

        Args:
            a, b: names of the sites; positive lags mean that b is later.
            lag_ms: (L,) lags.
            frequency_Hz: (F,) frequencies, at least 0.
            tolerance: certified error of every covariance, relative to the geometric mean of the variances.

        Raises:
            KeyError: the model has no such site.
            NotConverged: the tolerance cannot be reached.
        """
        from cable.noise.pairs import pair

        return pair(self, a, b, lag_ms, frequency_Hz, tolerance)

    def correlation_map(self, site: str, tolerance: float = 1e-6) -> CorrelationMap:
        """Correlation, and lag, of every point of the tree with a site.

        Raises:
            KeyError: the model has no such site.
            NotConverged: the tolerance cannot be reached.
        """
        from cable.noise.correlation import correlation_map

        return correlation_map(self, site, tolerance)

    def sources(self, site: str, tolerance: float = 1e-9) -> Sources:
        """Which cylinders and inputs make the variance and the mean at a site.

        Raises:
            KeyError: the model has no such site.
            NotConverged: the tolerance cannot be reached.
        """
        from cable.noise.sources import sources

        return sources(self, site, tolerance)

    def modes(self, count: int = 10, seed: int = 0, tolerance: float = 1e-6) -> Modes:
        """The leading modes of the voltage's covariance over the membrane.

        Raises:
            ValueError: fewer than one mode, or as many as the network has nodes.
            NotConverged: the tolerance cannot be reached.
        """
        from cable.noise.modes import modes

        return modes(self, count, seed, tolerance)

    def point_neuron(self, site: str = "soma") -> PointNeuron:
        """The equivalent point neuron at a site.

        Raises:
            KeyError: the model has no such site.
            NotConverged: the autocovariance cannot be certified, as with dead times.
        """
        from cable.noise.point_neuron import point_neuron

        return point_neuron(self, site)

    def correlation_matrix(self, tolerance: float = 1e-9) -> Floats:
        """(S, S) correlations at lag 0 between all sites, in the order of `site_names`."""
        from cable.noise.pairs import correlation_matrix

        return correlation_matrix(self, tolerance)
