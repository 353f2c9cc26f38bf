"""The electrodes' benchmark runs, and checks its answers before it times them."""

from __future__ import annotations

from pathlib import Path

import pytest

from morphology import CellTree

CELL = Path(__file__).parent.parent / "data" / "pyramidal_small.swc"


def test_answers_agree_before_they_are_timed(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.syspath_prepend(str(Path(__file__).parent))
    import electrode_speed

    result = electrode_speed.measure(CellTree.from_file(CELL))
    assert result["points"] == 403
    assert result["max_relative_difference"] < 1e-5
    assert all(result[key] > 0 for key in ("spectrum_s", "pair_s", "correlation_map_s", "sources_s"))
