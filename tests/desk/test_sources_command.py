"""The command sources as a person meets it."""

from __future__ import annotations

import csv
import json

import numpy as np
import pandas as pd
import pytest
from PIL import Image

from cable import load_scenario

SILENT = ("rate_Hz = 2.0", "rate_Hz = 0.0"), ("rate_Hz = 3.0", "rate_Hz = 0.0")


def test_table_read_back(run, folder) -> None:
    """One row per cylinder, by csv and by pandas, against the Python face."""
    assert run("sources", folder / "stick.toml", "between", "--out", folder / "C.csv").exit_code == 0
    frame = pd.read_csv(folder / "C.csv")
    found = load_scenario(folder / "stick.toml").sources("between")
    with (folder / "C.csv").open(newline="", encoding="utf-8") as file:
        rows = list(csv.DictReader(file))
    assert [int(row["swc_id"]) for row in rows] == frame["swc_id"].tolist() == found.model.tree.ids.tolist()
    head = ["swc_id", "kind", "path_um", "distance_um", "length_um", "branch_end_id", "variance_share"]
    names = ["excitation", "inhibition"]
    assert list(frame) == head + [f"variance_share_{n}" for n in names] + [f"mean_{n}_mV" for n in names]
    assert frame["variance_share"].to_numpy() == pytest.approx(found.variance_share, rel=1e-15)
    parts = frame[[f"variance_share_{n}" for n in names]].sum()
    assert parts.sum() == pytest.approx(frame["variance_share"].sum(), rel=1e-12) == pytest.approx(1.0, rel=1e-12)
    assert frame.loc[frame["kind"] == "soma", "variance_share_excitation"].sum() == 0
    assert frame.loc[frame["path_um"] < 199, "variance_share_excitation"].sum() == 0
    assert frame["length_um"].sum() == pytest.approx(600.0)
    assert set(frame["branch_end_id"]) == {1, 42}


def test_document_gathers_the_shares(run, folder) -> None:
    assert run("sources", folder / "stick.toml", "half way", "--out", folder / "C.json").exit_code == 0
    told = json.loads((folder / "C.json").read_text(encoding="utf-8"))
    rows = pd.DataFrame(told["rows"])
    assert told["site"] == "half way" and told["certificate"]["quadrature_relative_error"] <= 1e-9
    assert told["variance_share_by_kind"] == pytest.approx(rows.groupby("kind")["variance_share"].sum().to_dict())
    branches = rows.groupby("branch_end_id")["variance_share"].sum()
    assert told["variance_share_by_branch"] == pytest.approx({str(k): v for k, v in branches.items()})
    for name in ("excitation", "inhibition"):
        assert told["variance_share_by_input"][name] == pytest.approx(rows[f"variance_share_{name}"].sum())
        assert told["mean_by_input_mV"][name] == pytest.approx(rows[f"mean_{name}_mV"].sum())
    assert sum(told["mean_by_kind_mV"].values()) == pytest.approx(sum(told["mean_by_input_mV"].values()))
    site = load_scenario(folder / "stick.toml").fluctuations().at("half way")
    assert told["variance_mV2"] == pytest.approx(site.variance_mV2, rel=1e-9)
    assert -70 + sum(told["mean_by_input_mV"].values()) == pytest.approx(site.mean_mV, rel=1e-6)
    assert 0 < told["half_within_um"] < 300 < told["half_within_um_of_soma"] < 610


def test_npz_read_back(run, folder) -> None:
    assert run("sources", folder / "stick.toml", "soma", "--out", folder / "C.npz").exit_code == 0
    with np.load(folder / "C.npz") as file:
        assert file["rows"]["variance_share"].sum() == pytest.approx(1.0, rel=1e-12)
        assert json.loads(str(file["metadata"]))["site"] == "soma"


def test_sentences(run, folder) -> None:
    soma = run("sources", folder / "stick.toml", "soma").output
    assert "Half of the variance at soma comes from within" in soma and "of the soma" not in soma
    far = run("sources", folder / "stick.toml", "half way").output
    assert "and half from within" in far and "µm of the soma" in far
    assert "by place of the synapses: basal" in far
    assert "unbranched run, which ends at the point 42 (basal, 610 µm from the root)" in far
    assert "The mean is shifted by excitation +" in far and "by place: " in far


def test_where_nothing_fluctuates(run, folder, edited) -> None:
    scenario = edited(*SILENT)
    assert run("sources", scenario, "soma").output.strip() == "Nothing fluctuates at soma."
    for ending in ("csv", "json", "png"):
        assert run("sources", scenario, "soma", "--out", folder / f"N.{ending}").exit_code == 0
    assert pd.read_csv(folder / "N.csv")["variance_share"].isna().all()
    told = json.loads((folder / "N.json").read_text(encoding="utf-8"))
    assert told["half_within_um"] is None and told["variance_mV2"] == 0


@pytest.mark.parametrize(
    ("words", "told"),
    [
        (["half wy"], 'did you mean "half way"'),
        (["soma", "--out", "C.txt"], ".csv"),
        (["soma", "--tolerance", "0"], "tolerance"),
        (["soma", "--out", "stick.toml"], ".csv"),
    ],
)
def test_messages(run, folder, words: list[str], told: str) -> None:
    result = run("sources", folder / "stick.toml", *words)
    assert result.exit_code == 2 and told in result.output and "Traceback" not in result.output


def test_an_existing_file_is_kept(run, folder) -> None:
    (folder / "C.csv").write_text("mine")
    assert run("sources", folder / "stick.toml", "soma", "--out", folder / "C.csv").exit_code == 2
    assert (folder / "C.csv").read_text() == "mine"
    assert run("sources", folder / "stick.toml", "soma", "--out", folder / "C.csv", "--force").exit_code == 0


@pytest.mark.parametrize("site", ["soma", "half way"])
def test_bars_add_to_the_whole(folder, site: str) -> None:
    """The drawn heights, in per cent, are those of the shares; the line stands where half is reached."""
    from cable.desk.figures.sources import draw_sources
    from cable.desk.figures.style import styled

    found = load_scenario(folder / "stick.toml").sources(site, 1e-6)
    with styled():
        axes = draw_sources(found, "stick").axes[0]
    assert sum(bar.get_height() for bars in axes.containers for bar in bars) == pytest.approx(100.0, rel=1e-9)
    per_input = [sum(bar.get_height() for bar in bars) for bars in axes.containers]
    whole = found.variance_mV2.sum()
    assert per_input == pytest.approx([100 * part.sum() / whole for part in found.variance_by_input_mV2.values()])
    assert axes.lines[0].get_xdata()[0] == found.half_within_um()


def test_map_of_the_sources(run, folder) -> None:
    from cable.desk.quantities import with_site

    path = folder / "M.png"
    words = ("map", folder / "stick.toml", "--quantity", "source", "--with", "half way", "--out", path)
    assert run(*words).exit_code == 0
    with Image.open(path) as picture:
        assert len(np.unique(np.asarray(picture.convert("L")))) > 20
    model = load_scenario(folder / "stick.toml")
    values = with_site("source", "half way").values(model.fluctuations(1e-6))
    assert np.nansum(values[1:] * model.tree.shape.length_um[1:]) + values[0] * 20 == pytest.approx(100.0, rel=1e-6)
    refused = run("map", folder / "stick.toml", "--quantity", "source", "--out", folder / "N.png")
    assert refused.exit_code == 2 and "--with SITE" in refused.output
