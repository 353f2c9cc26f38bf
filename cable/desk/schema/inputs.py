"""[[input]]: one population of synapses, its kernel and its spike trains."""

from __future__ import annotations

from typing import Annotated, Any, Literal, Self

from pydantic import BeforeValidator, Field, model_validator

from cable.desk.messages import choices
from cable.desk.schema.base import Name, NotNegative, Number, Positive, Section, spoken
from cable.desk.schema.places import PlacedSection, ZoneSection
from cable.theory.kernel import Kernel
from cable.theory.sharing import Shared
from cable.theory.spiketrain import SpikeTrain
from cable.theory.synapse import EVENTS, Placed, SynapticInput
from morphology import Zone


class KernelSection(Section):
    """The time course of one event, in one of four ways."""

    rise_ms: Positive | None = Field(default=None, description="rise time constant, ms")
    decay_ms: Positive | None = Field(default=None, description="decay time constant, ms")
    alpha_ms: Positive | None = Field(default=None, description="time to peak of t·exp(-t), ms")
    expression: str | None = Field(default=None, description="an expression in t (ms), such as t*exp(-t/2)")

    @model_validator(mode="after")
    def _is_a_kernel(self) -> Self:
        ways = [{"decay_ms"}, {"rise_ms", "decay_ms"}, {"alpha_ms"}, {"expression"}]
        given = {name for name in type(self).model_fields if getattr(self, name) is not None}
        if given not in ways:
            expected = choices(["{ " + ", ".join(sorted(way, reverse=True)) + " }" for way in ways])
            raise ValueError(f"found {choices(sorted(given), 'and') or 'no key'}, expected {expected}; keep one way")
        if given == ways[1] and self.rise_ms >= self.decay_ms:  # type: ignore[operator]
            raise ValueError(
                f"found rise_ms = {self.rise_ms:g} and decay_ms = {self.decay_ms:g}, expected a rise faster "
                "than the decay; correct one of them, or give alpha_ms where the two are equal"
            )
        self.kernel()
        return self

    def kernel(self) -> Kernel:
        """The kernel of `cable`; ValueError where an expression is no kernel."""
        if self.expression is not None:
            return Kernel.expression(self.expression)
        if self.alpha_ms is not None:
            return Kernel.alpha(self.alpha_ms)
        assert self.decay_ms is not None
        if self.rise_ms is not None:
            return Kernel.two_exponential(self.rise_ms, self.decay_ms)
        return Kernel.exponential(self.decay_ms)


class SpikeTrainSection(Section):
    """When the spikes of one synapse come."""

    process: Annotated[Literal["poisson", "gamma", "dead time"], BeforeValidator(spoken)] | None = Field(
        default=None, description="the process"
    )
    order: Annotated[float, Field(ge=1)] | None = Field(default=None, description="order of the gamma process")
    dead_time_ms: Positive | None = Field(default=None, description="dead time after a spike, ms")

    @model_validator(mode="after")
    def _is_a_process(self) -> Self:
        process = self.chosen
        needs = {"poisson": None, "gamma": "order", "dead time": "dead_time_ms"}[process]
        for key in ("order", "dead_time_ms"):
            if key == needs and getattr(self, key) is None:
                raise ValueError(f'found process = "{process}" alone, expected {key} with it; add it')
            if key != needs and getattr(self, key) is not None:
                raise ValueError(f"found {key}, which means nothing for a {process} process; take it out")
        return self

    @property
    def chosen(self) -> str:
        """The process, told by its parameter where it is not named."""
        implied = "gamma" if self.order is not None else "dead time" if self.dead_time_ms is not None else "poisson"
        return self.process or implied

    def spike_train(self) -> SpikeTrain:
        """The spike train of `cable`."""
        if self.order is not None:
            return SpikeTrain.gamma(self.order)
        if self.dead_time_ms is not None:
            return SpikeTrain.dead_time(self.dead_time_ms)
        return SpikeTrain.poisson()


class SharedSection(Section):
    """One entry of `shares`."""

    input: Name = Field(description="the name of another input")
    fraction: float = Field(ge=0, le=1, description="fraction of the spikes that are the same")

    def shared(self) -> Shared:
        """The entry of `cable`."""
        return Shared(self.input, self.fraction)


class InputSection(Section):
    """[[input]]"""

    name: Name
    where: ZoneSection | None = Field(default=None, description="the filters of the zone")
    density_per_um: Positive | None = Field(default=None, description="synapses per µm of cable")
    density_per_um2: Positive | None = Field(default=None, description="synapses per µm² of membrane")
    count: Positive | None = Field(default=None, description="synapses in the whole zone")
    spread: Literal["length", "area"] = Field(default="length", description="how count is spread")
    at: list[PlacedSection] | None = Field(default=None, min_length=1, description="places such as [{ swc_id = 7 }]")
    synapses: str | None = Field(
        default=None, min_length=1, max_length=1000, description="a CSV file with a column swc_id, beside the scenario"
    )
    rate_Hz: NotNegative = Field(description="rate of one synapse, Hz")
    conductance_nS: Positive | None = Field(default=None, description="peak conductance of one event, nS")
    reversal_mV: Number | None = Field(default=None, description="reversal potential, mV")
    current_pA: Number | None = Field(default=None, description="peak current of one event, pA")
    charge_fC: Number | None = Field(default=None, description="charge of one event, fC")
    size_cv: NotNegative = Field(default=0.0, description="coefficient of variation of the size of an event")
    kernel: KernelSection | None = Field(default=None, description="such as { rise_ms = 0.2, decay_ms = 2.0 }")
    correlation: float = Field(default=0.0, ge=0, le=1, description="pairwise correlation within the population")
    shares: list[SharedSection] = Field(
        default=[], description='spikes in common with other inputs, such as [{ input = "GABA", fraction = 0.1 }]'
    )
    spike_train: SpikeTrainSection = Field(default=SpikeTrainSection(), description="the process of the spikes")

    @model_validator(mode="after")
    def _says_where_and_what(self) -> Self:
        densities = [k for k in ("density_per_um", "density_per_um2", "count") if getattr(self, k) is not None]
        listed = [k for k in ("at", "synapses") if getattr(self, k) is not None]
        if len(listed) == 2:
            raise ValueError("found at and synapses, expected one of them; keep one")
        if listed and (self.where is not None or densities):
            extra = (["where"] if self.where is not None else []) + densities
            raise ValueError(
                f"found {listed[0]} and {choices(extra, 'and')}, expected either {listed[0]}, or where with a density"
            )
        if not listed and len(densities) != 1:
            found = choices(densities, "and") if densities else "no density"
            raise ValueError(
                f"found {found}, expected one of density_per_um, density_per_um2 and count (with where), "
                "or at, or synapses; " + ("keep one" if densities else "add one")
            )
        if "spread" in self.model_fields_set and self.count is None:
            raise ValueError("found spread without count, expected both; a density says by itself how it counts")
        given = [k for k in EVENTS if getattr(self, k) is not None]
        if len(given) != 1:
            found = ("neither", "one", "both", "all")[len(given)]
            told = choices(given, "and") if len(given) > 1 else choices(EVENTS)
            remedy = "keep one" if given else "add one"
            raise ValueError(f"found {found} of {told}, expected one of {choices(EVENTS)}; {remedy}")
        if (self.conductance_nS is None) != (self.reversal_mV is None):
            have, lack = (
                ("conductance_nS", "reversal_mV") if self.reversal_mV is None else ("reversal_mV", "conductance_nS")
            )
            remedy = f"add {lack}" if have == "conductance_nS" else f"take {have} out: {given[0]} has none"
            raise ValueError(f"found {have} without {lack}, expected both; {remedy}")
        if self.kernel is None and self.charge_fC is None:
            raise ValueError(
                f"found {given[0]} without kernel, expected the time course of an event; add kernel, or give "
                "charge_fC, whose charge comes at once where there is no kernel"
            )
        if self.kernel is not None and self.charge_fC is not None and not abs(self.kernel.kernel().area_ms) > 1e-12:
            raise ValueError("found charge_fC with a kernel of area 0, which carries no charge; give current_pA")
        self.spike_train.spike_train().check_rate(self.rate_Hz)
        return self

    def synaptic_input(self, places: tuple[Placed, ...]) -> SynapticInput:
        """The input of `cable`, with its places resolved to sites."""
        same = ("name", "density_per_um", "density_per_um2", "count", "spread", "rate_Hz", *EVENTS, "reversal_mV")
        values: dict[str, Any] = {key: getattr(self, key) for key in (*same, "size_cv", "correlation")}
        if self.at is None and self.synapses is None:
            values["where"] = self.where.zone() if self.where is not None else Zone()
        if self.kernel is not None:
            values["kernel"] = self.kernel.kernel()
        shares = tuple(one.shared() for one in self.shares)
        return SynapticInput(**values, at=places, shares=shares, spike_train=self.spike_train.spike_train())
