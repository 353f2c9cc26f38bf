"""The examples run as they stand, and their answers hold together and keep their values."""

from __future__ import annotations

import os
import runpy
import subprocess
import sys
from pathlib import Path
from typing import Any

import pytest
from numpy.testing import assert_allclose

EXAMPLES = Path(__file__).parents[2] / "examples"
NAMES = sorted(path.parent.name for path in EXAMPLES.glob("*/question.py"))


def answer(name: str) -> dict[Any, Any]:
    found: dict[Any, Any] = runpy.run_path(str(EXAMPLES / name / "question.py"))["answer"]()
    return found


@pytest.mark.parametrize("name", NAMES)
def test_scripts_run_and_speak(name: str, tmp_path: Path) -> None:
    said = subprocess.run(
        [sys.executable, str(EXAMPLES / name / "question.py")],
        cwd=tmp_path,
        env={**os.environ, "PYTHONIOENCODING": "utf-8"},
        capture_output=True,
        text=True,
        encoding="utf-8",
    )
    assert said.returncode == 0 and not said.stderr, said.stderr
    assert "nan" not in said.stdout and len(said.stdout.splitlines()) >= 4
    assert not list(tmp_path.iterdir())


def test_inhibition_in_the_tuft_is_felt_there_and_hardly_at_the_soma() -> None:
    found = answer("inhibition")
    assert_allclose(found["mean_shift_tuft_mV"], -8.45, atol=0.005)
    assert_allclose(found["mean_shift_soma_mV"], -1.46, atol=0.005)
    assert_allclose([found["sd_change_tuft"], found["sd_change_soma"]], [-0.171, -0.014], atol=5e-4)
    assert_allclose([found["resistance_change_tuft"], found["resistance_change_soma"]], [-0.286, -0.049], atol=5e-4)
    assert_allclose(found["charge_share"], 0.30, atol=0.005)
    assert 5 < found["seconds"] / 60 < 8


def test_the_second_pipette_belongs_far_out() -> None:
    found = answer("second_pipette")
    shares = list(found.values())
    assert shares == sorted(shares)  # the first is that of one pipette: a second one never takes away
    assert_allclose([shares[0], shares[-1]], [0.317, 0.521], atol=5e-4)
    assert max(found, key=found.__getitem__) == "503 µm"


def test_thinner_dendrites_fluctuate_more() -> None:
    found = answer("thinner_dendrite")
    assert_allclose([row["sd_tuft_mV"] for row in found.values()], [2.01, 2.62, 3.59, 5.21], atol=0.005)
    assert_allclose([row["sd_soma_mV"] for row in found.values()], [0.559, 0.589, 0.613, 0.622], atol=5e-4)
    plain = found[1.0]["tuft_resistance_MOhm"]
    assert_allclose(found[0.6]["tuft_resistance_MOhm"] / plain, 0.6**-1.7, rtol=0.02)  # between d^-3/2 and d^-2
    assert_allclose(plain, 800, atol=0.5)
