"""How fast the sources of a site and the modes of a cell are found; the answers are checked first.

    python tests/benchmarks/sources_speed.py [CELL.swc]
    python tests/benchmarks/sources_speed.py --points 100000

Prints JSON: the best of five runs for sources and of two for modes, on a model whose mean state is known, and the
peak memory of the whole. `--points` takes a random arbor of that size, once.
"""

from __future__ import annotations

import json
import sys
import time
from pathlib import Path

import numpy as np
from map_speed import DEFAULT, INPUTS, MEMBRANE, best, peak_MB

from cable import CableModel
from morphology import CellTree
from morphology.growth import random_arbor

SMALL = Path(__file__).parent.parent / "data" / "pyramidal_small.swc"
TOLERANCE, MODES, AGREED = 1e-6, 10, 1e-5


def check_modes(model: CableModel) -> float:
    """Largest relative difference between Lanczos modes and those of the whole matrix, for a small cell."""
    every = model.modes(len(model.refined.point.layout.parent), tolerance=TOLERANCE)
    leading = model.modes(MODES, tolerance=TOLERANCE)
    number = abs(leading.participation - every.participation)
    if number > 4 * leading.participation_se:
        raise SystemExit(f"the participation number differs by {number:.2g}; no times are given")
    return float(np.abs(leading.share / every.share[:MODES] - 1).max())


def check_sources(model: CableModel) -> float:
    """Relative difference between the sum of all sources and the variance that the sweep finds, by input."""
    at = model.fluctuations(TOLERANCE).at("soma").variance_by_input_mV2
    found = model.sources("soma", TOLERANCE).variance_by_input_mV2
    return max(abs(found[name].sum() / at[name] - 1) for name in at)


def measure(tree: CellTree, times: int = 5) -> dict[str, object]:
    """All figures for one cell.

    Raises:
        SystemExit: an answer is wrong.
    """
    model = CableModel(tree, MEMBRANE, INPUTS)
    small = CableModel(CellTree.from_file(SMALL), MEMBRANE, INPUTS)
    start = time.perf_counter()
    model.refined  # noqa: B018 - the mean state, once
    refined = time.perf_counter() - start
    differences = {"sources": check_sources(model), "modes_of_a_small_cell": check_modes(small)}
    if max(differences.values()) > AGREED:
        raise SystemExit(f"the answers differ: {differences}; no times are given")
    kept = []
    return {
        "points": len(tree),
        "max_relative_difference": differences,
        "mean_state_s": refined,
        "sources_s": best(lambda: model.sources("soma", TOLERANCE), times),
        "modes": MODES,
        "modes_s": best(lambda: kept.append(model.modes(MODES, tolerance=TOLERANCE)), min(times, 2)),
        "share_of_the_modes": float(kept[0].share.sum()),
        "participation": kept[0].participation,
        "participation_se": kept[0].participation_se,
        "peak_MB": peak_MB(),
    }


def main(arguments: list[str]) -> None:
    """Measure the cell that the arguments name and print it."""
    if arguments[:1] == ["--points"]:
        found = measure(random_arbor(7, int(arguments[1])), times=1)
    else:
        found = measure(CellTree.from_file(arguments[0] if arguments else DEFAULT))
    print(json.dumps(found, indent=2))


if __name__ == "__main__":
    main(sys.argv[1:])
