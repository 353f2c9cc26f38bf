"""The command `simulate`: its files, its sentences, its mistakes."""

from __future__ import annotations

import csv
import json
from collections.abc import Callable
from pathlib import Path

import numpy as np
import pytest
from PIL import Image
from typer.testing import Result

QUICK = ("--seconds", 8, "--runs", 1, "--dt-ms", 0.4)


def test_document_table_traces_and_figure(run: Callable[..., Result], folder: Path) -> None:
    done = run(
        "simulate",
        "stick.toml",
        *QUICK,
        "--out",
        "Z.json",
        "--traces",
        "V.csv",
        "--figure",
        "F.png",
        "--trace-seconds",
        0.3,
    )
    assert done.exit_code == 0, done.output
    found = json.loads((folder / "Z.json").read_text(encoding="utf-8"))
    assert [one["site"] for one in found["sites"]] == ["soma", "half way", "between"]
    first = found["sites"][0]
    assert {"mean_mV", "sd_mV", "sd_se_mV", "computed_mean_mV", "computed_sd_mV", "z_sd", "z_skewness"} <= set(first)
    assert first["z_sd"] == pytest.approx((first["sd_mV"] - first["computed_sd_mV"]) / first["sd_se_mV"])
    assert first["correlation"] == 1.0 and first["z_correlation"] is None
    assert found["seconds"] == pytest.approx(8, rel=0.2) and found["interrupted"] is False and found["seed"] == 1
    assert found["scenario_sha256"] and found["mode"] == "conductances"
    with (folder / "V.csv").open(newline="", encoding="utf-8") as file:
        rows = list(csv.DictReader(file))
    assert list(rows[0]) == ["time_ms", "soma_mV", "half way_mV", "between_mV"]
    assert 290 < float(rows[-1]["time_ms"]) < 420
    with Image.open(folder / "F.png") as picture:
        assert len(np.unique(np.asarray(picture.convert("L")))) > 20
    assert run("simulate", "stick.toml", *QUICK, "--seed", 2, "--out", "Z.csv").exit_code == 0
    with (folder / "Z.csv").open(newline="", encoding="utf-8") as file:
        table = list(csv.DictReader(file))
    assert [row["site"] for row in table] == ["soma", "half way", "between"]
    assert float(table[0]["sd_mV"]) != first["sd_mV"]
    assert float(table[0]["computed_sd_mV"]) == first["computed_sd_mV"]


def test_words_on_the_terminal(run: Callable[..., Result]) -> None:
    said = run("simulate", "stick.toml", *QUICK, "--frozen")
    assert said.exit_code == 0 and "nan" not in said.stdout
    words = " ".join(said.stdout.split())
    assert "simulated" in words and "computed" in words and "z the difference in standard errors" in words
    assert "driving force was frozen" in words and "half way" in words


def test_figure_shows_the_band_that_was_computed(run: Callable[..., Result], folder: Path) -> None:
    assert run("simulate", "stick.toml", *QUICK, "--figure", "F.svg").exit_code == 0
    text = (folder / "F.svg").read_text(encoding="utf-8")
    assert "computed mean" in text and "half way" in text


@pytest.mark.parametrize(
    ("arguments", "words"),
    [
        (("--seconds", "0"), "--seconds: found 0, expected a number above 0"),
        (("--seconds", "nan"), "--seconds: found nan"),
        (("--dt-ms", "-1"), "--dt-ms: found -1"),
        (("--seconds", "0.2", "--dt-ms", "0.4"), "for 8 independent batches"),
        (("--out", "Z.png"), ".csv, .json or .npz"),
        (("--figure", "F.csv"), ".png, .svg or .pdf"),
        (("--runs", "0"), "--runs"),
        (("--out", "stick.toml"), "expected .csv"),
    ],
)
def test_mistakes(arguments: tuple[str, ...], words: str, run: Callable[..., Result], folder: Path) -> None:
    before = sorted(path.name for path in folder.iterdir())
    said = run("simulate", "stick.toml", *arguments)
    assert said.exit_code == 2 and words in " ".join(said.stderr.split()), said.stderr
    assert sorted(path.name for path in folder.iterdir()) == before


def test_trains_that_cannot_be_simulated(run: Callable[..., Result], edited: Callable[..., Path]) -> None:
    path = edited(("rate_Hz = 2.0", "rate_Hz = 2.0\ncorrelation = 0.1\nspike_train = { order = 3 }"))
    said = run("simulate", path.name, *QUICK)
    assert said.exit_code == 2 and "correlated gamma trains cannot be simulated" in said.stderr
