"""Worked examples, end to end: SWC text and scenario file in, the command's CSV out.

Reference: `oracles.worked`, closed forms evaluated with 25 digits, themselves checked against frequency
quadrature and finite volumes. Derived, verified by two computations.
"""

from __future__ import annotations

import csv
from pathlib import Path

import pytest
from typer.testing import CliRunner

from cable.desk.cli import app
from oracles import worked, worked_distal
from tolerances import EXACT

HEAD = """
[cell]
morphology = "cell.swc"
[membrane]
axial_resistivity_ohm_cm = 150.0
capacitance_uF_cm2 = 1.0
resistance_ohm_cm2 = {resistance!r}
rest_mV = {rest!r}
"""
EXPONENTIAL = "kernel = { decay_ms = 2.0 }\n"


def table(
    folder: Path, swc: str, scenario: str, resistance: float = 20000.0, rest: float = 0.0
) -> dict[str, dict[str, str]]:
    """Rows of the site table by SWC id (points) and by site name (sites)."""
    (folder / "cell.swc").write_text(swc)
    (folder / "scenario.toml").write_text(HEAD.format(resistance=resistance, rest=rest) + scenario)
    result = CliRunner().invoke(app, ["table", str(folder / "scenario.toml"), "--out", str(folder / "t.csv")])
    assert result.exit_code == 0, result.output
    with (folder / "t.csv").open(newline="", encoding="utf-8") as file:
        rows = list(csv.DictReader(file))
    found: dict[str, dict[str, str]] = {}
    for row in rows:  # a site between two points has a row of its own, after all points
        found.setdefault(row["swc_id"], row)
        found.setdefault(row["site"], row)
    return found


def check(row: dict[str, str], mean: float, sd: float) -> None:
    assert float(row["mean_mV"]) == pytest.approx(float(mean), rel=EXACT)
    assert float(row["sd_mV"]) == pytest.approx(float(sd), rel=EXACT)


def population(extra: str, kernel: str = EXPONENTIAL, name: str = "synapses") -> str:
    return f'[[input]]\nname = "{name}"\n{extra}\n{kernel}'


def test_sphere_with_current_synapses(tmp_path: Path) -> None:
    want = worked.sphere_current()
    rows = table(
        tmp_path,
        "1 1 0 0 0 10 -1\n",
        population('where = { kinds = ["soma"] }\ncount = 200\nspread = "area"\nrate_Hz = 5.0\ncurrent_pA = 5.0'),
    )
    check(rows["1"], want["mean_mV"], want["sd_mV"])


def test_sphere_with_conductance_synapses(tmp_path: Path) -> None:
    """The effective-time-constant example with the in-vivo-like point set (Destexhe et al. 2001, from memory)."""
    want = worked.sphere_conductance()
    radius = (34636 / (4 * 3.141592653589793)) ** 0.5
    excitation, inhibition = (float(want[key]) * 1e3 for key in ("excitation_per_ms", "inhibition_per_ms"))
    where = 'where = {}\ncount = 1\nspread = "area"\n'
    rows = table(
        tmp_path,
        f"1 1 0 0 0 {radius!r} -1\n",
        population(
            f"{where}rate_Hz = {excitation!r}\nconductance_nS = 1.2\nreversal_mV = 0.0",
            "kernel = { decay_ms = 2.728 }\n",
            "e",
        )
        + population(
            f"{where}rate_Hz = {inhibition!r}\nconductance_nS = 0.6\nreversal_mV = -75.0",
            "kernel = { decay_ms = 10.49 }\n",
            "i",
        ),
        resistance=1000 / 0.045,
        rest=-80.0,
    )
    check(rows["1"], want["mean_mV"], want["sd_mV"])


def test_uniform_cable(tmp_path: Path) -> None:
    want = worked.uniform_cable()
    rows = table(
        tmp_path,
        "1 3 0 0 0 1 -1\n2 3 500 0 0 1 1\n3 3 1000 0 0 1 2\n",
        population("where = {}\ndensity_per_um = 0.5\nrate_Hz = 1.0\ncurrent_pA = 10.0"),
    )
    for row, place in (("1", "0"), ("2", "500"), ("3", "1000")):
        check(rows[row], want["mean_mV"], want[f"sd_{place}_mV"])


def test_cable_driven_on_its_distal_half(tmp_path: Path) -> None:
    """Limits of the zone and the site in the middle both fall inside the only cylinder."""
    want = worked_distal.distal_cable()
    rise, decay = 0.5, 5.0
    ratio = rise / decay
    peak = ratio ** (rise / (decay - rise)) - ratio ** (decay / (decay - rise))
    current = 20.0 * peak / (decay - rise)
    rows = table(
        tmp_path,
        "1 3 0 0 0 1 -1\n2 3 1000 0 0 1 1\n",
        population(
            f"where = {{ path_um = [500, 1000] }}\ndensity_per_um = 1.0\nrate_Hz = 1.0\ncurrent_pA = {current!r}",
            "kernel = { rise_ms = 0.5, decay_ms = 5.0 }\n",
        )
        + '[[site]]\nname = "middle"\nat = { path_um = 500 }\n',
    )
    check(rows["1"], want["mean_0_mV"], want["sd_0_mV"])
    check(rows["2"], want["mean_1000_mV"], want["sd_1000_mV"])
    assert float(rows["middle"]["sd_mV"]) == pytest.approx(float(want["sd_500_mV"]), rel=EXACT)


SOMA_AND_STICK = "1 1 0 0 0 10 -1\n2 3 10 0 0 1 1\n"


@pytest.mark.parametrize("rows_of_stick", ["3 3 1010 0 0 1 2\n", "3 3 510 0 0 1 2\n4 3 1010 0 0 1 3\n"])
def test_ball_and_stick(tmp_path: Path, rows_of_stick: str) -> None:
    """The middle is a site within the stick's one cylinder, or a row of its own; crossings are those of the mean."""
    want = worked.ball_and_stick()
    scenario = population("where = {}\ndensity_per_um2 = 0.08\nrate_Hz = 1.0\ncurrent_pA = 10.0")
    scenario += '[[site]]\nname = "mid"\nat = { path_um = 510 }\n[threshold]\nlevel_mV = 3.2\n'
    rows = table(tmp_path, SOMA_AND_STICK + rows_of_stick, scenario)
    tip = str(2 + rows_of_stick.count("\n"))
    for row, place in (("1", "soma"), ("mid", "mid"), (tip, "tip")):
        check(rows[row], want["mean_mV"], want[f"sd_{place}_mV"])
    for row, place in (("1", "soma"), (tip, "tip")):
        assert float(rows[row]["upcrossing_Hz"]) == pytest.approx(float(want[f"upcrossing_{place}_Hz"]), rel=EXACT)
    assert float(rows["1"]["input_resistance_MOhm"]) == pytest.approx(
        float(want["input_resistance_soma_MOhm"]), rel=EXACT
    )


def test_ball_and_stick_with_common_input(tmp_path: Path) -> None:
    """The coherent part is the same at every place of a uniform tree; it makes most of the variance."""
    want = worked.ball_and_stick()
    scenario = population("where = {}\ndensity_per_um2 = 0.08\nrate_Hz = 1.0\ncurrent_pA = 10.0\ncorrelation = 0.1")
    rows = table(tmp_path, SOMA_AND_STICK + "3 3 1010 0 0 1 2\n", scenario)
    assert float(rows["1"]["sd_mV"]) == pytest.approx(float(want["sd_soma_correlated_mV"]), rel=EXACT)
    for row, place in (("1", "soma"), ("3", "tip")):
        coherent = (float(rows[row]["variance_mV2"]) - 0.9 * float(want[f"sd_{place}_mV"]) ** 2) / 0.1
        assert coherent == pytest.approx(float(want["coherent_variance_mV2"]), rel=EXACT)


def test_y_branch_by_the_three_halves_law(tmp_path: Path) -> None:
    """A step of radius at the branch point is two rows in one place."""
    want = worked.y_branch()
    trunk = 0.5 * 2 ** (2 / 3) * 1.2
    swc = f"1 3 0 0 0 {trunk!r} -1\n2 3 400 0 0 {trunk!r} 1\n"
    swc += "3 3 400 0 0 0.6 2\n4 3 580 240 0 0.6 3\n5 3 400 0 0 0.6 2\n6 3 580 -240 0 0.6 5\n"
    rows = table(tmp_path, swc, population("where = {}\ndensity_per_um2 = 0.1\nrate_Hz = 1.0\ncurrent_pA = 10.0"))
    for row, place in (("1", "root"), ("2", "branch"), ("3", "branch"), ("4", "tip"), ("6", "tip")):
        check(rows[row], want["mean_mV"], want[f"sd_{place}_mV"])
    for row, place in (("1", "root"), ("4", "tip")):
        assert float(rows[row]["input_resistance_MOhm"]) == pytest.approx(
            float(want[f"input_resistance_{place}_MOhm"]), rel=EXACT
        )
