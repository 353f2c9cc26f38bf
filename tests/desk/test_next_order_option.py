"""The option --next-order, and what every answer says about small fluctuations."""

from __future__ import annotations

import csv
import json
from pathlib import Path

import numpy as np
import pytest

from cable import load_scenario
from tolerances import ROUND_OFF

SITES = ("soma", "half way", "between")


@pytest.fixture
def scenario(folder: Path) -> Path:
    return folder / "stick.toml"


def rows(path: Path) -> list[dict[str, str]]:
    with path.open(encoding="utf-8", newline="") as stream:
        return list(csv.DictReader(stream))


def test_the_table_has_the_next_order_beside_the_linear_one(run, scenario: Path, tmp_path: Path) -> None:
    out = tmp_path / "t.csv"
    assert run("table", str(scenario), "--next-order", "--out", str(out)).exit_code == 0
    found = load_scenario(scenario).next_order()
    written = rows(out)
    names = list(written[0])
    assert names[names.index("sd_mV") + 1 :][:2] == ["mean_next_mV", "sd_next_mV"]
    points = len(found.linear.model.tree)
    assert [float(r["sd_next_mV"]) for r in written[:points]] == pytest.approx(found.sd_mV, rel=ROUND_OFF)
    assert [float(r["mean_next_mV"]) for r in written[:points]] == pytest.approx(found.mean_mV, rel=ROUND_OFF)
    assert written[points]["site"] == "between"
    assert float(written[points]["sd_next_mV"]) == pytest.approx(found.at_sites["between"][1], rel=ROUND_OFF)
    assert (np.abs(found.sd_mV / found.linear.sd_mV - 1) > 1e-3).any()


def test_sites_and_certificate_in_json(run, scenario: Path, tmp_path: Path) -> None:
    out = tmp_path / "t.json"
    assert run("table", str(scenario), "--next-order", "--sites", "--out", str(out)).exit_code == 0
    document = json.loads(out.read_text(encoding="utf-8"))
    found = load_scenario(scenario).next_order()
    assert [r["sd_next_mV"] for r in document["rows"]] == pytest.approx([found.at_sites[s][1] for s in SITES])
    certificate = document["certificate"]
    assert set(certificate["small_fluctuation"]["linear_sd_relative_error"]) == set(SITES)
    assert certificate["next_order"]["relative_error"] < 1e-3
    changes = certificate["next_order"]["sd_relative_change"]
    assert changes["soma"] == pytest.approx(found.at_sites["soma"][1] / found.linear.at("soma").sd_mV - 1)
    assert "next order" in certificate["next_order"]["sentences"][0]


def test_the_terminal_says_how_far_linear_theory_goes(run, scenario: Path) -> None:
    plain = run("table", str(scenario)).stdout
    assert "Linear theory: the SD at" in plain and "% off" in plain
    beyond = run("table", str(scenario), "--next-order").stdout
    assert "next order" in beyond and "To the next order the SD at" in beyond
    assert "Linear theory" not in beyond


def test_currents_alone_are_said_to_be_exact(run, scenario: Path) -> None:
    text = scenario.read_text(encoding="utf-8")
    for size in ("conductance_nS = 0.5\nreversal_mV = 0.0", "conductance_nS = 0.6\nreversal_mV = -75.0"):
        assert size in text
        text = text.replace(size, "current_pA = 5.0")
    scenario.write_text(text, encoding="utf-8")
    assert "Linear theory is exact here: only currents" in run("table", str(scenario)).stdout


def test_along_has_the_columns_and_draws_them(run, scenario: Path, tmp_path: Path) -> None:
    out, figure = tmp_path / "a.csv", tmp_path / "a.png"
    assert run("along", str(scenario), "between", "--next-order", "--out", str(out)).exit_code == 0
    found = load_scenario(scenario).next_order()
    written = rows(out)
    assert float(written[0]["sd_next_mV"]) == pytest.approx(found.at_sites["soma"][1], rel=ROUND_OFF)
    assert float(written[-1]["sd_next_mV"]) == pytest.approx(found.at_sites["between"][1], rel=ROUND_OFF)
    assert run("along", str(scenario), "between", "--next-order", "--out", str(figure)).exit_code == 0
    assert figure.stat().st_size > 10_000
    assert "To the next order" in run("along", str(scenario), "between", "--next-order").stdout


def test_the_map_shows_the_corrected_field(run, scenario: Path, tmp_path: Path) -> None:
    linear, beyond = tmp_path / "l.svg", tmp_path / "n.svg"
    assert run("map", str(scenario), "--quantity", "sd", "--out", str(linear)).exit_code == 0
    assert run("map", str(scenario), "--quantity", "sd", "--next-order", "--out", str(beyond)).exit_code == 0
    assert "next" in beyond.read_text(encoding="utf-8") and "next" not in linear.read_text(encoding="utf-8")
    field = load_scenario(scenario).next_order().field()
    assert field.sd_mV == pytest.approx(load_scenario(scenario).next_order().sd_mV, rel=ROUND_OFF)


def test_pair_and_spectrum_gain_columns(run, scenario: Path, tmp_path: Path) -> None:
    pair, table, spectrum = tmp_path / "p.json", tmp_path / "p.csv", tmp_path / "s.csv"
    two = (str(scenario), "soma", "between", "--next-order", "--out")
    assert run("pair", *two, str(pair)).exit_code == 0
    assert run("pair", *two, str(table)).exit_code == 0
    document = json.loads(pair.read_text(encoding="utf-8"))
    zero = document["lag_ms"].index(0.0)
    after, before = document["covariance_next_mV2"][zero], document["covariance_mV2"][zero]
    assert 1e-3 < abs(after / before - 1) < 0.5
    assert document["correlation_next"] != document["correlation"]
    assert len(document["coherence_next"]) == len(document["phase_next_rad"]) == len(document["frequency_Hz"])
    assert float(rows(table)[zero]["covariance_next_mV2"]) == pytest.approx(after, rel=ROUND_OFF)
    assert "To the next order their correlation is" in run("pair", *two[:-1]).stdout
    assert run("spectrum", str(scenario), "between", "--next-order", "--out", str(spectrum)).exit_code == 0
    first = rows(spectrum)[0]
    assert 1e-3 < abs(float(first["psd_next_mV2_per_Hz"]) / float(first["psd_mV2_per_Hz"]) - 1) < 0.5
    assert "To the next order the density" in run("spectrum", str(scenario), "between", "--next-order").stdout


@pytest.mark.parametrize("command", [("pair", "soma", "between"), ("spectrum", "between")])
def test_figures_draw_both(run, scenario: Path, tmp_path: Path, command: tuple[str, ...]) -> None:
    out = tmp_path / "f.svg"
    name, *sites = command
    assert run(name, str(scenario), *sites, "--next-order", "--out", str(out)).exit_code == 0
    assert "all inputs, next order" in out.read_text(encoding="utf-8")


@pytest.mark.parametrize(
    ("options", "message"),
    [
        (("map", "--out", "m.png", "--quantity", "correlation-time"), "goes with --quantity mean, sd or variance"),
        (("pair", "--all"), "goes with two sites"),
    ],
)
def test_what_the_next_order_does_not_give_is_refused(run, scenario: Path, options, message: str) -> None:
    name, *rest = options
    result = run(name, str(scenario), *rest, "--next-order")
    assert result.exit_code == 2
    assert message in result.stderr
    assert "take one" in result.stderr


def test_correlated_conductances_are_refused_with_a_remedy(run, scenario: Path) -> None:
    text = scenario.read_text(encoding="utf-8")
    scenario.write_text(text.replace("rate_Hz = 2.0", "rate_Hz = 2.0\ncorrelation = 0.01"), encoding="utf-8")
    for command in (("table",), ("along", "between"), ("pair", "soma", "between"), ("spectrum", "between")):
        name, *sites = command
        result = run(name, str(scenario), *sites, "--next-order")
        assert result.exit_code == 2
        assert result.stderr.startswith("--next-order: ")
        assert "excitation" in result.stderr and "take the correlation out" in result.stderr


def test_sources_say_how_far_linear_theory_goes(run, scenario: Path, tmp_path: Path) -> None:
    out = tmp_path / "s.json"
    assert "Linear theory: the SD at between" in run("sources", str(scenario), "between").stdout
    assert run("sources", str(scenario), "between", "--out", str(out)).exit_code == 0
    certificate = json.loads(out.read_text(encoding="utf-8"))["certificate"]
    assert certificate["small_fluctuation"]["linear_sd_relative_error"]["between"] > 0
