"""The recorded comparison in short: the same program, two cells, a tenth of the length."""

from __future__ import annotations

import runpy
from pathlib import Path

import pytest

RECORDED = runpy.run_path(str(Path(__file__).parent / "recorded.py"), run_name="read")


@pytest.mark.parametrize("name", ["ball and stick", "Y tree"])
def test_all_statistics_together(name: str) -> None:
    model, seconds = RECORDED["cells"]()[name]
    found = RECORDED["compare"](model, 0.1 * seconds, 3)
    assert found.probability > RECORDED["ACCEPTED"] and found.statistics >= 9
    assert found.batches > 2 * found.statistics
