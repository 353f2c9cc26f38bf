"""A small branched cell of our own, its scenario, and a browser to look at its report with."""

from __future__ import annotations

import shutil
from collections.abc import Iterator
from pathlib import Path
from types import SimpleNamespace

import pytest

BROWSERS = "chromium", "chromium-browser", "google-chrome"
SCENARIO = """
title = '''Wren </script><script>document.title="gone"</script>'''

[cell]
morphology = "wren.swc"

[membrane]
axial_resistivity_ohm_cm = 120.0
capacitance_uF_cm2 = 0.9
resistance_ohm_cm2 = 14000.0
rest_mV = -70.0

[[input]]
name = "<img src=x onerror=document.title='gone'>"
where = { kinds = ["basal"], path_um = [150, inf] }
density_per_um = 0.5
rate_Hz = 2.0
conductance_nS = 0.5
reversal_mV = 0.0
kernel = { rise_ms = 0.2, decay_ms = 2.0 }

[[input]]
name = "inhibition"
where = { kinds = ["soma"] }
density_per_um2 = 0.05
rate_Hz = 3.0
conductance_nS = 0.6
reversal_mV = -75.0
kernel = { decay_ms = 6.0 }

[[site]]
name = "far & <wide>"
at = { swc_id = 42 }

[[site]]
name = "=between"
at = { kinds = ["basal"], path_um = 333, radius_um = [1.2, inf] }

[threshold]
level_mV = -50.0
"""


def wren() -> str:
    """A soma of 10 µm, a dendrite of 600 µm along x, which tapers, and a thin twig of 120 µm down from it."""
    rows = [f"{k + 2} 3 {10 + 15 * k} 0 0 {1.8 - 0.01 * k:.3f} {k + 1}" for k in range(41)]
    twig = [f"{43 + k} 4 250 {-20 * (k + 1)} {3 * k} 0.4 {42 + k if k else 18}" for k in range(6)]
    return "\n".join(["1 1 0 0 0 10 -1", *rows, *twig, ""])


@pytest.fixture(scope="session")
def nest(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """A folder with `wren.swc` and `wren.toml`."""
    folder = tmp_path_factory.mktemp("nest")
    (folder / "wren.swc").write_text(wren())
    (folder / "wren.toml").write_text(SCENARIO)
    return folder


@pytest.fixture(scope="session")
def made(nest: Path) -> SimpleNamespace:
    """The scenario as it was read, its answer, and its report as text and as a file."""
    from cable.desk.report.page import render
    from cable.desk.scenario import read_scenario

    scenario = read_scenario(nest / "wren.toml")
    field = scenario.model.fluctuations()
    text = render(field, scenario, "wren.html")
    (nest / "wren.html").write_text(text, encoding="utf-8")
    return SimpleNamespace(scenario=scenario, field=field, text=text, path=nest / "wren.html")


@pytest.fixture(scope="module")
def chromium() -> Iterator[object]:
    """A real browser without a window; the test is skipped, and says why, where there is none."""
    driver = pytest.importorskip("playwright.sync_api", reason="no playwright: the report is not opened in a browser")
    program = next(filter(None, map(shutil.which, BROWSERS)), None)
    if program is None:
        pytest.skip(f"none of {', '.join(BROWSERS)} is installed: the report is not opened in a browser")
    with driver.sync_playwright() as play:
        browser = play.chromium.launch(executable_path=program, args=["--no-sandbox"])
        yield browser
        browser.close()
