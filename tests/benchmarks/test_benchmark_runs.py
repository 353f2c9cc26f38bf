"""The benchmark runs and agrees with the column route; its times are nobody's assertion."""

from __future__ import annotations

import json
from pathlib import Path

import pytest

from benchmarks.map_speed import main

DATA = Path(__file__).parent.parent / "data"


def test_map_agrees_with_the_column_route(capsys: pytest.CaptureFixture[str]) -> None:
    main([str(DATA / "pyramidal_small.swc")])
    result = json.loads(capsys.readouterr().out)
    assert (result["points"], result["inputs"]) == (403, 2)
    assert result["max_relative_difference"] < 1e-8
    assert result["frequencies"] == result["certificate"]["frequencies"]
    assert result["certificate"]["quadrature_relative_error"] <= 1e-6
    assert all(result[key] > 0 for key in ("map_s", "column_route_s", "ratio", "floor_s", "over_floor", "peak_MB"))
    assert "scaled to all points" in result["note"]


def test_one_size_of_the_scaling(capsys: pytest.CaptureFixture[str]) -> None:
    main(["--points", "600"])
    result = json.loads(capsys.readouterr().out)
    assert result["points"] == 600
    assert result["map_s"] > 0 and result["peak_MB"] > 0
