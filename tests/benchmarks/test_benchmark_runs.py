"""The benchmark runs and agrees with the column route; its times are nobody's assertion."""

from __future__ import annotations

from pathlib import Path

from benchmarks.map_speed import measure
from morphology import CellTree


def test_map_agrees_with_the_column_route() -> None:
    result = measure(CellTree.from_file(Path(__file__).parent.parent / "data" / "pyramidal_small.swc"))
    assert result["points"] == 403
    assert result["max_relative_difference"] < 1e-8
    assert result["certificate"]["quadrature_relative_error"] <= 1e-6
    assert all(result[key] > 0 for key in ("map_s", "column_route_s", "ratio", "floor_s", "over_floor", "peak_MB"))
