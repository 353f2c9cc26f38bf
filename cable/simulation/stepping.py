"""One run through time: states of kernels, and one solve of a constant matrix a step.

The step is the second-order backward difference formula with the fluctuating synaptic currents at the new time; the
voltage in them is extrapolated, V* = 2V - V₋, which keeps the order and needs no second solve. Everything counts from
the mean state, with the mean conductances in the matrix, so that only fluctuations are extrapolated.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np
from numpy.random import Generator
from numpy.typing import NDArray
from scipy import sparse
from scipy.sparse.linalg import splu

from cable.simulation.compartments import Compartments
from cable.simulation.kernel_states import KernelStates
from cable.simulation.spikes import Common, Events, PopulationSpikes, RenewalSpikes

Floats = NDArray[np.float64]
CHUNK = 256  # steps whose events are drawn at once


@dataclass(frozen=True, eq=False)
class Plan:
    """What a run needs, in a form that can be sent to another process.

    Attributes:
        cells: the compartments.
        commons: the common trains.
        dt_ms: the time step.
        frozen: whether the driving force stays that of the mean state.
        watched: (sites,) compartments whose voltage is kept at every step.
    """

    cells: Compartments
    commons: tuple[Common, ...]
    dt_ms: float
    frozen: bool
    watched: NDArray[np.int64]


class _Drive:
    """The currents of one population."""

    def __init__(self, plan: Plan, index: int, spikes: PopulationSpikes) -> None:
        population = plan.cells.populations[index]
        one, number = population.source, population.number
        self.spikes = spikes
        self.states = KernelStates.of(one.kernel, plan.dt_ms)
        busy = np.flatnonzero(number > 0)
        # whole arrays are quicker than picked places where a population is nearly everywhere
        self.place: slice | NDArray[np.int64] = slice(None) if 3 * len(busy) > len(number) else busy
        self.column = np.arange(len(number))
        if not isinstance(self.place, slice):
            self.column[busy] = np.arange(len(busy))
        self.number = number[self.place]
        self.force = plan.cells.force(one)[self.place]
        self.x = np.zeros((len(self.states.start), len(self.number)))
        self.peak = None if plan.frozen or one.conductance_nS is None else one.conductance_nS
        # the mean over synapses, of which the fluctuations are counted
        self.mean = one.rate_per_ms * one.kernel.area_ms * self.number

    def advance(self, events: Events, step: int, current: Floats, conductance: Floats) -> None:
        """One step: add the fluctuations to (n,) current, pA, and (n,) conductance, nS."""
        self.x = self.states.decay @ self.x
        a, b = events.first[step], events.first[step + 1]
        if b > a:
            columns = self.column[events.node[a:b]]
            for row, start in zip(self.x, self.states.start, strict=True):
                if start:
                    np.add.at(row, columns, start * events.size[a:b])
        if events.even[step]:
            self.x += np.multiply.outer(self.states.start, events.even[step] * self.number)
        active = self.states.read @ self.x
        active -= self.mean
        if self.peak is not None:
            conductance[self.place] += self.peak * active
        active *= self.force
        current[self.place] += active


def trajectory(plan: Plan, rng: Generator) -> Iterator[tuple[Floats, Floats]]:
    """Chunks of `CHUNK` steps for ever: (CHUNK, sites) voltages from the mean state, mV, and (n,) the last voltage."""
    cells, h = plan.cells, plan.dt_ms
    n = len(cells.parent)
    mass = cells.capacitance_pF / (2 * h)
    # the tree's own order, tips first, fills nothing in
    flip = np.arange(n)[::-1].copy()
    matrix = (cells.matrix_nS + sparse.diags_array(3 * mass)).tocsc()[flip][:, flip]
    solver = splu(matrix.tocsc(), permc_spec="NATURAL", diag_pivot_thresh=0.0, options={"SymmetricMode": True})
    rates = {k: common.rate_per_ms for k, common in enumerate(plan.commons)}
    drives = []
    for index, population in enumerate(cells.populations):
        commons = {k: c.copied[index] for k, c in enumerate(plan.commons) if index in c.copied}
        if population.source.spike_train.process == "poisson":
            spikes = PopulationSpikes(population, commons, rates)
        else:
            spikes = RenewalSpikes(population, rng)
        if population.source.rate_Hz > 0 and population.total > 0:
            drives.append(_Drive(plan, index, spikes))
    v, before = np.zeros(n), np.zeros(n)
    current, conductance = np.empty(n), np.empty(n)
    while True:
        volleys = {k: np.sort(rng.integers(0, CHUNK, rng.poisson(rate * h * CHUNK))) for k, rate in rates.items()}
        drawn = [drive.spikes.events(CHUNK, h, volleys, rng) for drive in drives]
        kept = np.empty((CHUNK, len(plan.watched)))
        for step in range(CHUNK):
            current.fill(0.0)
            conductance.fill(0.0)
            for drive, events in zip(drives, drawn, strict=True):
                drive.advance(events, step, current, conductance)
            if not plan.frozen:
                conductance *= 2 * v - before
                current -= conductance
            current += mass * (4 * v - before)
            before = v
            v = solver.solve(current[flip])[flip]
            kept[step] = v[plan.watched]
        yield kept, v
