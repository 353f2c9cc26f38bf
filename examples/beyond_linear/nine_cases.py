"""How far does linear theory hold, and what does the next order bring?

    python examples/beyond_linear/nine_cases.py [SECONDS] [CELL ...]

Three scenarios (weak, as in vivo, strong) on a sphere, on the invented cell and on a real one: mean and SD by linear
theory, to the next order, and simulated. The simulation runs twice with the same spikes, once with the driving force
frozen, which is what linear theory computes, and once in full; the ratio of both SDs is known much better than either.
"""

from __future__ import annotations

import math
import sys
from dataclasses import dataclass
from pathlib import Path

import numpy as np

from cable import CableModel, Kernel, Membrane, SynapticInput, simulate
from morphology import CellTree, Site, Zone

ROOT = Path(__file__).parents[2]
MEMBRANE = Membrane(axial_resistivity_ohm_cm=150.0, capacitance_uF_cm2=1.0, resistance_ohm_cm2=20000.0, rest_mV=-70.0)
# rates and sizes of events, times those in vivo
SCENARIOS = {"weak": (0.2, 0.5), "as in vivo": (1.0, 1.0), "strong": (0.5, 3.0)}
SEED = 5


@dataclass(frozen=True)
class Case:
    """One cell with its sites; `spread` says how excitation counts on it."""

    cell: str
    tree: CellTree
    sites: tuple[Site, ...]
    kinds: tuple[str, ...] | None
    spread: dict[str, float]


def cases() -> list[Case]:
    """The three cells."""
    heron = CellTree.from_file(ROOT / "examples" / "heron" / "heron.swc")
    real = CellTree.from_file(ROOT / "tests" / "data" / "pyramidal_small.swc")
    far = int(np.argmax(np.where(np.isin(real.kinds, (3, 4)), real.path_um, 0.0)))
    way = real.path_to(far)
    return [
        Case("sphere", CellTree.from_text("1 1 0 0 0 15 -1\n"), (), None, {"density_per_um2": 0.5}),
        Case(
            "invented cell",
            heron,
            (Site("tuft", swc_id=1125, fraction=0.5),),
            ("basal", "apical"),
            {"density_per_um": 1.0},
        ),
        Case(
            "real cell",
            real,
            (Site("half way", swc_id=int(real.ids[way[len(way) // 2]])), Site("far", swc_id=int(real.ids[far]))),
            ("basal", "apical"),
            {"density_per_um": 1.0},
        ),
    ]


def model(case: Case, scenario: str) -> CableModel:
    """A case under a scenario."""
    rate, size = SCENARIOS[scenario]
    excitation = SynapticInput(
        name="excitation",
        where=Zone() if case.kinds is None else Zone(kinds=case.kinds),
        **case.spread,
        rate_Hz=1.0 * rate,
        conductance_nS=0.5 * size,
        reversal_mV=0.0,
        kernel=Kernel.two_exponential(0.3, 2.0),
    )
    inhibition = SynapticInput(
        name="inhibition",
        where=Zone() if case.kinds is None else Zone(kinds=("soma", *case.kinds)),
        density_per_um2=0.02,
        rate_Hz=4.0 * rate,
        conductance_nS=0.8 * size,
        reversal_mV=-75.0,
        kernel=Kernel.two_exponential(0.5, 8.0),
    )
    return CableModel(case.tree, MEMBRANE, (excitation, inhibition), case.sites)


def rows(case: Case, scenario: str, seconds: float) -> list[str]:
    """The lines of the table for one case."""
    one = model(case, scenario)
    linear, beyond, index = one.fluctuations(), one.next_order(), one.small_fluctuation()
    frozen, full = (simulate(one, seconds, SEED, frozen=mode) for mode in (True, False))
    lines = []
    for k, site in enumerate(one.site_names):
        at, (mean, sd) = linear.at(site), beyond.at_sites[site]
        ratio, se = paired(frozen.moments.powers[:, :, k], full.moments.powers[:, :, k])
        simulated = at.sd_mV * ratio
        shift = full.at(site).mean_mV.value - frozen.at(site).mean_mV.value
        lines.append(
            f"| {case.cell} | {scenario} | {site} | {at.sd_mV:.3f} | {sd:.3f} | {simulated:.3f} ± {simulated * se:.3f} "
            f"| {100 * (1 / ratio - 1):+.1f} % | {100 * (sd / simulated - 1):+.1f} % | {100 * se:.1f} % "
            f"| {mean - at.mean_mV:+.2f} | {shift:+.2f} | {100 * index.sd_relative_error[k]:.1f} % |"
        )
    return lines


def paired(frozen: np.ndarray, full: np.ndarray) -> tuple[float, float]:
    """Ratio of the SDs of two runs with the same spikes and its relative standard error, from batches (batches, 4)."""
    parts, variances = [], []
    for powers in (frozen, full):
        mean = powers[:, 0].mean()
        square = powers[:, 1] - 2 * mean * powers[:, 0] + mean**2
        variances.append(square.mean())
        parts.append(square / square.mean() / 2)
    apart = parts[1] - parts[0]
    return math.sqrt(variances[1] / variances[0]), float(apart.std(ddof=1) / math.sqrt(len(apart)))


def main(arguments: list[str]) -> None:
    seconds = float(arguments[0]) if arguments else 100.0
    print("| cell | scenario | site | SD linear | next order | simulated, mV | linear | next order | s.e. ", end="")
    print("| shift of the mean, next order | simulated, mV | index |")
    print("|---" * 12 + "|")
    for case in cases():
        if arguments[1:] and case.cell.split()[0] not in arguments[1:]:
            continue
        for scenario in SCENARIOS:
            print("\n".join(rows(case, scenario, seconds)), flush=True)


if __name__ == "__main__":
    main(sys.argv[1:])
