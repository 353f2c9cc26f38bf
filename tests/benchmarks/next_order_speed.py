"""How fast the map to the next order is on a real cell; the answers are checked first.

    python tests/benchmarks/next_order_speed.py [CELL.swc]

Prints JSON: the best of three runs each, on a model whose mean state is known.
"""

from __future__ import annotations

import json
import sys
from pathlib import Path

import numpy as np
from map_speed import DEFAULT, INPUTS, MEMBRANE, best

from cable import CableModel
from morphology import CellTree


def measure(tree: CellTree) -> dict[str, object]:
    """All figures for one cell."""
    model = CableModel(tree, MEMBRANE, tuple(INPUTS))
    found = model.next_order()
    linear = found.linear
    pair = model.next_pair(model.pair("soma", "soma", np.zeros(1), np.ones(1)))
    difference = abs(pair.covariance_mV2[0] / found.at_sites["soma"][1] ** 2 - 1)
    if difference > 1e-6:
        raise SystemExit(f"map and pair differ by {difference:.1e}; no times are given")
    change = found.sd_mV / linear.sd_mV - 1
    if not (np.isfinite(change).all() and 1e-4 < np.abs(change).max() < 1):
        raise SystemExit("the next order is no small correction here; no times are given")
    return {
        "points": len(tree),
        "pieces": len(found.medium.point.layout.row),
        "largest_relative_change_of_sd": float(np.abs(change).max()),
        "relative_error": found.relative_error,
        "max_relative_difference": float(difference),
        "linear_s": best(model.fluctuations, 3),
        "next_order_s": best(model.next_order, 3),
        "small_fluctuation_s": best(model.small_fluctuation, 3),
    }


if __name__ == "__main__":
    print(json.dumps(measure(CellTree.from_file(sys.argv[1] if len(sys.argv) > 1 else Path(DEFAULT))), indent=2))
