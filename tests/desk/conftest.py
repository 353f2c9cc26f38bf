"""A small scenario of our own in a fresh folder, and the command line as a person meets it."""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path

import pytest
from typer.testing import CliRunner, Result

from cable.desk.cli import app

SCENARIO = """
title = "stick"

[cell]
morphology = "stick.swc"

[membrane]
axial_resistivity_ohm_cm = 150.0
capacitance_uF_cm2 = 1.0
resistance_ohm_cm2 = 15000.0
rest_mV = -70.0

[[input]]
name = "excitation"
where = { kinds = ["basal"], path_um = [200, inf] }
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
name = "half way"
at = { swc_id = 22 }

[[site]]
name = "between"
at = { kinds = ["basal"], path_um = 333 }

[threshold]
level_mV = -50.0
"""


def stick() -> str:
    """A soma of 10 µm and one dendrite of 600 µm which tapers from 1.8 to 1.2 µm, in rows of 15 µm."""
    rows = [f"{k + 2} 3 {10 + 15 * k} 0 0 {1.8 - 0.015 * k:.3f} {k + 1}" for k in range(41)]
    return "\n".join(["1 1 0 0 0 10 -1", *rows, ""])


@pytest.fixture
def folder(tmp_path: Path) -> Path:
    """A folder with `stick.swc` (`stick`) and `stick.toml`."""
    (tmp_path / "stick.swc").write_text(stick())
    (tmp_path / "stick.toml").write_text(SCENARIO)
    return tmp_path


@pytest.fixture
def run(folder: Path, monkeypatch: pytest.MonkeyPatch) -> Callable[..., Result]:
    """Run the command inside the folder; a traceback fails the test."""
    monkeypatch.chdir(folder)
    monkeypatch.setenv("COLUMNS", "200")

    def invoke(*arguments: object) -> Result:
        result = CliRunner().invoke(app, [str(a) for a in arguments])
        if result.exception is not None and not isinstance(result.exception, SystemExit):
            raise result.exception
        return result

    return invoke


@pytest.fixture
def edited(folder: Path) -> Callable[..., Path]:
    """The scenario with pieces of its text replaced, as another file of the folder."""

    def edit(*changes: tuple[str, str]) -> Path:
        text = SCENARIO
        for old, new in changes:
            assert old in text
            text = text.replace(old, new, 1)
        path = folder / "edited.toml"
        path.write_text(text)
        return path

    return edit
