"""[[input]]: one population of synapses, its kernel and its spike trains."""

from __future__ import annotations

from typing import Annotated, Any, Literal, Self

from pydantic import BeforeValidator, Field, model_validator

from cable.desk.messages import choices
from cable.desk.schema.base import Name, NotNegative, Positive, Section, spoken
from cable.desk.schema.places import PlacedSection, ZoneSection
from cable.theory.kernel import Kernel
from cable.theory.spiketrain import SpikeTrain
from cable.theory.synapse import Placed, SynapticInput
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
    order: Positive | None = Field(default=None, description="order of the gamma process")
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


class InputSection(Section):
    """[[input]]"""

    name: Name
    where: ZoneSection | None = Field(default=None, description="the filters of the zone")
    density_per_um: Positive | None = Field(default=None, description="synapses per µm of cable")
    density_per_um2: Positive | None = Field(default=None, description="synapses per µm² of membrane")
    count: Positive | None = Field(default=None, description="synapses in the whole zone")
    spread: Literal["length", "area"] = Field(default="length", description="how count is spread")
    at: list[PlacedSection] | None = Field(default=None, min_length=1, description="places such as [{ swc_id = 7 }]")
    rate_Hz: NotNegative = Field(description="rate of one synapse, Hz")
    conductance_nS: NotNegative | None = Field(default=None, description="peak conductance of one event, nS")
    reversal_mV: float | None = Field(default=None, description="reversal potential, mV")
    current_pA: float | None = Field(default=None, description="peak current of one event, pA")
    kernel: KernelSection = Field(description="such as { rise_ms = 0.2, decay_ms = 2.0 }")
    correlation: float = Field(default=0.0, ge=0, le=1, description="pairwise correlation within the population")
    spike_train: SpikeTrainSection = Field(default=SpikeTrainSection(), description="the process of the spikes")

    @model_validator(mode="after")
    def _says_where_and_what(self) -> Self:
        densities = [k for k in ("density_per_um", "density_per_um2", "count") if getattr(self, k) is not None]
        if self.at is not None and (self.where is not None or densities):
            extra = (["where"] if self.where is not None else []) + densities
            raise ValueError(f"found at and {choices(extra, 'and')}, expected either at, or where with a density")
        if self.at is None and len(densities) != 1:
            found = choices(densities, "and") if densities else "no density"
            raise ValueError(
                f"found {found}, expected one of density_per_um, density_per_um2 and count (with where), "
                "or at; " + ("keep one" if densities else "add one")
            )
        if "spread" in self.model_fields_set and self.count is None:
            raise ValueError("found spread without count, expected both; a density says by itself how it counts")
        if (self.conductance_nS is None) == (self.current_pA is None):
            found = "neither" if self.current_pA is None else "both"
            remedy = "add one" if self.current_pA is None else "keep one"
            raise ValueError(f"found {found} of conductance_nS and current_pA, expected one of them; {remedy}")
        if (self.conductance_nS is None) != (self.reversal_mV is None):
            have, lack = (
                ("conductance_nS", "reversal_mV") if self.reversal_mV is None else ("reversal_mV", "conductance_nS")
            )
            remedy = f"add {lack}" if self.current_pA is None else f"take {have} out: a current has none"
            raise ValueError(f"found {have} without {lack}, expected both; {remedy}")
        return self

    def synaptic_input(self, places: tuple[Placed, ...]) -> SynapticInput:
        """The input of `cable`, with its places resolved to sites."""
        same = ("name", "density_per_um", "density_per_um2", "count", "spread", "rate_Hz", "conductance_nS")
        values: dict[str, Any] = {
            key: getattr(self, key) for key in (*same, "reversal_mV", "current_pA", "correlation")
        }
        if self.at is None:
            values["where"] = self.where.zone() if self.where is not None else Zone()
        return SynapticInput(
            **values, at=places, kernel=self.kernel.kernel(), spike_train=self.spike_train.spike_train()
        )
