"""Mistakes in an electrode, and on the command line of `record`: each has its message."""

from __future__ import annotations

import pytest

from cable.desk.problems import ScenarioError
from cable.desk.scenario import load_scenario

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


@pytest.mark.parametrize(
    ("arguments", "said"),
    [
        (["stick.toml"], 'record: needs a SITE, as the scenario has no [[electrode]]; its sites are "soma"'),
        (["two.toml"], 'needs a SITE, as the scenario has electrodes at "soma" and "half way"; name one'),
        (["two.toml", "somma"], 'there is no site "somma"; did you mean "soma"?'),
        (["two.toml", "soma", "--with", "tip"], 'there is no site "tip"'),
        (["two.toml", "soma", "--with", "soma"], "--with: a correlation needs two sites, found 'soma' twice"),
        (["two.toml", "soma", "--seconds", "-3"], "--seconds: found -3, expected more than 0 and less than 1e9"),
        (["two.toml", "soma", "--wanted-error", "5"], "--wanted-error: found 5, expected a fraction between 0 and 1"),
        (["two.toml", "soma", "--from-Hz", "9", "--to-Hz", "2"], "--from-Hz, --to-Hz: found 9 to 2"),
        (["two.toml", "soma", "--charge", "--out", "Q.csv"], '--charge: the electrode at "soma" is no voltage clamp'),
        (["clamp.toml", "soma", "--charge"], "--charge: needs --out, the file for one row a point"),
        (["clamp.toml", "soma", "--charge", "--out", "Q.png"], "Q.png: the output ends in .png, expected .csv"),
        (["two.toml", "soma", "--out", "two.toml"], "two.toml: the output ends in .toml"),
    ],
)
def test_mistakes_on_the_command_line(run, folder, arguments, said):
    text = (folder / "stick.toml").read_text()
    (folder / "two.toml").write_text(text + SOMA + DENDRITE)
    (folder / "clamp.toml").write_text(text + CLAMP)
    result = run("record", *arguments)
    assert result.exit_code == 2
    assert said in result.output


def test_map_of_charge_needs_a_clamp(run, with_electrodes):
    result = run("map", with_electrodes(SOMA), "--quantity", "charge-share", "--with", "soma", "--out", "M.png")
    assert result.exit_code == 2
    assert '--with: the electrode at "soma" is no voltage clamp, which charge-share needs' in result.output


@pytest.mark.parametrize(
    ("old", "new", "said"),
    [
        ('site = "soma"', 'site = "somma"', "electrode[0].site: found 'somma', expected a site: soma, half way"),
        ('site = "soma"', "", "electrode[0].site: found nothing, expected this key"),
        ("= 15", "= -15", "electrode[0].series_resistance_MOhm: found -15, expected a number of at least 0"),
        ("= 15", '= "15"', 'electrode[0].series_resistance_MOhm: found "15", expected a number'),
        ("= 6", "= -6", "electrode[0].pipette_capacitance_pF: found -6, expected a number of at least 0"),
        ("= 3000", "= 3e6", "electrode[0].filter.corner_Hz: found 3000000.0, expected a number of at most 1e+06"),
        ("= 3000", "= 0", "electrode[0].filter.corner_Hz: found 0, expected a number above 0"),
        ("order = 4", "order = 13", "electrode[0].filter.order: found 13, expected a number of at most 12"),
        ("order = 4", "order = 2.5", "electrode[0].filter.order: found 2.5, expected a whole number"),
        (
            '"Bessel"',
            '"chebyshev"',
            'electrode[0].filter.family: found "chebyshev", expected "bessel" or "butterworth"',
        ),
        ("= 6", '= 6\nmode = "dynamic clamp"', 'electrode[0].mode: found "dynamic clamp", expected "current clamp"'),
        ("= 6", '= 6\nmode = "voltage clamp"', "found pipette_capacitance_pF, which means nothing in voltage clamp"),
        ("= 6", "= 6\nholding_mV = -70", "electrode[0]: found holding_mV, which means nothing in current clamp"),
        (
            "= 6",
            "= 6\ncompensation = 0.7",
            "found compensation, which means nothing in current clamp, where the bridge",
        ),
        ("= 6", "= 6\nbridge_balance = 1.5", "electrode[0].bridge_balance: found 1.5, expected a number of at most 1"),
        ("= 6", "= 6\nseal_GOhm = 0", "electrode[0].seal_GOhm: found 0, expected a number above 0"),
        ("= 6", "= 6\nhigh_pass_Hz = -1", "electrode[0].high_pass_Hz: found -1, expected a number above 0"),
        ("= 6", "= 6\nwindow_s = 0", "electrode[0].window_s: found 0, expected a number above 0"),
        ("= 6", '= 6\ntrend = "line"', "electrode[0]: found trend without window_s, expected both"),
        ("= 6", '= 6\nwindow_s = 1\ntrend = "square"', 'electrode[0].trend: found "square", expected "mean" or "line"'),
        ("= 6", "= 6\nseries_resistance = 3", "electrode[0].series_resistance: found an unknown key, did you mean"),
    ],
)
def test_mistakes_in_an_electrode(with_electrodes, old, new, said):
    assert old in SOMA
    path = with_electrodes(SOMA.replace(old, new, 1))
    with pytest.raises(ScenarioError) as caught:
        load_scenario(path)
    assert said in str(caught.value)


@pytest.mark.parametrize(
    ("electrodes", "said"),
    [
        (CLAMP.replace("holding_mV = -70\n", ""), "electrode[0]: found a voltage clamp without holding_mV"),
        (
            CLAMP + "bridge_balance = 1.0\n",
            "found bridge_balance, which means nothing in voltage clamp, where there is",
        ),
        (SOMA + SOMA, "electrode[1].site: found a second electrode at 'soma', expected one"),
        (
            CLAMP + '[[site]]\nname = "again"\nat = { swc_id = 1 }\n' + CLAMP.replace('"soma"', '"again"'),
            "electrode[1].site: found a voltage clamp where 'soma' is one already, expected one clamp a place",
        ),
    ],
)
def test_electrodes_that_do_not_go_together(with_electrodes, electrodes, said):
    with pytest.raises(ScenarioError) as caught:
        load_scenario(with_electrodes(electrodes))
    assert said in str(caught.value)
