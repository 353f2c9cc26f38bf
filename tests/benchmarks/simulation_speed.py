"""Steps a second of the simulation, and what it costs to know SDs by simulation instead of theory.

    python tests/benchmarks/simulation_speed.py [CELL.swc]

The answer is checked first. Times are of one run on one machine; only their ratio means much elsewhere.
"""

from __future__ import annotations

import json
import sys
import time
from itertools import islice
from pathlib import Path

import numpy as np

from cable import CableModel, Kernel, Membrane, SynapticInput, load_scenario, simulate
from cable.simulation.discretisation import choose_grid
from cable.simulation.spikes import common_trains
from cable.simulation.stepping import CHUNK, Plan, trajectory
from morphology import CellTree, Zone

ROOT = Path(__file__).parents[2]
LARGE, EXAMPLE = ROOT / "tests" / "data" / "ca1_pyramidal.swc", ROOT / "examples" / "heron" / "heron.toml"
MEMBRANE = Membrane(axial_resistivity_ohm_cm=150.0, capacitance_uF_cm2=1.0, resistance_ohm_cm2=20000.0, rest_mV=-70.0)
INPUTS = (
    SynapticInput(
        name="excitation",
        where=Zone(kinds=("basal", "apical")),
        density_per_um=1.0,
        rate_Hz=1.0,
        conductance_nS=0.3,
        reversal_mV=0.0,
        kernel=Kernel.two_exponential(0.3, 2.0),
    ),
    SynapticInput(
        name="inhibition",
        where=Zone(),
        density_per_um2=0.02,
        rate_Hz=4.0,
        conductance_nS=0.6,
        reversal_mV=-75.0,
        kernel=Kernel.exponential(8.0),
    ),
)
WANTED = 0.01  # relative standard error of the SD


def steps_per_second(tree: CellTree, chunks: int) -> dict[str, float]:
    """Of one process, with full conductances."""
    model = CableModel(tree, MEMBRANE, INPUTS)
    grid = choose_grid(model, 0.01)
    nodes = np.array([grid.point.layout.node_at(place) for place in model.site_places.values()])
    plan = Plan(grid.cells, common_trains(grid.point.sources), grid.dt_ms, False, nodes)
    running = trajectory(plan, np.random.default_rng(1))
    next(running)
    start = time.perf_counter()
    for _ in islice(running, chunks):
        pass
    taken = time.perf_counter() - start
    return {"compartments": len(grid.cells.parent), "dt_ms": grid.dt_ms, "steps_per_second": chunks * CHUNK / taken}


def price(seconds: float) -> dict[str, float]:
    """Seconds of work until the SDs at the example's sites are known to `WANTED`, over those of theory.

    Raises:
        SystemExit: simulation and theory differ where they may not.
    """
    model = load_scenario(EXAMPLE)
    start = time.perf_counter()
    model.fluctuations()
    theory = time.perf_counter() - start
    start = time.perf_counter()
    found = simulate(model, seconds, seed=1, frozen=True, runs=2, processes=1)
    taken = time.perf_counter() - start
    worst_z = max(abs(one.sd_mV.z) for one in found.sites)
    if worst_z > 4.5:
        raise SystemExit(f"simulated and computed SDs differ by {worst_z:.1f} standard errors; no times are given")
    error = max(one.sd_mV.se / one.sd_mV.value for one in found.sites)
    needed = taken * (error / WANTED) ** 2
    return {
        "theory_s": theory,
        "simulated_s": found.seconds,
        "relative_error_reached": error,
        "work_for_1_percent_s": needed,
        "ratio": needed / theory,
        "worst_z": worst_z,
    }


def main(arguments: list[str]) -> None:
    tree = CellTree.from_file(arguments[0] if arguments else LARGE)
    found = {"points": len(tree), "price": price(30.0), **steps_per_second(tree, 40)}
    print(json.dumps(found, indent=2))


if __name__ == "__main__":
    main(sys.argv[1:])
