"""The model, from which every answer is computed: what can be asked of it. `cell_setup` is what it is made of."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from cable.noise.cell_setup import CellSetup, ModelError
from cable.noise.refinement import Refined, refine
from cable.theory.electrode import Electrode

if TYPE_CHECKING:
    from cable.noise.beyond.next_order import NextOrder
    from cable.noise.beyond.next_pair import NextPair
    from cable.noise.correlation import CorrelationMap
    from cable.noise.excursions import Excursions
    from cable.noise.fluctuations import Fluctuations
    from cable.noise.modes import Modes
    from cable.noise.pairs import Pair
    from cable.noise.point_neuron import PointNeuron
    from cable.noise.record.clamp import ClampShares
    from cable.noise.record.recorded_pair import RecordedPair
    from cable.noise.record.recordings import Recording
    from cable.noise.small_fluctuation import SmallFluctuation
    from cable.noise.sources import Sources
    from cable.noise.spectra import Spectrum

__all__ = ["CableModel", "ModelError"]

Floats = NDArray[np.float64]


@dataclass(frozen=True, eq=False)
class CableModel(CellSetup):
    """A passive dendritic tree under synaptic bombardment.

    Attributes:
        tree: the reconstruction.
        membrane: its passive constants.
        inputs: the populations of synapses.
        sites: named points; "soma" is always the first site and need not be given.
        threshold_mV: the level whose upcrossings are counted, if any.
        title: a title for tables and figures.
        electrodes: pipettes, each at a site of its own; all of them load the cell.

    Raises:
        ModelError: a name used twice, a zone that selects nothing, a site that names no place or several,
            electrodes that share a site or have none.
    """

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

    def next_order(self, tolerance: float = 1e-9) -> NextOrder:
        """Mean and SD to the next order beyond the linear theory at every point and site, beside the linear answer.

        Args:
            tolerance: of the linear variances, as in `fluctuations`.

        Raises:
            NotKnown: conductances whose spikes are correlated.
            NotConverged: the tolerance cannot be reached.
        """
        from cable.noise.beyond.next_order import next_order

        return next_order(self, tolerance)

    def next_psd(self, site: str, frequency_Hz: Floats) -> Floats:
        """(F,) one-sided spectrum of the voltage at a site to the next order, mV²/Hz, at frequencies (F,), Hz.

        Raises:
            KeyError: the model has no such site.
            NotKnown: conductances whose spikes are correlated.
        """
        from cable.noise.beyond.next_pair import next_psd

        return next_psd(self, site, frequency_Hz)

    def next_pair(self, linear: Pair) -> NextPair:
        """What two electrodes share to the next order, at the lags and frequencies of the linear answer.

        Raises:
            NotKnown: conductances whose spikes are correlated.
        """
        from cable.noise.beyond.next_pair import next_pair

        return next_pair(self, linear)

    def small_fluctuation(self, sites: tuple[str, ...] | None = None) -> SmallFluctuation:
        """How far sites (all of them unless named) are from small fluctuations, which the linear theory assumes.

        Raises:
            KeyError: the model has no such site.
        """
        from cable.noise.small_fluctuation import small_fluctuation

        return small_fluctuation(self, self.site_names if sites is None else tuple(sites))

    def spectrum(self, site: str, frequency_Hz: Floats | None = None, to: str | None = None) -> Spectrum:
        """One-sided spectrum of the voltage at a site, in all and by input, and impedances, at frequencies (F,), Hz.

        Args:
            site: name of the site.
            frequency_Hz: (F,) frequencies, at least 0; unless given, 61 from 0.1 to 1000 Hz.
            to: another site, for the transfer impedance.

        Raises:
            KeyError: the model has no such site.
            ValueError: a negative frequency.
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
            ValueError: fewer than one mode, more than the network has nodes, or nothing that fluctuates.
            NotConverged: the tolerance cannot be reached.
        """
        from cable.noise.modes import modes

        return modes(self, count, seed, tolerance)

    def electrode_at(self, site: str) -> Electrode:
        """The electrode at a site; where there is none, an ideal one that neither loads nor filters.

        Raises:
            KeyError: the model has no such site.
        """
        if site not in self.site_places:
            raise KeyError(f"no site {site!r}; the sites are {', '.join(self.site_names)}")
        return next((one for one in self.electrodes if one.site == site), Electrode(site=site))

    def recording(self, site: str, tolerance: float = 1e-9) -> Recording:
        """What the electrode at a site records, beside what is true, and how exact a record of some length is.

        Raises:
            KeyError: the model has no such site.
            NotConverged: the tolerance cannot be reached.
        """
        from cable.noise.record.recordings import recording

        return recording(self, site, tolerance)

    def recorded_pair(self, a: str, b: str, tolerance: float = 1e-9) -> RecordedPair:
        """The correlation of the records at two sites beside the true one, and how exact a record of it is.

        Raises:
            KeyError: the model has no such site.
            ValueError: one site twice, or windows that differ.
            NotConverged: the tolerance cannot be reached.
        """
        from cable.noise.record.recorded_pair import recorded_pair

        return recorded_pair(self, a, b, tolerance)

    def clamp_shares(self, site: str, tolerance: float = 1e-9) -> ClampShares:
        """What the voltage clamp at a site sees of the synapses' charge and noise, and of the membrane.

        Raises:
            KeyError: the model has no such site.
            ValueError: the electrode there is no voltage clamp.
            NotConverged: the tolerance cannot be reached.
        """
        from cable.noise.record.clamp import clamp_shares

        return clamp_shares(self, site, tolerance)

    def excursions(
        self, sites: tuple[str, ...] | None = None, level_mV: float | None = None, tolerance: float = 1e-9
    ) -> tuple[Excursions, ...]:
        """Skewness and kurtosis of the voltage at sites (all of them unless named), and excursions beyond a level.

        Args:
            sites: names of the sites.
            level_mV: the level, mV; None for the model's threshold, if it has one.
            tolerance: relative error of the variances.

        Raises:
            KeyError: the model has no such site.
            ValueError: a level that is no finite number.
            NotConverged: the tolerance cannot be reached.
        """
        from cable.noise.excursions import excursions

        return excursions(self, self.site_names if sites is None else tuple(sites), level_mV, tolerance)

    def point_neuron(self, site: str = "soma") -> PointNeuron:
        """The equivalent point neuron at a site.

        Raises:
            KeyError: the model has no such site.
            NotConverged: the autocovariance cannot be certified.
        """
        from cable.noise.point_neuron import point_neuron

        return point_neuron(self, site)

    def _repr_html_(self) -> str:
        """The model as a notebook shows it."""
        from cable.noise.cards import model_card

        return model_card(self)

    def correlation_matrix(self, tolerance: float = 1e-9) -> Floats:
        """(S, S) correlations at lag 0 between all sites, in the order of `site_names`."""
        from cable.noise.pairs import correlation_matrix

        return correlation_matrix(self, tolerance)
