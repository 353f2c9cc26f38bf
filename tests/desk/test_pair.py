"""Correlations as a figure and in the table, trains with a dead time, and figures that keep their words on the page."""

from __future__ import annotations

import csv
import json

import numpy as np
import pytest
from matplotlib.backends.backend_agg import FigureCanvasAgg
from PIL import Image

from cable.desk.figures.matrix import draw_matrix
from cable.desk.figures.pair import draw_pair
from cable.desk.figures.spectrum import draw_spectrum
from cable.desk.figures.style import styled
from cable.desk.pair_table import study_pair
from cable.desk.scenario import read_scenario


def table_of(path) -> list[dict[str, str]]:
    with path.open(newline="", encoding="utf-8") as file:
        return list(csv.DictReader(file))


def test_all_correlations_agree_in_every_format(run, folder) -> None:
    for ending in ("csv", "json", "png", "svg"):
        result = run("pair", folder / "stick.toml", "--all", "--out", folder / f"R.{ending}")
        assert result.exit_code == 0, result.output
    rows, document = table_of(folder / "R.csv"), json.loads((folder / "R.json").read_text(encoding="utf-8"))
    assert [row["site"] for row in rows] == ["soma", "half way", "between"]
    for row, other in zip(rows, document["rows"], strict=True):
        assert float(row["correlation_soma"]) == other["correlation_soma"]
        assert float(row[f"correlation_{row['site']}"]) == pytest.approx(1.0, abs=1e-12)
    with Image.open(folder / "R.png") as picture:
        assert len(np.unique(np.asarray(picture.convert("L")))) > 20
    drawn = (folder / "R.svg").read_text(encoding="utf-8")
    assert f"{document['rows'][0]['correlation_between']:.2f}" in drawn and "half way" in drawn


def test_table_with_correlations(run, folder) -> None:
    told = run("table", folder / "stick.toml", "--with", "between", "--with", "soma", "--out", folder / "T.csv")
    assert told.exit_code == 0, told.output
    assert run("table", folder / "stick.toml", "--sites", "--with", "between", "--out", folder / "S.csv").exit_code == 0
    assert run("pair", folder / "stick.toml", "--all", "--out", folder / "R.csv").exit_code == 0
    matrix = {row["site"]: float(row["correlation_between"]) for row in table_of(folder / "R.csv")}
    points = table_of(folder / "T.csv")
    assert len(points) == 43 and list(points[0])[-2:] == ["correlation_with_soma", "lag_behind_soma_ms"]
    for rows in (points, table_of(folder / "S.csv")):
        named = {row["site"]: row for row in rows if row["site"]}
        assert set(named) == set(matrix)
        for site, row in named.items():
            assert float(row["correlation_with_between"]) == pytest.approx(matrix[site], rel=1e-7)
            assert abs(float(row["lag_behind_between_ms"])) < 20


def test_pair_of_trains_with_a_dead_time(run, folder, edited) -> None:
    slower = edited(("rate_Hz = 2.0", "rate_Hz = 40.0\nspike_train = { dead_time_ms = 5 }"))
    result = run("pair", slower, "soma", "half way", "--out", folder / "C.json")
    assert result.exit_code == 0, result.output
    found = json.loads((folder / "C.json").read_text(encoding="utf-8"))
    assert found["certificate"]["covariance_relative_error"] <= 1e-9
    assert run("point-neuron", slower).exit_code == 0
    regular = edited(("rate_Hz = 2.0", "rate_Hz = 199.9\nspike_train = { dead_time_ms = 5 }"))
    refused = run("pair", regular, "soma", "half way")
    assert refused.exit_code == 2 and "use a shorter dead time" in refused.output


@pytest.mark.parametrize(
    ("words", "told"),
    [
        (["table", "--with", "soma"], "--with: goes with --out"),
        (["table", "--with", "sofa", "--out", "T.csv"], 'did you mean "soma"'),
        (["pair", "--all", "--lag-ms", "5"], "--lag-ms: goes with two sites"),
        (["pair", "--all", "--out", "R.txt"], ".png"),
    ],
)
def test_messages(run, folder, words: list[str], told: str) -> None:
    result = run(words[0], folder / "stick.toml", *words[1:])
    assert result.exit_code == 2
    assert told in result.output and "Traceback" not in result.output


def test_every_word_of_a_figure_is_on_the_page(folder) -> None:
    read = read_scenario(folder / "stick.toml")
    names = [f"a dendrite with a long name, {k}" for k in range(12)]
    uneven = np.cos(np.subtract.outer(np.arange(12.0), np.arange(12.0)) / 4)
    with styled():
        for page in (
            draw_spectrum(read.model.spectrum("soma", to="half way"), read.title),
            draw_pair(study_pair(read.model, "soma", "half way", None, 1e-6), read.title),
            draw_matrix(names, uneven, read.title),
            draw_matrix(names[:1], np.ones((1, 1)), read.title),
        ):
            canvas = FigureCanvasAgg(page)
            canvas.draw()
            drawn, (width, height) = page.get_tightbbox(canvas.get_renderer()), page.get_size_inches()
            assert drawn.x0 >= 0 and drawn.y0 >= 0 and drawn.x1 <= width and drawn.y1 <= height
