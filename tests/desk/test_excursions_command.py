"""The command `excursions`: sentences on the terminal, tables, and mistakes."""

from __future__ import annotations

import csv
import json
from collections.abc import Callable
from pathlib import Path

import numpy as np
import pytest
from scipy.integrate import trapezoid
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


def test_several_sites_are_a_table_and_doubts_are_said_once(
    run: Callable[..., Result], edited: Callable[..., Path]
) -> None:
    path = edited(("rate_Hz = 2.0", "rate_Hz = 2.0\ncorrelation = 0.05"))
    said = run("excursions", path.name, "--level-mV", -66)
    assert said.exit_code == 0
    for one in load_scenario(path).excursions(level_mV=-66.0):
        (row,) = [line for line in said.stdout.splitlines() if line.startswith(f" {one.site} ") and "mV" not in line]
        cells = row.replace(one.site, "").replace(" %", "%").split()
        assert cells[:4] == [
            f"{one.mean_mV:.2f}",
            f"{one.sd_mV:.3f}",
            f"{one.skewness:.3f}",
            f"{one.excess_kurtosis:.3f}",
        ]
        assert cells[4] == f"{one.upcrossing_Hz:.3g}" and cells[6] == f"{100 * one.share_above:.1f}%"
        assert cells[7:] == [f"{one.exceeded_corrected_mV(0.01):.2f}", f"{one.exceeded_mV(0.01):.2f}"]
    words = " ".join(said.stdout.split())
    assert words.count("copied from one common train") == 1 and "All sites: synapses of 'excitation'" in words


def test_figure(run: Callable[..., Result], folder: Path) -> None:
    from cable.desk.figures.excursions import draw_excursions
    from cable.desk.figures.style import styled

    for ending in ("png", "svg", "pdf"):
        assert run("excursions", "stick.toml", "--out", f"e.{ending}").exit_code == 0
        assert (folder / f"e.{ending}").stat().st_size > 3000
    assert "skewness" in (folder / "e.svg").read_text()
    found = load_scenario(folder / "stick.toml").excursions()
    with styled():
        page = draw_excursions(found, "stick")
    assert len(page.axes) == len(found)
    for one, axes in zip(found, page.axes, strict=True):
        corrected = axes.lines[-1]
        x, y = (np.asarray(v, dtype=float) for v in corrected.get_data())
        inside = np.isfinite(y)
        whole = trapezoid(y[inside], x[inside]) / one.sd_mV
        mean = trapezoid((x * y)[inside], x[inside]) / one.sd_mV
        assert abs(whole - 1) < 0.01 and abs(mean - one.mean_mV) < 0.05 * one.sd_mV
        assert abs(axes.lines[0].get_xdata()[0] - one.level_mV) < 1e-12


def test_figure_of_a_cell_at_rest(run: Callable[..., Result], edited: Callable[..., Path]) -> None:
    path = edited(("rate_Hz = 2.0", "rate_Hz = 0"), ("rate_Hz = 3.0", "rate_Hz = 0"))
    assert run("excursions", path.name, "--out", "e.svg").exit_code == 0
    assert "soma: still" in path.with_name("e.svg").read_text()


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
        (("excursions", "stick.toml", "--out", "e.txt"), "the output ends in .txt, expected .csv, .json, .npz, .png"),
        (("excursions", "none.toml"), "cannot be opened"),
        (("excursions", "stick.toml", "--out", "stick.toml"), "expected .csv"),
    ],
)
def test_mistakes(arguments: tuple[str, ...], words: str, run: Callable[..., Result]) -> None:
    said = run(*arguments)
    assert said.exit_code == 2 and words in " ".join(said.stderr.split()), said.stderr
