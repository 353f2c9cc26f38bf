"""The report's benchmark runs, and checks the page before it times it."""

from __future__ import annotations

import shutil
from pathlib import Path

import pytest

from morphology import CellTree

CELL = Path(__file__).parent.parent / "data" / "granule.swc"


def test_the_page_is_checked_before_it_is_timed(monkeypatch: pytest.MonkeyPatch) -> None:
    pytest.importorskip("playwright.sync_api", reason="no playwright: the report is not opened in a browser")
    if not any(map(shutil.which, ("chromium", "chromium-browser", "google-chrome"))):
        pytest.skip("no chromium is installed: the report is not opened in a browser")
    monkeypatch.syspath_prepend(str(Path(__file__).parent))
    import report_speed

    tree = CellTree.from_file(CELL)
    result = report_speed.measure(tree)
    assert result["points"] == len(tree) and 0 < result["file_MB"] < 6
