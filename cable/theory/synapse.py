"""One population of synapses: where they sit, how often they are active, what one event does."""

from __future__ import annotations

import math
from dataclasses import dataclass, field

from cable.theory.kernel import Kernel
from cable.theory.membrane import check_positive
from cable.theory.sharing import Shared
from cable.theory.spiketrain import SpikeTrain
from cable.theory.units import PER_MS_PER_HZ
from morphology import Site, Zone

DENSITIES = ("density_per_um", "density_per_um2", "count")
EVENTS = ("conductance_nS", "current_pA", "charge_fC")


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

    Sizes of events that vary, independently from event to event, with the coefficient of variation `size_cv` multiply
    the fluctuations of independent Poisson synapses by 1 + size_cv². In general they add the white part rate·size_cv²
    to the spectrum of each train, beside rate·Φ(ω) from its spikes (Φ is 1 for a Poisson train). What synapses have
    in common, by correlation or shared spikes, follows from the mean size alone, and so does the mean.

    Attributes:
        name: what the population is called.
        rate_Hz: events per synapse and second.
        kernel: time course of one event, of peak 1.
        where: the zone over which the synapses are spread, with exactly one of
            density_per_um (per axial length), density_per_um2 (per bare membrane area) or
            count (in all, spread evenly by "length" or "area").
        at: point synapses at sites, instead of `where`.
        conductance_nS, reversal_mV: peak conductance of one event and its reversal potential; or
        current_pA: peak current of one event, positive inwards (depolarising); or
        charge_fC: charge of one event, positive inwards; it comes with the kernel's time course, without one at once.
        size_cv: coefficient of variation of the size of an event, whose mean the above are. Where more than the
            variance counts (skewness), sizes are taken as gamma distributed (common practice, no source).
        correlation: correlation of the spike trains of any two synapses of the population, 0 to 1.
        shares: fractions of its spikes that the population shares with others.
        spike_train: statistics of one spike train.

    Raises:
        ValueError: a negative rate, a density missing or given twice, not one of conductance, current and charge, no
            kernel where one is needed.
    """

    name: str
    rate_Hz: float
    kernel: Kernel = field(default_factory=Kernel.impulse)
    where: Zone | None = None
    density_per_um: float | None = None
    density_per_um2: float | None = None
    count: float | None = None
    spread: str = "length"
    at: tuple[Placed, ...] = ()
    conductance_nS: float | None = None
    reversal_mV: float | None = None
    current_pA: float | None = None
    charge_fC: float | None = None
    size_cv: float = 0.0
    correlation: float = 0.0
    shares: tuple[Shared, ...] = ()
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
        if sum(getattr(self, name) is not None for name in EVENTS) != 1:
            raise ValueError("give exactly one of conductance_nS (with reversal_mV), current_pA and charge_fC")
        if (self.conductance_nS is None) != (self.reversal_mV is None):
            raise ValueError("conductance_nS and reversal_mV go together")
        if self.conductance_nS is not None:
            check_positive(self.conductance_nS, "conductance_nS")
        for name in ("reversal_mV", "current_pA", "charge_fC"):
            value = getattr(self, name)
            if value is not None and not math.isfinite(value):
                raise ValueError(f"{name}: expected a finite number, found {value!r}")
        if self.kernel.is_impulse and self.charge_fC is None:
            given_as = "conductance_nS" if self.current_pA is None else "current_pA"
            raise ValueError(f"kernel: {given_as} needs a time course; give a kernel, or the event's charge_fC")
        if self.charge_fC is not None and not abs(self.kernel.area_ms) > 0:
            raise ValueError("charge_fC: the kernel carries no charge, its area is 0; give current_pA")
        if not (math.isfinite(self.size_cv) and self.size_cv >= 0):
            raise ValueError(f"size_cv: expected a finite number of at least 0, found {self.size_cv!r}")
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
    def event_current_pA(self) -> float:
        """Current of one event at the kernel's peak, for the impulse its charge in fC; 0 for a conductance."""
        if self.charge_fC is not None:
            return self.charge_fC / self.kernel.area_ms
        return self.current_pA or 0.0

    def size_moment(self, order: int) -> float:
        """Mean of the `order`-th power of an event's size over that power of the mean size, for gamma sizes."""
        return math.prod(1 + k * self.size_cv**2 for k in range(order))

    @property
    def mean_conductance_nS(self) -> float:
        """Mean conductance of one synapse, rate · peak · area of the kernel; 0 for a current."""
        return self.rate_per_ms * (self.conductance_nS or 0.0) * self.kernel.area_ms

    @property
    def mean_current_pA(self) -> float:
        """Mean current of one synapse where events are currents; 0 for a conductance."""
        return self.rate_per_ms * self.event_current_pA * self.kernel.area_ms
