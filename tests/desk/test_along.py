"""Profiles: the right points in the right order, whatever the root, and their figure."""

from __future__ import annotations

import json

import numpy as np
import pandas as pd
import pytest

from cable import load_scenario
from cable.desk.figures.along import draw_along
from cable.desk.figures.style import styled
from cable.desk.path import distance_from_soma, sites_on_way, way_to_site
from cable.desk.quantities import quantities
from cable.desk.scenario import read_scenario

FORK = """
1 1 0 0 0 8 -1
2 3 20 0 0 1 1
3 3 60 0 0 0.8 2
4 3 90 40 0 0.5 3
5 3 90 -40 0 0.5 3
"""
ROOT_AT_A_TIP = """
4 3 90 40 0 0.5 -1
3 3 60 0 0 0.8 4
2 3 20 0 0 1 3
1 1 0 0 0 8 2
5 3 90 -40 0 0.5 3
"""
SITES = """
[[site]]
name = "tip"
at = { swc_id = 4 }
[[site]]
name = "other tip"
at = { swc_id = 5 }
[[site]]
name = "middle"
at = { swc_id = 3, fraction = 0.5 }
"""


@pytest.fixture
def fork(folder):
    def make(swc: str):
        (folder / "stick.swc").write_text(swc.lstrip())
        text = (folder / "stick.toml").read_text().replace("path_um = [200, inf]", "path_um = [0, inf]")
        (folder / "fork.toml").write_text(text[: text.index("[[site]]")] + SITES)
        return load_scenario(folder / "fork.toml")

    return make


@pytest.mark.parametrize("swc", [FORK, ROOT_AT_A_TIP])
def test_the_way_is_the_same_from_any_root(fork, swc):
    model = fork(swc)
    ids = model.tree.ids
    by_id = dict(zip(ids.tolist(), distance_from_soma(model.tree), strict=True))
    assert by_id == pytest.approx({1: 0, 2: 20, 3: 60, 4: 110, 5: 110})
    way = way_to_site(model, "other tip")
    assert ids[way.rows].tolist() == [1, 2, 3, 5]
    assert way.from_soma_um == pytest.approx([0, 20, 60, 110])
    assert sites_on_way(model, way) == (["soma", "other tip", "middle"] if swc is FORK else ["soma", "other tip"])


def test_a_site_between_points_ends_the_way(fork):
    way = way_to_site(fork(FORK), "middle")
    assert way.rows.tolist() == [0, 1]
    assert way.from_soma_um == pytest.approx([0, 20, 40])
    # with the root at the tip, the cylinder of point 3 runs from 4 to 3: its middle lies beyond 3
    model = fork(ROOT_AT_A_TIP)
    way = way_to_site(model, "middle")
    assert model.tree.ids[way.rows].tolist() == [1, 2, 3]
    assert way.from_soma_um == pytest.approx([0, 20, 60, 85])


def test_csv_is_the_site_table_along_the_way(run, folder):
    assert run("along", "stick.toml", "between", "--out", "P.csv").exit_code == 0
    table = pd.read_csv(folder / "P.csv", keep_default_na=False)
    assert table.columns[0] == "from_soma_um" and "variance_excitation_mV2" in table.columns
    field = load_scenario(folder / "stick.toml").fluctuations()
    assert table.sd_mV.tolist() == [*field.sd_mV[:23].tolist(), field.at("between").sd_mV]
    assert np.all(np.diff(table.from_soma_um) > 0)
    assert table.site.iloc[-1] == "between" and table.site.iloc[21] == "half way"


def test_json_and_npz(run, folder):
    run("along", "stick.toml", "half way", "--out", "P.json")
    run("along", "stick.toml", "half way", "--out", "P.npz")
    result = json.loads((folder / "P.json").read_text())
    assert result["along"] == "half way" and len(result["rows"]) == 22
    with np.load(folder / "P.npz", allow_pickle=False) as file:
        assert file["rows"]["from_soma_um"][-1] == pytest.approx(310)


@pytest.mark.parametrize("ending", ["png", "svg", "pdf"])
def test_figures_are_written(run, folder, ending):
    assert run("along", "stick.toml", "half way", "--out", f"P.{ending}", "--quantity", "variance").exit_code == 0
    assert (folder / f"P.{ending}").stat().st_size > 5000


def test_the_bold_line_is_the_profile(folder):
    read = read_scenario(folder / "stick.toml")
    field = read.model.fluctuations(1e-6)
    way = way_to_site(read.model, "half way")
    with styled():
        upper, lower = draw_along(field, way, quantities("sd", [], [])[0], "t").axes
    for axes, values in ((upper, field.mean_mV), (lower, field.sd_mV)):
        bold = max(axes.lines, key=lambda line: line.get_linewidth())
        assert bold.get_xdata() == pytest.approx(way.from_soma_um)
        assert bold.get_ydata() == pytest.approx(values[:22])
    assert "mV" in lower.get_ylabel() and "µm" in lower.get_xlabel()
    assert {"soma", "half way", "between"} <= {t.get_text() for t in lower.texts}
    assert upper.get_ylim()[1] > -50  # the threshold is in view


def test_terminal(run):
    result = run("along", "stick.toml", "between")
    assert result.exit_code == 0
    assert "from soma" in result.stdout and "half way" in result.stdout and "333.0" in result.stdout


@pytest.mark.parametrize(
    ("site", "words"),
    [("betwen", ['no site "betwen"', 'did you mean "between"']), ("soma", ["where the soma is"])],
)
def test_wrong_sites(run, site, words):
    result = run("along", "stick.toml", site, "--out", "P.csv")
    assert result.exit_code == 2
    for word in words:
        assert word in result.stderr
