"""A stochastic simulation of a model beside what is computed for it.

Real Poisson (or other) events reach every compartment; their conductances multiply the voltage as they do in the
cell, or, with the driving force frozen, act as the currents that linear theory takes them for. In the second mode
simulation and theory describe the same process, and differences are statistical.
"""

from __future__ import annotations

import math
import os
from collections.abc import Callable
from dataclasses import dataclass, replace
from typing import TYPE_CHECKING

import numpy as np
from numpy.random import SeedSequence
from numpy.typing import NDArray

from cable.noise.covariance import covariances
from cable.simulation.discretisation import Grid, choose_grid
from cable.simulation.moments import Estimate, Moments
from cable.simulation.running import RunResult, Schedule, run_all
from cable.simulation.spikes import common_trains
from cable.simulation.stepping import CHUNK, Plan

if TYPE_CHECKING:
    from cable.noise.model import CableModel

Floats = NDArray[np.float64]
BURN_IN = 12.0  # slowest time constants before statistics begin
BATCH = 25.0  # correlation times a batch, at least
FEWEST, MOST_BATCHES = 8, 400  # batches in all; of one run
TRACE_POINTS = 20_000
PART = 0.1  # of the expected standard error that the grid may add


class TooShort(ValueError):
    """A simulation too short for any statistics."""


@dataclass(frozen=True)
class Compared:
    """A simulated number, its standard error, and the computed one that it is compared with.

    Attributes:
        value, se: of the simulation.
        computed: by theory; NaN where theory gives none.
    """

    value: float
    se: float
    computed: float

    @property
    def z(self) -> float:
        """Difference in standard errors; NaN where it cannot be told."""
        return (self.value - self.computed) / self.se if self.se > 0 else math.nan


@dataclass(frozen=True)
class SimulatedSite:
    """Statistics of one site.

    Attributes:
        site: its name.
        mean_mV, sd_mV, skewness: of the voltage.
        correlation: with the first site (the soma); of the soma with itself 1, with no error.
        correlation_time_ms: half the batches' length times the variance of their means over the variance, for batches
            of the length that was simulated; the computed one is that for the same length.
    """

    site: str
    mean_mV: Compared
    sd_mV: Compared
    skewness: Compared
    correlation: Compared
    correlation_time_ms: Compared


@dataclass(frozen=True, eq=False)
class Simulation:
    """A simulation and what it found.

    Attributes:
        model: the model, without its electrodes.
        sites: statistics by site, in the model's order.
        frozen: whether the driving force was that of the mean state.
        seconds: simulated time that the statistics rest on, all runs together.
        asked_seconds: what was asked for.
        runs, seed, batches: how many independent runs, from which seed, and how many batches in all.
        batch_ms, dt_ms, burn_in_ms: length of a batch, of a step, of the burn-in of every run.
        grid: compartments and time step, with the errors they make.
        steps_per_second: of one process.
        interrupted: whether it was stopped early.
        sd_points_mV: (N,) SD at all points of the tree, less exact than at the sites.
        moments: the batches, site by site, voltages counted from the compartments' mean state.
        trace_ms, trace_mV: (T,) and (T, sites) voltages at the beginning of the first run, after its burn-in.
    """

    model: CableModel
    sites: tuple[SimulatedSite, ...]
    frozen: bool
    seconds: float
    asked_seconds: float
    runs: int
    seed: int
    batches: int
    batch_ms: float
    dt_ms: float
    burn_in_ms: float
    grid: Grid
    steps_per_second: float
    interrupted: bool
    sd_points_mV: Floats
    moments: Moments
    trace_ms: Floats
    trace_mV: Floats

    def at(self, site: str) -> SimulatedSite:
        """Statistics of one site.

        Raises:
            KeyError: the model has no such site.
        """
        self.model.node_of(site)
        return next(one for one in self.sites if one.site == site)


def simulate(
    model: CableModel,
    seconds: float,
    seed: int,
    frozen: bool = False,
    runs: int = 4,
    processes: int | None = None,
    dt_ms: float | None = None,
    trace_seconds: float = 1.0,
    tell: Callable[[float], None] = lambda share: None,
) -> Simulation:
    """See `cable.simulate`."""
    if not (math.isfinite(seconds) and seconds > 0):
        raise ValueError(f"seconds: expected a positive number, found {seconds!r}")
    if runs < 1:
        raise ValueError(f"runs: expected at least 1, found {runs}")
    if dt_ms is not None and not (math.isfinite(dt_ms) and dt_ms > 0):
        raise ValueError(f"dt_ms: expected a positive number, found {dt_ms!r}")
    bare = replace(model, electrodes=()) if model.electrodes else model
    field = bare.fluctuations()
    times = np.array([field.at(name).correlation_time_ms for name in bare.site_names])
    slow = float(np.nanmax(np.where(np.isfinite(times), times, np.nan), initial=0.0))
    if not slow > 0:
        raise TooShort("nothing fluctuates at any site, so there is nothing to simulate; give an input a rate")
    # relative standard error of an SD after this time, for an exponential autocorrelation
    grid = choose_grid(bare, PART * math.sqrt(slow * 1e-3 / seconds / 2), dt_ms)
    chunk_ms = CHUNK * grid.dt_ms
    batch = max(1, math.ceil(BATCH * slow / chunk_ms))
    possible = int(seconds * 1e3 / (batch * chunk_ms))
    if possible < FEWEST:
        least = FEWEST * batch * chunk_ms * 1e-3
        raise TooShort(f"seconds: found {seconds:g}, expected at least {least:.2g} for {FEWEST} independent batches")
    runs = min(runs, possible // 2)
    each = possible // runs
    batch *= max(1, math.ceil(each / MOST_BATCHES))
    each = max(1, int(seconds * 1e3 / runs / (batch * chunk_ms)))
    slowest = max(1 / grid.point.network.slowest_rate_per_ms, slow)
    kept = math.ceil(min(trace_seconds * 1e3, each * batch * chunk_ms) / chunk_ms)
    thinned = max(1, math.ceil(kept * CHUNK / TRACE_POINTS))
    schedule = Schedule(math.ceil(BURN_IN * slowest / chunk_ms), batch, each, kept, thinned)
    nodes = np.array([grid.point.layout.node_at(place) for place in bare.site_places.values()])
    plan = Plan(grid.cells, common_trains(grid.point.sources), grid.dt_ms, frozen, nodes)
    workers = min(processes or os.cpu_count() or 1, runs)
    results = run_all(plan, schedule, SeedSequence(seed).spawn(runs), workers, tell)
    parts = [one.moments for one in results if one.moments is not None]
    if not parts:
        raise KeyboardInterrupt
    moments = Moments.joined(parts)
    first = results[0].trace_mV
    return Simulation(
        model=bare,
        sites=_compare(bare, grid, nodes, moments),
        frozen=frozen,
        seconds=moments.batches * moments.batch_ms * 1e-3,
        asked_seconds=seconds,
        runs=len(parts),
        seed=seed,
        batches=moments.batches,
        batch_ms=moments.batch_ms,
        dt_ms=grid.dt_ms,
        burn_in_ms=schedule.burn_in * chunk_ms,
        grid=grid,
        steps_per_second=sum(one.steps for one in results) / sum(one.seconds for one in results),
        interrupted=any(one.stopped for one in results) or len(results) < runs,
        sd_points_mV=_spread(results)[grid.point.layout.row_node],
        moments=moments,
        trace_ms=np.arange(len(first), dtype=float) * (thinned * grid.dt_ms),
        trace_mV=grid.cells.mean_mV[nodes] + first,
    )


def _spread(results: list[RunResult]) -> Floats:
    """(n,) SD of all compartments, from one sample a chunk."""
    samples = max(1, sum(one.samples for one in results))
    first, second = np.sum([one.sums for one in results], axis=0) / samples
    return np.asarray(np.sqrt(np.maximum(second - first**2, 0.0)))


def _compare(model: CableModel, grid: Grid, nodes: NDArray[np.int64], moments: Moments) -> tuple[SimulatedSite, ...]:
    field = model.fluctuations()
    names = model.site_names
    known = {one.site: one.skewness for one in model.excursions()}
    correlation = model.correlation_map(names[0]).correlation_at
    times = batch_times_ms(model, moments.batch_ms)
    found = []
    for k, name in enumerate(names):
        at, mean = field.at(name), moments.mean(k)
        own = Estimate(1.0, 0.0) if k == 0 else moments.correlation(k)
        found.append(
            SimulatedSite(
                site=name,
                mean_mV=Compared(float(grid.cells.mean_mV[nodes[k]]) + mean.value, mean.se, at.mean_mV),
                sd_mV=_against(moments.sd(k), at.sd_mV),
                skewness=_against(moments.skewness(k), known[name]),
                correlation=_against(own, correlation[name]),
                correlation_time_ms=_against(moments.correlation_time_ms(k), times[k]),
            )
        )
    return tuple(found)


def _against(estimate: Estimate, computed: float) -> Compared:
    return Compared(estimate.value, estimate.se, computed)


def batch_times_ms(model: CableModel, batch_ms: float) -> Floats:
    """(sites,) ∫₀^T (1 - t/T) ρ(t) dt over the length T of a batch: the correlation time that batches show, ms."""
    at, weight = np.polynomial.legendre.leggauss(8)
    edges = np.r_[0.0, batch_ms * np.geomspace(1e-4, 1.0, 25)]
    width = np.diff(edges)[:, None]
    lag = (edges[:-1, None] + width * (at + 1) / 2).ravel()
    weights = (width / 2 * weight).ravel() * (1 - lag / batch_ms)
    found = []
    for name in model.site_names:
        one = covariances(model, (name,), lag, 1e-8)
        variance = float(one.at_zero_mV2[:, 0, 0].sum())
        found.append(float(one.covariance_mV2[0, 0] @ weights) / variance if variance > 0 else math.nan)
    return np.array(found)
