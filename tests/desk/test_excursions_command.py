"""The command `excursions`: sentences on the terminal, tables, and mistakes."""

from __future__ import annotations

import csv
import json
from collections.abc import Callable
from pathlib import Path

import pytest
from typer.testing import Result

from cable.desk.scenario import load_scenario


def test_sentences_say_what_the_model_says(run: Callable[..., Result], edited: Callable[..., Path]) -> None:
    path = edited(("reversal_mV = -75.0", "reversal_mV = -66.0"))
    said = run("excursions", path.name, "half way", "--level-mV", -60, "--share", 0.05)
    assert said.exit_code == 0
    (found,) = load_scenario(path).excursions(("half way",), -60.0)
    words = " ".join(said.stdout.split())
    assert f"half way: {found.mean_mV:.2f} ± {found.sd_mV:.3g} mV, skewness {found.skewness:.3g}" in words
    assert f"crosses -60 mV upwards {found.upcrossing_Hz:.3g} times a second" in words
    assert (
        f"above for {100 * found.share_above_corrected:.1f} % of the time (Gaussian: {100 * found.share_above:.1f} %)"
        in words
    )
    assert f"For 5 % of the time it is above {found.exceeded_corrected_mV(0.05):.2f} mV" in words
    assert "the reversal potential of 'inhibition' is" in words
    assert "Skewness and kurtosis are exact to about" in words


def test_table_has_all_sites_and_numbers(run: Callable[..., Result], folder: Path) -> None:
    assert run("excursions", "stick.toml", "--out", "e.csv").exit_code == 0
    with (folder / "e.csv").open(newline="") as stream:
        rows = list(csv.DictReader(stream))
    found = load_scenario(folder / "stick.toml").excursions()
    assert [row["site"] for row in rows] == ["soma", "half way", "between"]
    for row, one in zip(rows, found, strict=True):
        for key in ("skewness", "excess_kurtosis", "upcrossing_Hz", "share_above", "level_sd", "between_upcrossings_s"):
            assert float(row[key]) == getattr(one, key)
        assert float(row["level_mV"]) == -50.0  # the scenario's threshold
        assert float(row["exceeded_corrected_mV"]) == one.exceeded_corrected_mV(0.01)
    assert run("excursions", "stick.toml", "soma", "soma", "--out", "e.json").exit_code == 0
    read = json.loads((folder / "e.json").read_text())
    assert len(read["rows"]) == 1 and read["version"] and read["scenario_sha256"]
    assert read["warnings"]["soma"] == list(found[0].warnings)
    assert 0 < read["certificate"]["cumulant_relative_error"] < 1e-6


def test_without_a_level_the_shape_is_told(run: Callable[..., Result], edited: Callable[..., Path]) -> None:
    path = edited(("[threshold]\nlevel_mV = -50.0\n", ""))
    said = run("excursions", path.name, "soma")
    assert said.exit_code == 0 and "crosses" not in said.stdout and "ask with --level-mV X" in said.stdout
    assert run("excursions", path.name, "--out", "e.json").exit_code == 0
    rows = json.loads(path.with_name("e.json").read_text())["rows"]
    assert rows[0]["level_mV"] is None and rows[0]["share_above"] is None and rows[0]["skewness"] is not None


def test_what_is_unknown_is_no_number(run: Callable[..., Result], edited: Callable[..., Path]) -> None:
    path = edited(("rate_Hz = 2.0", "rate_Hz = 2.0\nspike_train = { order = 3 }"))
    said = run("excursions", path.name, "soma", "--level-mV", -69)
    assert said.exit_code == 0 and "nan" not in said.stdout
    assert "no Poisson trains (gamma)" in said.stdout and "of the time if Gaussian" in said.stdout
    assert "Skewness and kurtosis are exact" not in said.stdout
    assert run("excursions", path.name, "--out", "e.csv").exit_code == 0
    with path.with_name("e.csv").open(newline="") as stream:
        assert next(csv.DictReader(stream))["skewness"] == ""


def test_an_undefined_rate_is_said_in_words(run: Callable[..., Result], edited: Callable[..., Path]) -> None:
    path = edited(("conductance_nS = 0.6\nreversal_mV = -75.0\nkernel = { decay_ms = 6.0 }", "charge_fC = 4"))
    said = run("excursions", path.name, "soma", "--level-mV", -69)
    assert said.exit_code == 0 and "nan" not in said.stdout
    assert "How often it crosses -69 mV is undefined" in said.stdout


@pytest.mark.parametrize(
    ("arguments", "words"),
    [
        (("excursions", "stick.toml", "half wy"), 'there is no site "half wy"; did you mean "half way"?'),
        (("excursions", "stick.toml", "soma", "--level-mV", "nan"), "--level-mV: found nan, expected a finite number"),
        (("excursions", "stick.toml", "soma", "--level-mV", "high"), "'--level-mV'"),
        (("excursions", "stick.toml", "soma", "--share", "nan"), "--share"),
        (("excursions", "stick.toml", "soma", "--share", "0.7"), "'--share'"),
        (("excursions", "stick.toml", "--out", "e.png"), "the output ends in .png, expected .csv, .json or .npz"),
        (("excursions", "none.toml"), "cannot be opened"),
        (("excursions", "stick.toml", "--out", "stick.toml"), "expected .csv"),
    ],
)
def test_mistakes(arguments: tuple[str, ...], words: str, run: Callable[..., Result]) -> None:
    said = run(*arguments)
    assert said.exit_code == 2 and words in " ".join(said.stderr.split()), said.stderr
