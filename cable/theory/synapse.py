"""One population of synapses: where they sit, how often they are active, what one event does."""

from __future__ import annotations

import math
from dataclasses import dataclass, field

from cable.theory.kernel import Kernel
from cable.theory.membrane import check_positive
from cable.theory.spiketrain import SpikeTrain
from cable.theory.units import PER_MS_PER_HZ
from morphology import Site, Zone

DENSITIES = ("density_per_um", "density_per_um2", "count")


@dataclass(frozen=True)
class Placed:
    """`number` point synapses at one site."""

    site: Site
    number: float = 1.0

    def __post_init__(self) -> None:
        check_positive(self.number, "number")


@dataclass(frozen=True, kw_only=True)
class SynapticInput:
    """One population of synapses that are active independently, or with a pairwise correlation.

    Attributes:
        name: what the population is called.
        rate_Hz: events per synapse and second.
        kernel: time course of one event, of peak 1.
        where: the zone over which the synapses are spread, with exactly one of
            density_per_um (per axial length), density_per_um2 (per bare membrane area) or
            count (in all, spread evenly by "length" or "area").
        at: point synapses at sites, instead of `where`.
        conductance_nS, reversal_mV: peak conductance of one event and its reversal potential; or
        current_pA: peak current of one event, positive inwards (depolarising).
        correlation: correlation of the spike trains of any two synapses of the population, 0 to 1.
        spike_train: statistics of one spike train.

    Raises:
        ValueError: a negative rate, a density missing or given twice, conductance and current both or neither.
    """

    name: str
    rate_Hz: float
    kernel: Kernel
    where: Zone | None = None
    density_per_um: float | None = None
    density_per_um2: float | None = None
    count: float | None = None
    spread: str = "length"
    at: tuple[Placed, ...] = ()
    conductance_nS: float | None = None
    reversal_mV: float | None = None
    current_pA: float | None = None
    correlation: float = 0.0
    spike_train: SpikeTrain = field(default_factory=SpikeTrain.poisson)

    def __post_init__(self) -> None:
        if not (math.isfinite(self.rate_Hz) and self.rate_Hz >= 0):
            raise ValueError(f"rate_Hz: expected a finite number of at least 0, found {self.rate_Hz!r}")
        given = [name for name in DENSITIES if getattr(self, name) is not None]
        if bool(self.at) == (self.where is not None):
            raise ValueError("give either where (with a density) or at (a list of point synapses)")
        if self.at and given:
            raise ValueError(f"{given[0]} goes with where, not with at")
        if self.where is not None and len(given) != 1:
            raise ValueError(f"give exactly one of {', '.join(DENSITIES)}; found {' and '.join(given) or 'none'}")
        for name in given:
            check_positive(getattr(self, name), name)
        if self.spread not in ("length", "area"):
            raise ValueError(f'spread: expected "length" or "area", found {self.spread!r}')
        if self.spread == "area" and self.count is None:
            raise ValueError("spread goes with count")
        if (self.conductance_nS is None) == (self.current_pA is None):
            raise ValueError("give exactly one of conductance_nS (with reversal_mV) and current_pA")
        if (self.conductance_nS is None) != (self.reversal_mV is None):
            raise ValueError("conductance_nS and reversal_mV go together")
        if self.conductance_nS is not None:
            check_positive(self.conductance_nS, "conductance_nS")
        for name in ("reversal_mV", "current_pA"):
            value = getattr(self, name)
            if value is not None and not math.isfinite(value):
                raise ValueError(f"{name}: expected a finite number, found {value!r}")
        if not 0.0 <= self.correlation <= 1.0:
            raise ValueError(f"correlation: expected 0 to 1, found {self.correlation!r}")
        self.spike_train.check_rate(self.rate_Hz)

    @property
    def by_area(self) -> bool:
        """Whether the synapses are spread by bare membrane area rather than by length."""
        return self.density_per_um2 is not None or self.spread == "area"

    @property
    def rate_per_ms(self) -> float:
        """Events per synapse and ms."""
        return self.rate_Hz * PER_MS_PER_HZ

    @property
    def mean_conductance_nS(self) -> float:
        """Mean conductance of one synapse, rate · peak · area of the kernel; 0 for a current."""
        return self.rate_per_ms * (self.conductance_nS or 0.0) * self.kernel.area_ms

    @property
    def mean_current_pA(self) -> float:
        """Mean current of one synapse where events are currents; 0 for a conductance."""
        return self.rate_per_ms * (self.current_pA or 0.0) * self.kernel.area_ms
