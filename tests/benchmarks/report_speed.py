"""How fast a report is made, opens, and follows the pointer in Chromium; what it shows is checked first.

    python tests/benchmarks/report_speed.py [CELL.swc]

Prints JSON for the cell and, without CELL, also for an invented one of 45,000 points.
"""

from __future__ import annotations

import json
import math
import shutil
import sys
import tempfile
import time
from itertools import pairwise
from pathlib import Path

from map_speed import DEFAULT, INPUTS, MEMBRANE

from cable import CableModel, write_report
from morphology import CellTree, Site
from morphology.growth import random_arbor

COLLECT = """() => {
    window.frames_ = [];
    const told = (at) => { frames_.push(at); requestAnimationFrame(told); };
    requestAnimationFrame(told);
}"""
MOVES = 150


def measure(tree: CellTree) -> dict[str, object]:
    """Size, time to make, time to open, and time from frame to frame under a moving pointer, for one cell."""
    from playwright.sync_api import sync_playwright

    model = CableModel(tree, MEMBRANE, INPUTS, (Site("far", swc_id=int(tree.ids[-1])),))
    program = shutil.which("chromium") or shutil.which("chromium-browser") or shutil.which("google-chrome")
    with tempfile.TemporaryDirectory() as folder, sync_playwright() as play:
        begun = time.perf_counter()
        path = write_report(model, Path(folder) / "report.html", tolerance=1e-6)
        made_s = time.perf_counter() - begun
        browser = play.chromium.launch(executable_path=program, args=["--no-sandbox"])
        page = browser.new_page(viewport={"width": 1280, "height": 900})
        page.goto(path.as_uri())
        opened_ms = page.evaluate("performance.getEntriesByType('navigation')[0].loadEventEnd")
        shown = page.locator("#reading tbody tr", has_text="SD, mV").locator("td").first.inner_text()
        expected = model.fluctuations(1e-6).at("far").sd_mV
        if abs(float(shown) / expected - 1) > 1e-3:
            raise SystemExit(f"the page shows an SD of {shown} mV, expected {expected:.5g}; no times are given")
        page.evaluate(COLLECT)
        box = page.locator("#overlay").bounding_box()
        for k in range(MOVES):
            x, y = 0.5 + 0.35 * math.sin(k / 9), 0.5 + 0.4 * math.cos(k / 13)
            page.mouse.move(box["x"] + box["width"] * x, box["y"] + box["height"] * y)
        at = page.evaluate("frames_")
        browser.close()
        size = path.stat().st_size
    steps = sorted(b - a for a, b in pairwise(at[1:]))
    return {
        "points": len(tree),
        "file_MB": size / 1e6,
        "made_s": made_s,
        "opened_ms": opened_ms,
        "frame_median_ms": steps[len(steps) // 2],
        "frame_95_percent_ms": steps[int(0.95 * len(steps))],
    }


if __name__ == "__main__":
    cell = CellTree.from_file(sys.argv[1] if len(sys.argv) > 1 else DEFAULT)
    cells = [cell] if len(sys.argv) > 1 else [cell, random_arbor(5, 45_000)]
    print(json.dumps([measure(one) for one in cells], indent=1))
