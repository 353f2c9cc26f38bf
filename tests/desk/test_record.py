"""`record`: the scenario's electrodes, what the command writes and says, and every mistake in one."""

from __future__ import annotations

import json

import numpy as np
import pandas as pd
import pytest

from cable import load_scenario
from cable.desk.figures.record import draw_record
from cable.desk.figures.style import styled
from cable.desk.record_table import study_record
from cable.theory.filters import LowPass

SOMA = """
[[electrode]]
site = "soma"
series_resistance_MOhm = 15
pipette_capacitance_pF = 6
filter = { family = "Bessel", order = 4, corner_Hz = 3000 }
"""
DENDRITE = """
[[electrode]]
site = "half way"
series_resistance_MOhm = 40
pipette_capacitance_pF = 8
seal_GOhm = 5
high_pass_Hz = 0.5
"""
CLAMP = """
[[electrode]]
site = "soma"
mode = "voltage_clamp"
holding_mV = -70
series_resistance_MOhm = 15
compensation = 0.6
"""


@pytest.fixture
def with_electrodes(folder, monkeypatch):
    monkeypatch.chdir(folder)

    def make(*electrodes: str) -> str:
        text = (folder / "stick.toml").read_text()
        (folder / "e.toml").write_text(text + "".join(electrodes))
        return "e.toml"

    return make


def test_every_value_of_an_electrode_reaches_the_model(with_electrodes):
    more = 'window_s = 2\ntrend = "line"\nbridge_balance = false\n'
    first, second = load_scenario(with_electrodes(SOMA + more, DENDRITE)).electrodes
    assert (first.site, first.mode, first.series_resistance_MOhm) == ("soma", "current clamp", 15)
    assert (first.pipette_capacitance_pF, first.low_pass) == (6, LowPass("bessel", 4, 3000))
    assert (first.window_s, first.trend, first.bridge_balance) == (2, "line", 0.0)
    assert (second.site, second.seal_GOhm, second.high_pass_Hz, second.bridge_balance) == ("half way", 5, 0.5, 1.0)
    (clamp,) = load_scenario(with_electrodes(CLAMP)).electrodes
    assert (clamp.mode, clamp.holding_mV, clamp.compensation) == ("voltage clamp", -70, 0.6)


def test_the_only_electrode_needs_no_site(run, with_electrodes):
    result = run("record", with_electrodes(SOMA), "--seconds", 20, "--wanted-error", 0.02)
    assert result.exit_code == 0, result.output
    found = load_scenario("e.toml").recording("soma").recorded
    said = " ".join(result.output.split())
    assert f"The record has an SD of {found.sd:.4g} mV; the amplifier shows an input resistance of" in said
    assert f"within 2 % (one standard error) after {found.seconds_for_sd(0.02):.3g} s" in said
    assert f"A record of 20 s knows the SD within {100 * found.sd_relative_error(20):.3g} %" in said


def test_json_has_the_stages_the_lengths_and_the_errors(run, folder, with_electrodes):
    result = run(
        *("record", with_electrodes(SOMA, DENDRITE), "soma", "--with", "half way"),
        *("--seconds", 5, "--out", "R.json"),
    )
    assert result.exit_code == 0, result.output
    found = json.loads((folder / "R.json").read_text())
    model = load_scenario(folder / "e.toml")
    bare = load_scenario(folder / "stick.toml").fluctuations().at("soma")
    assert found["sd_true_mV"] == pytest.approx(bare.sd_mV, rel=1e-7)
    assert found["mean_true_mV"] == pytest.approx(bare.mean_mV, rel=1e-9)
    loaded = model.fluctuations().at("soma")
    assert found["sd_loaded_mV"] == pytest.approx(loaded.sd_mV, rel=1e-7)
    assert found["input_resistance_MOhm"] == pytest.approx(loaded.input_resistance_MOhm, rel=1e-9)
    assert found["sd_recorded_mV"] < found["sd_loaded_mV"] < found["sd_true_mV"]
    assert found["sd_relative_error"] == pytest.approx(0.05 * (found["seconds_for_sd"] / 5) ** 0.5)
    assert found["sd_se_mV"] == pytest.approx(found["sd_relative_error"] * found["sd_recorded_mV"])
    assert sum(found["variance_recorded_by_input_mV2"].values()) == pytest.approx(found["sd_recorded_mV"] ** 2)
    pair = model.recorded_pair("soma", "half way")
    assert found["pair"]["correlation_recorded"] == pytest.approx(pair.recorded.value)
    assert found["pair"]["correlation_true"] == pytest.approx(pair.true.value)
    assert found["pair"]["correlation_se"] == pytest.approx(pair.recorded.error(5))
    assert found["certificate"]["recorded_relative_error"] < 1e-8
    assert {"scenario_sha256", "version"} <= found.keys()


def test_the_table_of_densities_integrates_to_the_variance(run, folder, with_electrodes):
    name = with_electrodes(SOMA)
    options = "--from-Hz", "0.001", "--to-Hz", "1e6", "--points", "1500", "--out", "R.csv"
    assert run("record", name, *options).exit_code == 0
    rows = pd.read_csv(folder / "R.csv")
    parts = ["psd_recorded_excitation_mV2_per_Hz", "psd_recorded_inhibition_mV2_per_Hz"]
    stages = ["psd_true_mV2_per_Hz", "psd_loaded_mV2_per_Hz", "psd_recorded_mV2_per_Hz"]
    assert list(rows.columns) == ["frequency_Hz", *stages, *parts, "power_gain"]
    assert np.allclose(rows[parts].sum(axis=1), rows[stages[2]], rtol=1e-12, atol=0)
    assert np.allclose(rows["power_gain"] * rows[stages[1]], rows[stages[2]], rtol=1e-12, atol=0)
    found = load_scenario(folder / name).recording("soma")
    for stage, record in zip(stages, (found.true, found.loaded, found.recorded), strict=True):
        f = rows["frequency_Hz"]
        assert np.trapezoid(rows[stage] * f, np.log(f)) == pytest.approx(record.variance, rel=2e-4)


def test_high_pass_loses_the_mean(run, folder, with_electrodes):
    name = with_electrodes(DENDRITE)
    assert "and has lost the mean" in run("record", name).output
    assert run("record", name, "--seconds", 3, "--out", "R.json").exit_code == 0
    found = json.loads((folder / "R.json").read_text())
    assert found["mean_recorded_mV"] is found["mean_se_mV"] is found["seconds_for_mean"] is None


def test_a_site_without_electrode_has_an_ideal_one(run, folder, with_electrodes):
    result = run("record", "stick.toml", "between")
    assert "The scenario has no electrode there: an ideal one is assumed" in result.output
    run("record", "stick.toml", "between", "--out", "R.json")
    found = json.loads((folder / "R.json").read_text())
    assert found["ideal_electrode_assumed"]
    assert found["sd_recorded_mV"] == pytest.approx(found["sd_true_mV"], rel=1e-8)


def test_bridge_balance_shows_in_the_input_resistance(with_electrodes):
    balanced = load_scenario(with_electrodes(SOMA)).recording("soma").input_resistance_MOhm
    unbalanced = load_scenario(with_electrodes(SOMA + "bridge_balance = 0.8\n")).recording("soma").input_resistance_MOhm
    assert unbalanced - balanced == pytest.approx(0.2 * 15)


def test_voltage_clamp_by_input_and_by_point(run, folder, with_electrodes):
    name = with_electrodes(CLAMP)
    said = run("record", name).output
    assert "the current of an ideal clamp is" in said
    assert "Of the synapses' charge the clamp sees: excitation" in said
    assert "Its step transient shows" in said
    assert run("record", name, "--out", "R.json").exit_code == 0
    found = json.loads((folder / "R.json").read_text())
    shares = load_scenario(folder / name).clamp_shares("soma")
    assert found["clamp"]["charge_share_by_input"] == pytest.approx(shares.charge_share_by_input)
    assert found["clamp"]["noise_share"] == pytest.approx(shares.noise_share)
    assert found["sd_true_pA"] > found["sd_loaded_pA"]
    assert run("record", name, "--charge", "--out", "Q.csv").exit_code == 0
    rows = pd.read_csv(folder / "Q.csv")
    assert rows["charge_share"].to_numpy() == pytest.approx(shares.charge_share)
    assert (np.diff(rows["charge_share"][1:]) < 0).all()  # the first two rows are the soma and its surface
    assert run("map", name, "--quantity", "charge-share", "--with", "soma", "--out", "M.png").exit_code == 0


def test_short_records_are_called_short(run, with_electrodes):
    said = " ".join(run("record", with_electrodes(SOMA), "--seconds", 0.01, "--wanted-error", 0.9).output.split())
    assert "A record of 10 ms knows the SD" in said
    assert "That is short: these errors hold for records of at least" in said
    assert "(one standard error) after at most" in said


def test_table_says_that_the_cell_is_loaded(run, folder, with_electrodes):
    name = with_electrodes(SOMA, DENDRITE)
    note = "loaded by its electrodes at soma (current clamp) and half way (current clamp)"
    assert note in " ".join(run("table", name).output.split())
    assert "electrode" not in run("table", "stick.toml").output
    assert run("table", name, "--out", "T.json").exit_code == 0
    assert note in json.loads((folder / "T.json").read_text())["electrode_note"]


@pytest.mark.parametrize("electrodes", [SOMA, CLAMP, DENDRITE])
def test_figure_holds_the_three_stages_and_the_length(with_electrodes, electrodes):
    model = load_scenario(with_electrodes(electrodes))
    study = study_record(model, model.electrodes[0].site, None, np.geomspace(0.1, 1e4, 40), 0.05, 30.0, tolerance=1e-7)
    with styled():
        page = draw_record(study, "a title")
        page.canvas.draw()
    upper, lower = page.axes
    stages = [study.spectrum.true, study.spectrum.loaded, study.spectrum.recorded]
    for line, stage in zip(upper.lines, stages, strict=True):
        assert np.array_equal(line.get_ydata(), stage)
    unit = study.recording.electrode.unit
    assert upper.get_ylabel() == f"density ({unit}²/Hz)"
    dots = [line for line in lower.lines if line.get_marker() == "o"]
    assert [float(d.get_ydata()[0]) for d in dots] == pytest.approx(
        [5.0, 100 * study.recording.recorded.sd_relative_error(30.0)]
    )
    assert float(dots[0].get_xdata()[0]) == pytest.approx(study.recording.recorded.seconds_for_sd(0.05))


def test_figures_in_every_format(run, folder, with_electrodes):
    name = with_electrodes(SOMA)
    for ending in ("png", "svg", "pdf"):
        assert run("record", name, "--out", f"R.{ending}").exit_code == 0
        assert (folder / f"R.{ending}").stat().st_size > 5000
    assert run("record", name, "--out", "R.png").exit_code == 2
