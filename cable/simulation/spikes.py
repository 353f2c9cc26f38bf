"""Spikes of a population in time steps: which compartments receive how much, drawn for many steps at once.

Independent Poisson synapses of a compartment are one Poisson train of the summed rate. Pairwise correlation c is
made by volleys: a common train of rate r/c, each of whose spikes every synapse copies with probability c; what
populations share is made by one more common train. Where a compartment holds a whole number of synapses the copies
are binomial. A density puts fractions of synapses into compartments; there a volley brings a Poisson number of mean
n·c(1 - c) and, as its even part, n·c² spikes to n synapses, which has the same mean, variance and covariances
(derived here). Trains with an order of their own (gamma, dead time) are simulated one by one; a density's synapses
are then one for each whole of its running sum, and each spike falls at random within that whole.
"""

from __future__ import annotations

import math
from dataclasses import dataclass, replace

import numpy as np
from numpy.random import Generator
from numpy.typing import NDArray

from cable.noise.population import Source, couplings
from cable.simulation.compartments import Population
from cable.theory.spiketrain import SpikeTrain
from cable.theory.synapse import SynapticInput
from cable.theory.units import PER_MS_PER_HZ

Floats = NDArray[np.float64]
Ints = NDArray[np.int64]
WHOLE = 1e-9  # how near to a whole number of synapses counts as one


class NoSuchTrains(ValueError):
    """Correlated trains that the simulation has no construction for."""


@dataclass(frozen=True, eq=False)
class Events:
    """Events of one population in some steps, in order.

    Attributes:
        first: (steps + 1,) where the events of each step begin.
        node: (events,) compartments.
        size: (events,) sizes, over the mean size.
        even: (steps,) what every synapse receives besides, over the mean size.
    """

    first: Ints
    node: Ints
    size: Floats
    even: Floats


@dataclass(frozen=True)
class Common:
    """A common train: its rate, and the probability with which each synapse of a population copies its spikes.

    Attributes:
        rate_per_ms: of the train.
        copied: by index of the population.
    """

    rate_per_ms: float
    copied: dict[int, float]


def common_trains(sources: tuple[Source, ...]) -> tuple[Common, ...]:
    """Trains whose copies give all correlations within and between the populations.

    Raises:
        NoSuchTrains: correlated trains that are no Poisson trains, or more sharing than the correlations within the
            populations can carry.
    """
    inputs = [source.population for source in sources]
    pairs = couplings(sources)
    for one in inputs:
        if (one.correlation > 0 or one.shares) and one.spike_train.process != "poisson" and one.rate_Hz > 0:
            raise NoSuchTrains(
                f"input {one.name!r}: correlated {one.spike_train.process} trains cannot be simulated, expected "
                "Poisson trains; set correlation to 0 or the process to poisson"
            )
    left = {k: 1.0 for k in range(len(inputs))}  # share of each population's correlation that is not yet made
    found = []
    for a, b, fraction in pairs:
        one, two = inputs[a], inputs[b]
        if one.rate_Hz == 0 or two.rate_Hz == 0:
            continue
        part = fraction / math.sqrt(one.correlation * two.correlation)
        rate = part * min(x.rate_per_ms / x.correlation for x in (one, two))
        copied = {k: math.sqrt(part * inputs[k].correlation * inputs[k].rate_per_ms / rate) for k in (a, b)}
        for k in (a, b):
            left[k] -= part
        if min(left.values()) < -WHOLE or max(copied.values()) > 1 + WHOLE:
            raise NoSuchTrains(
                f"inputs {one.name!r} and {two.name!r}: common trains cannot carry that many shared spikes beside the "
                "correlations within the inputs; lower the fractions, or raise the correlations"
            )
        found.append(Common(rate, {k: min(q, 1.0) for k, q in copied.items()}))
    for k, one in enumerate(inputs):
        if one.correlation > 0 and left[k] > WHOLE and one.rate_Hz > 0:
            found.append(Common(left[k] * one.rate_per_ms / one.correlation, {k: one.correlation}))
    return tuple(found)


class PopulationSpikes:
    """Draws the events of one population.

    Args:
        population: the synapses.
        commons: the common trains that it copies from, with their numbers among all.
    """

    def __init__(self, population: Population, commons: dict[int, float], rates: dict[int, float]) -> None:
        one, number = population.source, population.number
        self.one, self.number = one, number
        self.commons = commons
        self.whole = bool(np.all(np.abs(number - np.round(number)) < WHOLE))
        self.busy = np.flatnonzero(number > 0)
        self.running = np.cumsum(number[self.busy])
        self.total = float(self.running[-1]) if len(self.busy) else 0.0
        copied = sum(rates[k] * q for k, q in commons.items())
        self.alone_per_ms = max(one.rate_per_ms - copied, 0.0)
        # what a volley brings evenly has no sizes of its own; the spikes beside it make up for that
        self.cv = one.size_cv
        if commons and not self.whole and one.size_cv > 0:
            if one.correlation >= 1:
                raise NoSuchTrains(
                    f"input {one.name!r}: size_cv with a correlation of 1 cannot be simulated for a density; give the "
                    "synapses by at or lower the correlation"
                )
            self.cv = one.size_cv / math.sqrt(1 - one.correlation)

    def events(self, steps: int, dt_ms: float, volleys: dict[int, Ints], rng: Generator) -> Events:
        """The events of `steps` steps; `volleys` holds the steps at which the common trains have spikes."""
        count = rng.poisson(self.alone_per_ms * self.total * dt_ms * steps)
        step, node = [rng.integers(0, steps, count)], [self._places(count, rng)]
        even = np.zeros(steps)
        for common, probability in self.commons.items():
            at = volleys[common]
            if self.whole:
                synapses = np.round(self.number[self.busy]).astype(np.int64)
                copies = rng.binomial(synapses, probability, size=(len(at), len(synapses)))
                which, where = np.nonzero(copies)
                often = copies[which, where]
                step.append(np.repeat(at[which], often))
                node.append(np.repeat(self.busy[where], often))
            else:
                copies = rng.poisson(self.total * probability * (1 - probability), len(at))
                step.append(np.repeat(at, copies))
                node.append(self._places(int(copies.sum()), rng))
                np.add.at(even, at, probability**2)
        return self._sorted(np.concatenate(step), np.concatenate(node), even, steps, rng)

    def _places(self, count: int, rng: Generator) -> Ints:
        if count == 0:
            return np.zeros(0, dtype=np.int64)
        return np.asarray(self.busy[np.searchsorted(self.running, rng.random(count) * self.total, side="right")])

    def _sorted(self, step: Ints, node: Ints, even: Floats, steps: int, rng: Generator) -> Events:
        order = np.argsort(step, kind="stable")
        size = np.ones(len(step))
        if self.cv > 0:
            shape = 1 / self.cv**2
            size = rng.gamma(shape, 1 / shape, len(step))
        first = np.searchsorted(step[order], np.arange(steps + 1))
        return Events(first.astype(np.int64), node[order], size, even)


class RenewalSpikes(PopulationSpikes):
    """Draws the events of a population whose trains have an order of their own, synapse by synapse."""

    def __init__(self, population: Population, rng: Generator) -> None:
        super().__init__(population, {}, {})
        self.count = max(1, round(self.total)) if self.total > 0 else 0
        self.width = self.total / self.count if self.count else 0.0
        self.next_ms = first_spikes(self.one, self.count, rng)

    def events(self, steps: int, dt_ms: float, volleys: dict[int, Ints], rng: Generator) -> Events:
        """The events of `steps` steps."""
        end = steps * dt_ms
        times, synapses = [], []
        while (due := np.flatnonzero(self.next_ms < end)).size:
            times.append(self.next_ms[due])
            synapses.append(due)
            self.next_ms[due] += intervals(self.one.spike_train, self.one.rate_Hz, len(due), rng)
        self.next_ms -= end
        time = np.concatenate(times) if times else np.zeros(0)
        synapse = np.concatenate(synapses) if synapses else np.zeros(0, dtype=np.int64)
        within = (synapse + rng.random(len(synapse))) * self.width
        node = self.busy[np.searchsorted(self.running, within, side="right").clip(max=len(self.busy) - 1)]
        step = np.minimum((time / dt_ms).astype(np.int64), steps - 1)
        drawn = self._sorted(step, node, np.zeros(steps), steps, rng)
        # a total that is not whole is made by events of not quite the mean size
        return replace(drawn, size=self.width * drawn.size)


def intervals(train: SpikeTrain, rate_Hz: float, count: int, rng: Generator) -> Floats:
    """(count,) intervals of a renewal train, ms."""
    rate = rate_Hz * PER_MS_PER_HZ
    if train.process == "gamma":
        return rng.gamma(train.order, 1 / (train.order * rate), count)
    return train.dead_time_ms + rng.exponential(1 / rate - train.dead_time_ms, count)


def first_spikes(one: SynapticInput, count: int, rng: Generator) -> Floats:
    """(count,) times from any moment to the next spike of trains that have run for ever, ms (Cox 1962; from memory)."""
    train, rate = one.spike_train, one.rate_per_ms
    if rate == 0:
        return np.full(count, math.inf)
    if train.process == "gamma":
        # the interval around a moment is longer than others in proportion to its length
        return rng.gamma(train.order + 1, 1 / (train.order * rate), count) * rng.random(count)
    inside = rng.random(count) < rate * train.dead_time_ms
    free = train.dead_time_ms + rng.exponential(1 / rate - train.dead_time_ms, count)
    return np.where(inside, rng.random(count) * train.dead_time_ms, free)
