"""The next order's benchmark runs, and checks its answers before it times them."""

from __future__ import annotations

from pathlib import Path

import pytest

from morphology import CellTree

CELL = Path(__file__).parent.parent / "data" / "pyramidal_small.swc"


def test_answers_agree_before_they_are_timed(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.syspath_prepend(str(Path(__file__).parent))
    import next_order_speed

    result = next_order_speed.measure(CellTree.from_file(CELL))
    assert result["points"] == 403
    assert result["max_relative_difference"] < 1e-6
    assert all(result[key] > 0 for key in ("linear_s", "next_order_s", "small_fluctuation_s"))
