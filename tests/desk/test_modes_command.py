"""The command modes as a person meets it."""

from __future__ import annotations

import json
import re

import numpy as np
import pandas as pd
import pytest
from PIL import Image

from cable import load_scenario

SILENT = ("rate_Hz = 2.0", "rate_Hz = 0.0"), ("rate_Hz = 3.0", "rate_Hz = 0.0")


def test_table_read_back(run, folder) -> None:
    assert run("modes", folder / "stick.toml", "--count", "3", "--out", folder / "M.csv").exit_code == 0
    frame = pd.read_csv(folder / "M.csv")
    model = load_scenario(folder / "stick.toml")
    found = model.modes(3)
    assert list(frame) == ["swc_id", "kind", "path_um", "mode_1_mV", "mode_2_mV", "mode_3_mV"]
    assert frame["swc_id"].tolist() == model.tree.ids.tolist()
    for k in range(3):
        assert frame[f"mode_{k + 1}_mV"].to_numpy() == pytest.approx(found.pattern_mV[k], rel=1e-12, abs=1e-15)
    explained = (frame.filter(like="mode_") ** 2).sum(axis=1).to_numpy()
    assert (explained <= model.fluctuations().variance_mV2 * (1 + 1e-6)).all()


def test_document(run, folder) -> None:
    assert run("modes", folder / "stick.toml", "--count", "2", "--out", folder / "M.json").exit_code == 0
    told = json.loads((folder / "M.json").read_text(encoding="utf-8"))
    assert 0 < told["share"][1] < told["share"][0] < 1 and len(told["share"]) == 2
    assert told["participation"] > 1 and told["participation_se"] >= 0
    assert told["certificate"]["quadrature_relative_error"] <= 1e-6
    assert told["participation"] == pytest.approx(load_scenario(folder / "stick.toml").modes(20).participation)


def test_sentences(run, folder) -> None:
    told = run("modes", folder / "stick.toml", "--count", "1").output
    assert "The participation number is" in told and "The first mode explains" in told
    told = run("modes", folder / "stick.toml").output
    assert "The first 10 modes explain" in told


@pytest.mark.parametrize(
    ("words", "told"),
    [
        (["--count", "0"], "--count"),
        (["--count", "-2"], "--count"),
        (["--count", "ten"], "--count"),
        (["--count", "100000"], "--count: expected 1 to"),
        (["--out", "M.txt"], ".csv"),
    ],
)
def test_messages(run, folder, words: list[str], told: str) -> None:
    result = run("modes", folder / "stick.toml", *words)
    assert result.exit_code == 2 and told in result.output and "Traceback" not in result.output


def test_nothing_fluctuates(run, edited) -> None:
    result = run("modes", edited(*SILENT))
    assert result.exit_code == 2 and result.output.startswith("nothing fluctuates in this cell")


@pytest.mark.parametrize("count", [1, 3, 10])
def test_maps(run, folder, count: int) -> None:
    """A panel a mode, four at most."""
    path = folder / "M.png"
    assert run("modes", folder / "stick.toml", "--count", count, "--out", path).exit_code == 0
    with Image.open(path) as picture:
        assert len(np.unique(np.asarray(picture.convert("L")))) > 20
    assert run("modes", folder / "stick.toml", "--count", count, "--out", folder / "M.svg").exit_code == 0
    drawn = (folder / "M.svg").read_text(encoding="utf-8")
    text = " ".join(re.findall(r">([^<>]+)</text>", drawn))  # labels are wrapped
    assert [f"mode {k}: " in text for k in (1, 2, 3, 4, 5)] == [k <= min(count, 4) for k in (1, 2, 3, 4, 5)]
