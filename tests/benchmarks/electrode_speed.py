"""How fast the questions of one and two electrodes are answered on a real cell; the answers are checked first.

    python tests/benchmarks/electrode_speed.py [CELL.swc]

Prints JSON: the best of five runs each, on a model whose mean state is known.
"""

from __future__ import annotations

import json
import sys
from pathlib import Path

import numpy as np
from map_speed import DEFAULT, INPUTS, MEMBRANE, best

from cable import CableModel
from morphology import CellTree, Site


def measure(tree: CellTree) -> dict[str, object]:
    """All figures for one cell, between its soma and its last point."""
    model = CableModel(tree, MEMBRANE, INPUTS, (Site("far", swc_id=int(tree.ids[-1])),))
    lags, frequencies = np.linspace(-100, 100, 401), np.geomspace(0.1, 1000, 61)
    field = model.fluctuations()
    pair = model.pair("soma", "far", lags, frequencies)
    shared = model.correlation_map("soma")
    sources = model.sources("soma", 1e-6)
    difference = max(
        abs(np.sum(pair.covariances.at_zero_mV2, axis=0)[1, 1] / field.at("far").variance_mV2 - 1),
        abs(shared.correlation[-1] / pair.correlation - 1),
        abs(sources.variance_mV2.sum() / field.at("soma").variance_mV2 - 1),
    )
    if difference > 1e-5:
        raise SystemExit(f"the answers differ by {difference:.1e}; no times are given")
    return {
        "points": len(tree),
        "max_relative_difference": float(difference),
        "spectrum_s": best(lambda: model.spectrum("soma", frequencies)),
        "pair_s": best(lambda: model.pair("soma", "far", lags, frequencies)),
        "correlation_map_s": best(lambda: model.correlation_map("soma")),
        "sources_s": best(lambda: model.sources("soma", 1e-6)),
        "certificate": {"covariance_relative_error": pair.covariances.relative_error},
    }


if __name__ == "__main__":
    print(json.dumps(measure(CellTree.from_file(sys.argv[1] if len(sys.argv) > 1 else Path(DEFAULT))), indent=2))
