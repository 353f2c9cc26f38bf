"""The site table: every number of the answer, in every format, to the last digit."""

from __future__ import annotations

import csv
import json
import time

import numpy as np
import pandas as pd
import pytest

from cable import load_scenario
from cable.desk.tables import Table, inert, write_csv

COLUMNS = [
    "swc_id", "site", "kind", "x_um", "y_um", "z_um", "radius_um", "path_um", "branch_order", "mean_mV",
    "sd_mV", "variance_mV2", "variance_excitation_mV2", "variance_inhibition_mV2", "correlation_time_ms",
    "input_resistance_MOhm", "upcrossing_Hz",
]  # fmt: skip


def test_csv_has_every_point_exactly(run, folder):
    result = run("table", "stick.toml", "--out", "T.csv")
    assert (result.exit_code, result.output) == (0, "")
    raw = (folder / "T.csv").read_bytes()
    assert raw.count(b"\r\n") == raw.count(b"\n") == 1 + 42 + 1
    rows = list(csv.DictReader(raw.decode("utf-8").splitlines()))
    assert list(rows[0]) == COLUMNS
    model = load_scenario(folder / "stick.toml")
    field = model.fluctuations()
    points = rows[:42]
    assert [int(r["swc_id"]) for r in points] == model.tree.ids.tolist()
    for name in (
        "mean_mV",
        "sd_mV",
        "variance_mV2",
        "correlation_time_ms",
        "input_resistance_MOhm",
        "upcrossing_Hz",
    ):
        assert [float(r[name]) for r in points] == getattr(field, name).tolist()
    for name, part in field.variance_by_input_mV2.items():
        assert [float(r[f"variance_{name}_mV2"]) for r in points] == part.tolist()
    assert [float(r["path_um"]) for r in points] == model.tree.path_um.tolist()
    assert {r["kind"] for r in points} == {"soma", "basal"}


def test_each_site_has_one_row_and_those_between_points_come_last(run, folder):
    run("table", "stick.toml", "--out", "T.csv")
    table = pd.read_csv(folder / "T.csv", keep_default_na=False)
    named = table[table.site != ""]
    assert named.site.tolist() == ["soma", "half way", "between"]
    assert named.swc_id.tolist() == [1, 22, 24]
    assert named.index.tolist() == [0, 21, 42]
    assert named.path_um.tolist() == pytest.approx([0.0, 310.0, 333.0])
    between = load_scenario(folder / "stick.toml").fluctuations().at("between")
    assert table.sd_mV.iloc[-1] == between.sd_mV


def test_a_second_site_on_one_point_has_its_own_row(run, edited):
    path = edited(
        (
            'name = "between"\nat = { kinds = ["basal"], path_um = 333 }',
            'name = "again"\nat = { swc_id = 22 }',
        )
    )
    run("table", path, "--out", "T.csv")
    table = pd.read_csv(path.parent / "T.csv", keep_default_na=False)
    one, two = table[table.site == "half way"].iloc[0], table[table.site == "again"].iloc[0]
    assert (one.swc_id, one.sd_mV) == (two.swc_id, pytest.approx(two.sd_mV, rel=1e-12))


def test_sites_only(run, folder):
    run("table", "stick.toml", "--sites", "--out", "S.csv")
    table = pd.read_csv(folder / "S.csv")
    assert table.columns.tolist() == COLUMNS
    assert table.site.tolist() == ["soma", "half way", "between"]


def test_json_carries_what_makes_it_trustworthy(run, folder):
    run("table", "stick.toml", "--out", "T.json")
    result = json.loads((folder / "T.json").read_text())
    model = load_scenario(folder / "stick.toml")
    field = model.fluctuations()
    assert [r["sd_mV"] for r in result["rows"][:42]] == field.sd_mV.tolist()
    assert list(result["rows"][0]) == COLUMNS
    assert field.certificate.as_dict().items() <= result["certificate"].items()
    assert result["certificate"]["quadrature_relative_error"] <= 1e-9
    assert (result["title"], result["scenario"], len(result["scenario_sha256"])) == (
        "stick",
        "stick.toml",
        64,
    )
    assert result["version"][0].isdigit()


def test_npz_opens_without_pickle(run, folder):
    run("table", "stick.toml", "--out", "T.npz")
    with np.load(folder / "T.npz", allow_pickle=False) as file:
        rows, metadata = file["rows"], json.loads(str(file["metadata"]))
    assert list(rows.dtype.names) == COLUMNS
    assert rows["sd_mV"][:42].tolist() == load_scenario(folder / "stick.toml").fluctuations().sd_mV.tolist()
    assert rows["site"][21] == "half way"
    assert metadata["certificate"]["frequencies"] > 0


def test_without_threshold_there_is_no_upcrossing(run, edited):
    path = edited(("[threshold]\nlevel_mV = -50.0", ""))
    run("table", path, "--out", "T.csv")
    assert "upcrossing_Hz" not in (path.parent / "T.csv").read_text()


def test_an_undefined_rate_is_an_empty_cell_and_null(run, edited):
    # a kernel that jumps, in a point synapse: Rice's rate does not exist at its own site
    path = edited(('where = { kinds = ["soma"] }\ndensity_per_um2 = 0.05', "at = [{ swc_id = 22 }]"))
    run("table", path, "--out", "T.csv")
    run("table", path, "--out", "T.json")
    table = csv.DictReader((path.parent / "T.csv").read_text().splitlines())
    row = next(r for r in table if r["site"] == "half way")
    assert row["upcrossing_Hz"] == ""
    assert float(row["sd_mV"]) > 0
    result = json.loads((path.parent / "T.json").read_text())
    assert [r["upcrossing_Hz"] for r in result["rows"] if r["site"] == "half way"] == [None]
    assert result["upcrossing_note"]


def test_terminal_table_has_shares_and_the_certificate(run):
    result = run("table", "stick.toml")
    assert result.exit_code == 0
    for word in ("stick", "soma", "half way", "between", "excitation", "inhibition", "relative error"):
        assert word in result.stdout
    assert "\x1b" not in result.stdout
    half_way = next(line for line in result.stdout.splitlines() if "half way" in line)
    shares = [float(v) for v in half_way.split()[-2:]]
    assert sum(shares) == pytest.approx(100, abs=0.11)


def test_tolerance_is_obeyed_and_checked(run):
    assert run("table", "stick.toml", "--tolerance", "1e-4").exit_code == 0
    assert run("table", "stick.toml", "--tolerance", "0").exit_code == 2


def test_text_that_would_be_a_formula_is_inert(run, edited):
    path = edited(
        ('name = "half way"', 'name = "=1+1"'), ('name = "between"', 'name = "@SUM(A1)"'),
        ('name = "excitation"', 'name = "a, \\"b\\""'),
    )  # fmt: skip
    run("table", path, "--sites", "--out", "T.csv")
    table = pd.read_csv(path.parent / "T.csv")
    assert table.site.tolist() == ["soma", "'=1+1", "'@SUM(A1)"]
    assert 'variance_a, "b"_mV2' in table.columns
    assert [inert(t) for t in ("-1", "+1", "\tx", "plain", "")] == ["'-1", "'+1", "'\tx", "plain", ""]


def test_a_large_table_is_written_at_once(tmp_path):
    values = np.random.default_rng(1).normal(size=(15, 8000))
    table = Table({f"c{i}": v for i, v in enumerate(values)})
    took = []
    for _ in range(3):
        with (tmp_path / "t.csv").open("w", newline="") as stream:
            start = time.perf_counter()
            write_csv(table, stream)
            took.append(time.perf_counter() - start)
    assert np.array_equal(np.loadtxt(tmp_path / "t.csv", delimiter=",", skiprows=1).T, values)
    assert min(took) < 0.5  # 0.1 s on an idle machine; a formatting call per cell takes seconds


def test_columns_of_unequal_length_are_refused():
    with pytest.raises(ValueError, match="one length"):
        Table({"a": [1], "b": [1, 2]})
