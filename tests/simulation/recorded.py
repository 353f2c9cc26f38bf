"""A long simulation with frozen driving force on five cells, against linear theory.

    python tests/simulation/recorded.py [SHARE]

For every cell all statistics of all sites (mean, SD, skewness, correlation with the soma, correlation time) are
compared at once: with d the differences and S the covariance of their linear parts over n batches, n·d'S⁻¹d is
Hotelling's T², which allows for their correlations and has an F distribution (Hotelling 1931, Ann Math Stat 2:360; from
memory). SHARE of the full length may be given; the table in DEVELOPERS.md is that of the full one.
"""

from __future__ import annotations

import sys
import time
from dataclasses import dataclass
from pathlib import Path

import numpy as np
from scipy import stats

from cable import CableModel, Kernel, Membrane, SynapticInput, load_scenario, simulate
from cable.simulation.simulation import Simulation
from morphology import CellTree, Site, Zone

ROOT = Path(__file__).parents[2]
PLAIN = Membrane(axial_resistivity_ohm_cm=150.0, capacitance_uF_cm2=1.0, resistance_ohm_cm2=20000.0, rest_mV=-70.0)
TRUNK = 0.5 * 2 ** (2 / 3) * 1.2
Y_TREE = (
    f"1 3 0 0 0 {TRUNK!r} -1\n2 3 400 0 0 {TRUNK!r} 1\n3 3 400 0 0 0.6 2\n4 3 580 240 0 0.6 3\n"
    "5 3 400 0 0 0.6 2\n6 3 580 -240 0 0.6 5\n"
)
ACCEPTED = 0.01  # probability of a larger T²


@dataclass(frozen=True)
class Outcome:
    """What one cell gave."""

    statistics: int
    batches: int
    seconds: float
    sd_error: float
    worst_z: float
    probability: float
    minutes: float


def cells() -> dict[str, tuple[CableModel, float]]:
    """The models and how long each is simulated, s."""
    current = SynapticInput(
        name="a", where=Zone(), density_per_um2=0.08, rate_Hz=1.0, current_pA=10.0, kernel=Kernel.exponential(2.0)
    )
    excitation = SynapticInput(
        name="e",
        where=Zone(),
        density_per_um2=0.05,
        rate_Hz=1.0,
        conductance_nS=0.5,
        reversal_mV=0.0,
        kernel=Kernel.two_exponential(0.3, 2.5),
    )
    inhibition = SynapticInput(
        name="i",
        where=Zone(),
        density_per_um2=0.02,
        rate_Hz=4.0,
        conductance_nS=0.8,
        reversal_mV=-75.0,
        kernel=Kernel.alpha(3.0),
    )
    real = CellTree.from_file(ROOT / "tests" / "data" / "pyramidal_small.swc")
    far = int(np.argmax(real.path_um))
    way = real.path_to(far)
    places = (Site("half way", swc_id=int(real.ids[way[len(way) // 2]])), Site("far", swc_id=int(real.ids[far])))
    stick = CellTree.from_text("1 1 0 0 0 10 -1\n2 3 10 0 0 1 1\n3 3 1010 0 0 1 2\n")
    return {
        "sphere": (CableModel(CellTree.from_text("1 1 0 0 0 10 -1\n"), PLAIN, (excitation, inhibition)), 250.0),
        "ball and stick": (CableModel(stick, PLAIN, (current,), (Site("tip", swc_id=3),)), 300.0),
        "Y tree": (
            CableModel(CellTree.from_text(Y_TREE), PLAIN, (current,), (Site("tip", swc_id=4), Site("other", swc_id=6))),
            300.0,
        ),
        "invented cell": (load_scenario(ROOT / "examples" / "heron" / "heron.toml"), 160.0),
        "real cell": (CableModel(real, PLAIN, (excitation, inhibition), places), 250.0),
    }


def differences(found: Simulation) -> tuple[np.ndarray, np.ndarray]:
    """(p,) simulated less computed numbers and (batches, p) their linear parts, from the raw sums of the batches."""
    powers, products = found.moments.powers, found.moments.products
    n = len(powers)
    mean = powers[:, 0].mean(axis=0)
    second = powers[:, 1] - 2 * mean * powers[:, 0] + mean**2
    third = powers[:, 2] - 3 * mean * powers[:, 1] + 3 * mean**2 * powers[:, 0] - mean**3
    variance = second.mean(axis=0)
    sd = np.sqrt(variance)
    apart, parts = [], []
    for k, one in enumerate(found.sites):
        shift = powers[:, 0, k] - mean[k]
        skew = third[:, k].mean() / sd[k] ** 3
        mixed = products[:, k] - mean[0] * powers[:, 0, k] - mean[k] * powers[:, 0, 0] + mean[0] * mean[k]
        rho = mixed.mean() / (sd[0] * sd[k])
        scale = found.batch_ms / 2 / variance[k] * n / (n - 1)
        lasting = scale * (shift**2).mean()
        linear = {
            "mean_mV": shift,
            "sd_mV": second[:, k] / (2 * sd[k]),
            "skewness": third[:, k] / sd[k] ** 3 - 1.5 * skew * second[:, k] / variance[k] - 3 * shift / sd[k],
            "correlation": mixed / (sd[0] * sd[k])
            - rho / 2 * (second[:, 0] / variance[0] + second[:, k] / variance[k]),
            "correlation_time_ms": scale * shift**2 - lasting * second[:, k] / variance[k],
        }
        for quantity, part in linear.items():
            pair = getattr(one, quantity)
            if np.isnan(pair.computed) or (k == 0 and quantity == "correlation"):
                continue
            apart.append(pair.value - pair.computed)
            parts.append(part)
    return np.array(apart), np.array(parts).T


def compare(model: CableModel, seconds: float, seed: int) -> Outcome:
    """Simulate one cell and test all its statistics together."""
    start = time.perf_counter()
    found = simulate(model, seconds, seed, frozen=True, runs=4)
    apart, parts = differences(found)
    n, p = parts.shape
    covariance = np.cov(parts.T) / n
    square = apart @ np.linalg.solve(covariance, apart)
    return Outcome(
        statistics=p,
        batches=n,
        seconds=found.seconds,
        sd_error=max(one.sd_mV.se / one.sd_mV.value for one in found.sites),
        worst_z=float(np.max(np.abs(apart) / np.sqrt(np.diag(covariance)))),
        probability=float(stats.f.sf(square * (n - p) / (p * (n - 1)), p, n - p)),
        minutes=(time.perf_counter() - start) / 60,
    )


def main(arguments: list[str]) -> None:
    share = float(arguments[0]) if arguments else 1.0
    print("| cell | simulated | batches | s.e. of SD, at most | statistics | largest of them in s.e. | probability |")
    print("|---|---|---|---|---|---|---|")
    for k, (name, (model, seconds)) in enumerate(cells().items()):
        one = compare(model, share * seconds, 200 + k)
        print(
            f"| {name} | {one.seconds:.0f} s | {one.batches} | {100 * one.sd_error:.2f} % | {one.statistics} "
            f"| {one.worst_z:.1f} | {one.probability:.2g} |",
            flush=True,
        )


if __name__ == "__main__":
    main(sys.argv[1:])
