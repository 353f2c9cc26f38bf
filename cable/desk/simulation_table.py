"""A simulation as a table, a document and sentences."""

from __future__ import annotations

import math
from typing import TYPE_CHECKING, Any

import numpy as np

from cable.desk.messages import shown
from cable.desk.tables import Table
from cable.desk.terminal import console

if TYPE_CHECKING:
    from cable.simulation.simulation import Simulation

NAMES = {
    "mean_mV": ("mean_mV", "mean_se_mV", "computed_mean_mV", "z_mean"),
    "sd_mV": ("sd_mV", "sd_se_mV", "computed_sd_mV", "z_sd"),
    "correlation_time_ms": (
        "correlation_time_ms",
        "correlation_time_se_ms",
        "computed_correlation_time_ms",
        "z_correlation_time",
    ),
    "correlation": ("correlation", "correlation_se", "computed_correlation", "z_correlation"),
    "skewness": ("skewness", "skewness_se", "computed_skewness", "z_skewness"),
}
DOUBTFUL_Z = 4.0


def simulation_table(found: Simulation) -> Table:
    """One row a site: simulated numbers, their standard errors, the computed ones, and differences in these errors."""
    columns: dict[str, list[Any]] = {"site": [one.site for one in found.sites]}
    for quantity, (value, se, computed, z) in NAMES.items():
        pairs = [getattr(one, quantity) for one in found.sites]
        columns[value] = [pair.value for pair in pairs]
        columns[se] = [pair.se for pair in pairs]
        columns[computed] = [pair.computed for pair in pairs]
        columns[z] = [pair.z for pair in pairs]
    return Table(columns)


def simulation_document(found: Simulation) -> dict[str, Any]:
    """All of a simulation but its traces."""
    return {
        "mode": "frozen driving force" if found.frozen else "conductances",
        "seconds": found.seconds,
        "asked_seconds": found.asked_seconds,
        "interrupted": found.interrupted,
        "runs": found.runs,
        "seed": found.seed,
        "batches": found.batches,
        "batch_ms": found.batch_ms,
        "burn_in_ms": found.burn_in_ms,
        "dt_ms": found.dt_ms,
        "compartments": len(found.grid.cells.parent),
        "steps_per_second": found.steps_per_second,
        "sd_error_of_compartments": float(np.abs(found.grid.space_error).max(initial=0.0)),
        "sd_error_of_time_step": float(np.abs(found.grid.time_error).max(initial=0.0)),
        "sites": simulation_table(found).rows(),
    }


def trace_table(found: Simulation) -> Table:
    """Voltages at the beginning of the first run, one column a site."""
    columns: dict[str, Any] = {"time_ms": found.trace_ms}
    columns |= {f"{one.site}_mV": found.trace_mV[:, k] for k, one in enumerate(found.sites)}
    return Table(columns)


def print_simulation(found: Simulation, title: str) -> None:
    """Simulated beside computed numbers on the terminal, and how they were made."""
    from rich import box
    from rich.table import Table as Grid
    from rich.text import Text

    from cable.desk.terminal import print_whole

    out = console()
    grid = Grid(box=box.SIMPLE_HEAD, pad_edge=False)
    grid.add_column("site")
    for heading in ("mean, mV", "SD, mV", "corr. time, ms", "corr. with " + shown(found.sites[0].site, 20), "skewness"):
        grid.add_column(f"{heading}\nsimulated", justify="right")
        grid.add_column("\ncomputed", justify="right")
        grid.add_column("\nz", justify="right")
    for one in found.sites:
        cells = [shown(one.site, 60)]
        for quantity, digits in zip(NAMES, (2, 3, 1, 3, 2), strict=True):
            pair = getattr(one, quantity)
            if pair.se > 0:
                cells += [f"{pair.value:.{digits}f} ± {pair.se:.{digits}f}"]
            else:
                cells += ["" if math.isnan(pair.value) else f"{pair.value:.{digits}f}"]
            cells += ["" if math.isnan(pair.computed) else f"{pair.computed:.{digits}f}"]
            cells += ["" if math.isnan(pair.z) else f"{pair.z:+.1f}"]
        grid.add_row(*(Text(cell) for cell in cells))
    out.print(Text(shown(title), style="bold"))
    print_whole(out, grid)
    for sentence in simulation_sentences(found):
        out.print(sentence)


def simulation_sentences(found: Simulation) -> list[str]:
    """How the numbers were made, and what their differences mean."""
    runs = "1 run" if found.runs == 1 else f"{found.runs} runs"
    told = []
    if found.interrupted:
        told.append(f"Stopped early: {found.seconds:.3g} s of {found.asked_seconds:.3g} s.")
    told.append(
        f"{found.seconds:.3g} s in {runs}, {len(found.grid.cells.parent):,} compartments, steps of "
        f"{found.dt_ms:.3g} ms, {found.batches} batches of {found.batch_ms:.3g} ms; ± is one standard error, z the "
        "difference in standard errors."
    )
    space, time = (float(np.abs(error).max(initial=0.0)) for error in (found.grid.space_error, found.grid.time_error))
    told.append(f"Compartments change the SD by {100 * space:.2g} %, time steps by {100 * time:.2g} % (computed).")
    worst = max((abs(one.sd_mV.z) for one in found.sites if not math.isnan(one.sd_mV.z)), default=0.0)
    if found.frozen:
        told.append("The driving force was frozen, as linear theory has it: differences are statistical.")
    elif worst > DOUBTFUL_Z:
        apart = max((one.sd_mV.computed / one.sd_mV.value - 1 for one in found.sites if one.sd_mV.value > 0), key=abs)
        told.append(
            f"Linear theory gives SDs up to {abs(100 * apart):.2g} % too {'high' if apart > 0 else 'low'}: "
            "conductances multiply the voltage here, which it leaves out; --frozen compares without that."
        )
    return told
