"""Independent runs, in this process or in several, that can be watched and stopped."""

from __future__ import annotations

import multiprocessing as mp
import os
import signal
import sys
import time
from collections.abc import Callable
from concurrent.futures import ProcessPoolExecutor, wait
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.random import SeedSequence
from numpy.typing import NDArray

from cable.simulation.moments import Moments
from cable.simulation.stepping import CHUNK, Plan, trajectory

Floats = NDArray[np.float64]
Progress = Callable[[float], None]
POLL_S = 0.2


@dataclass(frozen=True)
class Schedule:
    """How long a run is, in chunks of `CHUNK` steps.

    Attributes:
        burn_in: before statistics begin.
        batch: one batch.
        batches: of a whole run.
        kept: chunks after the burn-in whose voltages are kept.
        thinned: every so many steps of them.
    """

    burn_in: int
    batch: int
    batches: int
    kept: int
    thinned: int

    @property
    def chunks(self) -> int:
        """All of a run."""
        return self.burn_in + self.batch * self.batches


@dataclass(frozen=True, eq=False)
class RunResult:
    """What one run found, whole or up to where it was stopped.

    Attributes:
        moments: its batches; None before the first is full.
        trace_mV: (T, sites) voltages from the mean state at the beginning, thinned.
        sums: (2, n) sums of the voltages of all compartments and of their squares over `samples`.
        samples: how many.
        steps: steps made, burn-in included.
        seconds: time they took.
        stopped: whether it was stopped early.
    """

    moments: Moments | None
    trace_mV: Floats
    sums: Floats
    samples: int
    steps: int
    seconds: float
    stopped: bool


def run(
    plan: Plan, schedule: Schedule, seed: SeedSequence, tell: Progress, asked_to_stop: Callable[[], bool]
) -> RunResult:
    """One run; `tell` hears the share that is done. Ctrl-C ends it early."""
    rng = np.random.default_rng(seed)
    batch: list[Floats] = []
    found, trace = list[Moments](), list[Floats]()
    sums, samples, done, stopped = np.zeros((2, len(plan.cells.parent))), 0, 0, False
    start = time.perf_counter()
    try:
        for voltages, last in trajectory(plan, rng):
            done += 1
            if done > schedule.burn_in:
                if done <= schedule.burn_in + schedule.kept:
                    trace.append(voltages[:: schedule.thinned].copy())
                sums += last, last * last
                samples += 1
                batch.append(voltages)
                if len(batch) == schedule.batch:
                    found.append(Moments.of(np.concatenate(batch), schedule.batch * CHUNK * plan.dt_ms))
                    batch = []
            tell(done / schedule.chunks)
            stopped = asked_to_stop() and done < schedule.chunks
            if stopped or done == schedule.chunks:
                break
    except KeyboardInterrupt:
        stopped = True
    return RunResult(
        moments=Moments.joined(found) if found else None,
        trace_mV=np.concatenate(trace) if trace else np.zeros((0, len(plan.watched))),
        sums=sums,
        samples=samples,
        steps=done * CHUNK,
        seconds=time.perf_counter() - start,
        stopped=stopped,
    )


def run_all(
    plan: Plan, schedule: Schedule, seeds: list[SeedSequence], processes: int, tell: Progress
) -> list[RunResult]:
    """All runs; the results do not depend on the number of processes. Ctrl-C ends all runs early."""
    if processes == 1 or len(seeds) == 1:
        results = []
        for k, seed in enumerate(seeds):
            results.append(
                run(plan, schedule, seed, lambda share, k=k: tell((k + share) / len(seeds)), lambda: False)  # type: ignore[misc]
            )
            if results[-1].stopped:
                break
        return results
    # forked, a script needs no guard around its main part; elsewhere processes start afresh
    context: Any = mp.get_context("fork" if sys.platform == "linux" else "spawn")
    done, stop = context.Array("d", len(seeds)), context.Event()
    with ProcessPoolExecutor(processes, context, _begin, (done, stop, os.getpid())) as pool:
        jobs = [pool.submit(_one, k, plan, schedule, seed) for k, seed in enumerate(seeds)]
        try:
            while wait(jobs, timeout=POLL_S).not_done:
                tell(sum(done) / len(seeds))
        except KeyboardInterrupt:
            stop.set()
        return [job.result() for job in jobs]


_SHARED: dict[str, Any] = {}  # of a worker process: what it was given when it began


def _begin(done: Any, stop: Any, parent: int) -> None:
    signal.signal(signal.SIGINT, signal.SIG_IGN)  # the parent decides
    signal.signal(signal.SIGTERM, signal.SIG_DFL)
    _SHARED.update(done=done, stop=stop, parent=parent)


def _one(index: int, plan: Plan, schedule: Schedule, seed: SeedSequence) -> RunResult:
    def tell(share: float) -> None:
        _SHARED["done"][index] = share

    def asked_to_stop() -> bool:
        if os.getppid() != _SHARED["parent"]:
            os._exit(1)  # the parent was killed: nobody will take the result, nor tell this process to end
        return bool(_SHARED["stop"].is_set())

    return run(plan, schedule, seed, tell, asked_to_stop)
