"""The commands spectrum and pair, and the map of correlation, as a person meets them."""

from __future__ import annotations

import csv
import json

import numpy as np
import pytest
from PIL import Image


def rows_of(path) -> list[dict[str, float]]:
    with path.open(newline="", encoding="utf-8") as file:
        return [{key: float(value) for key, value in row.items()} for row in csv.DictReader(file)]


def test_spectrum_as_table_and_sentences(run, folder) -> None:
    result = run(
        "spectrum", folder / "stick.toml", "soma", "--out", folder / "S.csv", "--points", "7", "--to", "half way"
    )
    assert result.exit_code == 0, result.output
    rows = rows_of(folder / "S.csv")
    assert list(rows[0])[:2] == ["frequency_Hz", "psd_mV2_per_Hz"]
    assert {"psd_excitation_mV2_per_Hz", "input_impedance_MOhm", "input_phase_rad", "transfer_impedance_MOhm"} <= set(
        rows[0]
    )
    assert [row["frequency_Hz"] for row in rows] == pytest.approx(np.geomspace(0.1, 1000, 7))
    for row in rows:
        parts = row["psd_excitation_mV2_per_Hz"] + row["psd_inhibition_mV2_per_Hz"]
        assert parts == pytest.approx(row["psd_mV2_per_Hz"], rel=1e-12)
    told = run("spectrum", folder / "stick.toml", "soma")
    assert "input impedance" in told.output and "mV²/Hz" in told.output


def test_thermal_noise_beside_the_synaptic(run, folder) -> None:
    asked = ("spectrum", folder / "stick.toml", "soma", "--temperature-C", "36", "--points", "5")
    assert run(*asked, "--out", folder / "S.csv").exit_code == 0
    for row in rows_of(folder / "S.csv"):
        real = row["input_impedance_MOhm"] * np.cos(row["input_phase_rad"])
        want = 4 * 1.380649e-23 * 309.15 * real * 1e12  # Nyquist 1928, Phys Rev 32:110
        assert row["psd_thermal_mV2_per_Hz"] == pytest.approx(want, rel=1e-12)
    assert "Thermal noise at 36 °C is" in run(*asked).output
    assert run(*asked, "--out", folder / "S.svg").exit_code == 0
    assert "thermal, 36 °C" in (folder / "S.svg").read_text(encoding="utf-8")
    cold = run("spectrum", folder / "stick.toml", "soma", "--temperature-C", "-300")
    assert cold.exit_code == 2 and "--temperature-C: found -300" in cold.stderr


def test_pair_as_document_and_table(run, folder) -> None:
    for name in ("C.json", "C.csv"):
        result = run("pair", folder / "stick.toml", "soma", "half way", "--out", folder / name, "--lag-ms", "40")
        assert result.exit_code == 0, result.output
    found = json.loads((folder / "C.json").read_text(encoding="utf-8"))
    assert {"correlation", "lag_ms", "covariance_mV2", "frequency_Hz", "coherence", "phase_rad", "certificate"} <= set(
        found
    )
    assert found["certificate"]["covariance_relative_error"] <= 1e-9
    assert found["lag_ms"][0] == -40 and 0.0 in found["lag_ms"]
    assert 0 < found["correlation"] < 1 and max(found["coherence"]) <= 1
    rows = rows_of(folder / "C.csv")
    assert [row["covariance_mV2"] for row in rows] == found["covariance_mV2"]
    assert "covariance_inhibition_mV2" in rows[0]


def test_sources_as_table_and_sentences(run, folder) -> None:
    assert run("sources", folder / "stick.toml", "soma", "--out", folder / "C.csv").exit_code == 0
    with (folder / "C.csv").open(newline="", encoding="utf-8") as file:
        rows = list(csv.DictReader(file))
    assert list(rows[0])[:3] == ["swc_id", "kind", "path_um"]
    assert sum(float(row["variance_share"]) for row in rows) == pytest.approx(1.0, rel=1e-9)
    parts = [sum(float(row[f"variance_share_{name}"]) for row in rows) for name in ("excitation", "inhibition")]
    assert sum(parts) == pytest.approx(1.0, rel=1e-9) and min(parts) > 0
    told = run("sources", folder / "stick.toml", "half way").output
    assert "Half of the variance at half way comes from within" in told and "The mean is shifted by" in told


def test_modes_as_table_and_sentences(run, folder) -> None:
    assert run("modes", folder / "stick.toml", "--count", "2", "--out", folder / "M.json").exit_code == 0
    found = json.loads((folder / "M.json").read_text(encoding="utf-8"))
    assert len(found["share"]) == 2 and 0 < found["share"][1] < found["share"][0] < 1
    assert {"swc_id", "mode_1_mV", "mode_2_mV"} <= set(found["rows"][0])
    told = run("modes", folder / "stick.toml", "--count", "3").output
    assert "participation number" in told and "first 3 modes" in told
    refused = run("modes", folder / "stick.toml", "--count", "100000")
    assert refused.exit_code == 2 and "--count: expected 1 to" in refused.output


def test_point_neuron_as_table_and_sentences(run, folder) -> None:
    assert run("point-neuron", folder / "stick.toml", "--out", folder / "P.csv").exit_code == 0
    with (folder / "P.csv").open(newline="", encoding="utf-8") as file:
        row = next(csv.DictReader(file))
    assert row["site"] == "soma" and float(row["fit_error"]) < 0.05
    assert float(row["capacitance_pF"]) * float(row["input_resistance_MOhm"]) * 1e-3 == pytest.approx(
        float(row["time_constant_ms"])
    )
    assert "time constant" in run("point-neuron", folder / "stick.toml", "half way").output


def test_all_correlations(run, folder) -> None:
    told = run("pair", folder / "stick.toml", "--all")
    assert told.exit_code == 0 and "1.0000" in told.output and "half way" in told.output


@pytest.mark.parametrize(
    ("words", "told"),
    [
        (["spectrum", "somma"], 'did you mean "soma"'),
        (["spectrum", "soma", "--from-Hz", "10", "--to-Hz", "1"], "expected 0 < from < to"),
        (["spectrum", "soma", "--out", "S.txt"], ".csv"),
        (["sources", "tip of it"], "there is no site"),
        (["point-neuron", "sofa"], 'did you mean "soma"'),
        (["pair", "soma"], "needs two sites, or --all"),
        (["pair", "soma", "half wy"], 'did you mean "half way"'),
        (["pair", "soma", "half way", "--lag-ms", "-3"], "--lag-ms"),
        (["pair", "soma", "half way", "--all"], "takes no site"),
        (["map", "--out", "M.png", "--quantity", "correlation"], "needs --with SITE"),
        (["map", "--out", "M.png", "--with", "soma"], "goes with --quantity correlation, lag, source or charge-share"),
        (["along", "half way", "--quantity", "lag"], "command map"),
    ],
)
def test_messages(run, folder, words: list[str], told: str) -> None:
    result = run(words[0], folder / "stick.toml", *words[1:])
    assert result.exit_code == 2
    assert told in result.output and "Traceback" not in result.output


@pytest.mark.parametrize("ending", ["png", "svg", "pdf"])
def test_figures(run, folder, ending: str) -> None:
    for words in (
        ["spectrum", folder / "stick.toml", "soma", "--to", "half way"],
        ["pair", folder / "stick.toml", "soma", "half way"],
        ["map", folder / "stick.toml", "--quantity", "correlation", "--with", "soma"],
        ["sources", folder / "stick.toml", "soma"],
        ["modes", folder / "stick.toml", "--count", "2"],
    ):
        path = folder / f"{words[0]}.{ending}"
        assert run(*words, "--out", path).exit_code == 0
        if ending == "png":
            with Image.open(path) as picture:
                shades = np.unique(np.asarray(picture.convert("L")))
                assert picture.size[0] > 900 and len(shades) > 20
        if ending == "svg":
            assert "mathdefault" not in path.read_text(encoding="utf-8")
