"""What a scenario says becomes the model, and every mistake in one is named by file and key."""

from __future__ import annotations

import hashlib
import math

import pytest

from cable.desk.problems import ScenarioError
from cable.desk.scenario import load_scenario, read_scenario
from morphology import Zone


def message(path) -> str:
    with pytest.raises(ScenarioError) as caught:
        read_scenario(path)
    return str(caught.value)


def test_every_value_reaches_the_model(edited):
    path = edited(
        (
            "[[input]]",
            "[[membrane.zone]]\nwhere = { path_um = [100, inf] }\nspine_factor = 1.9\nrest_mV = -65\n[[input]]",
        ),
        ("[membrane]", "shrinkage = { xy = 1.1, z = 2.0 }\n\n[membrane]"),
        (
            "kernel = { decay_ms = 6.0 }",
            'kernel = { alpha_ms = 3.0 }\ncorrelation = 0.25\nspike_train = { process = "gamma", order = 3 }',
        ),
    )
    model = load_scenario(path)
    assert model.title == "stick"
    assert model.threshold_mV == -50.0
    assert model.site_names == ("soma", "half way", "between")
    assert model.tree.path_um.max() == pytest.approx(1.1 * 610)
    membrane = model.membrane
    assert (membrane.axial_resistivity_ohm_cm, membrane.capacitance_uF_cm2) == (150.0, 1.0)
    assert (membrane.resistance_ohm_cm2, membrane.rest_mV) == (15000.0, -70.0)
    (zone,) = membrane.zones
    assert zone.where == Zone(path_um=(100, math.inf))
    assert (zone.spine_factor, zone.rest_mV, zone.resistance_ohm_cm2) == (1.9, -65, None)
    first, second = model.inputs
    assert first.where == Zone(kinds=("basal",), path_um=(200, math.inf))
    assert (first.name, first.density_per_um, first.rate_Hz, first.conductance_nS) == (
        "excitation",
        0.5,
        2.0,
        0.5,
    )
    assert first.kernel.area_ms != second.kernel.area_ms
    assert second.kernel.peak_ms == pytest.approx(3.0)
    assert (second.density_per_um2, second.reversal_mV, second.correlation) == (0.05, -75.0, 0.25)
    assert (second.spike_train.process, second.spike_train.order) == ("gamma", 3)
    assert first.spike_train.process == "poisson"


def test_point_synapses_and_currents(edited):
    path = edited(
        (
            'where = { kinds = ["soma"] }\ndensity_per_um2 = 0.05',
            "at = [{ swc_id = 7, number = 3 }, { path_um = 50 }]",
        ),
        ("conductance_nS = 0.6\nreversal_mV = -75.0", "current_pA = -4.0"),
    )
    second = load_scenario(path).inputs[1]
    assert [(p.site.swc_id, p.site.path_um, p.number) for p in second.at] == [(7, None, 3), (None, 50, 1)]
    assert (second.current_pA, second.conductance_nS, second.where) == (-4.0, None, None)


@pytest.mark.parametrize(
    ("line", "process", "value"),
    [
        ('{ process = "poisson" }', "poisson", 0.0),
        ('{ process = "dead_time", dead_time_ms = 4.0 }', "dead time", 4.0),
        ("{ dead_time_ms = 4.0 }", "dead time", 4.0),
    ],
)
def test_spike_trains(edited, line, process, value):
    train = load_scenario(edited(("rate_Hz = 2.0", f"rate_Hz = 2.0\nspike_train = {line}"))).inputs[0].spike_train
    assert (train.process, train.dead_time_ms) == (process, value)


def test_the_hash_is_that_of_both_files_in_a_row(folder):
    expected = hashlib.sha256((folder / "stick.toml").read_bytes() + (folder / "stick.swc").read_bytes()).hexdigest()
    read = read_scenario(folder / "stick.toml")
    assert read.sha256 == expected
    assert read.files == (folder / "stick.toml", folder / "stick.swc")


def test_byte_order_mark_and_windows_line_ends_are_taken(folder):
    text = (folder / "stick.toml").read_text()
    (folder / "windows.toml").write_bytes(b"\xef\xbb\xbf" + text.replace("\n", "\r\n").encode())
    assert load_scenario(folder / "windows.toml").title == "stick"


def test_findings_about_the_cell_are_kept(folder):
    swc = (folder / "stick.swc").read_text()
    (folder / "stick.swc").write_text(swc.replace("\n", "\r\n"))
    assert "line-ends" in [f.code for f in read_scenario(folder / "stick.toml").findings]


MISTAKES = {
    "unknown key": (
        ("rate_Hz = 2.0", "rate_Hz = 2.0\nrat_Hz = 2.0"),
        "input[0].rat_Hz",
        ["unknown key", '"rate_Hz"'],
    ),
    "unknown section": (("[threshold]", "[treshold]"), "treshold", ["unknown key", '"threshold"']),
    "unknown key deep down": (
        ("path_um = [200, inf]", "path = [200, inf]"),
        "input[0].where.path",
        ['"path_um"'],
    ),
    "missing key": (("rate_Hz = 2.0", ""), "input[0].rate_Hz", ["found nothing", "Hz", "add it"]),
    "missing section": (
        ("[threshold]\nlevel_mV", "[[site]]\nname"),
        "site[2].name",
        ["-50.0", "text in quotes"],
    ),
    "unit in the value": (
        ("rate_Hz = 2.0", 'rate_Hz = "2 Hz"'),
        "input[0].rate_Hz",
        ['"2 Hz"', "without quotes"],
    ),
    "truth for a number": (
        ("rate_Hz = 2.0", "rate_Hz = true"),
        "input[0].rate_Hz",
        ["found true", "a number"],
    ),
    "list for a number": (
        ("rate_Hz = 2.0", "rate_Hz = [1, 2]"),
        "input[0].rate_Hz",
        ["the list [1, 2]", "a number"],
    ),
    "not finite": (("rate_Hz = 2.0", "rate_Hz = inf"), "input[0].rate_Hz", ["found inf", "finite"]),
    "negative rate": (
        ("rate_Hz = 2.0", "rate_Hz = -2.0"),
        "input[0].rate_Hz",
        ["-2.0", "at least 0", '"excitation"'],
    ),
    "negative density": (
        ("density_per_um = 0.5", "density_per_um = -1"),
        "input[0].density_per_um",
        ["above 0"],
    ),
    "zero resistance": (("15000.0", "0.0"), "membrane.resistance_ohm_cm2", ["found 0.0", "above 0", "Ω"]),
    "correlation above 1": (
        ("rate_Hz = 2.0", "rate_Hz = 2.0\ncorrelation = 2"),
        "input[0].correlation",
        ["at most 1"],
    ),
    "rise = decay": (("rise_ms = 0.2", "rise_ms = 2.0"), "input[0].kernel", ["rise_ms = 2", "alpha_ms"]),
    "rise > decay": (("rise_ms = 0.2", "rise_ms = 5.0"), "input[0].kernel", ["rise_ms = 5", "decay_ms = 2"]),
    "rise alone": (
        ("rise_ms = 0.2, decay_ms = 2.0", "rise_ms = 0.2"),
        "input[0].kernel",
        ["found rise_ms", "decay_ms"],
    ),
    "no kernel": (("rise_ms = 0.2, decay_ms = 2.0", ""), "input[0].kernel", ["no key", "alpha_ms"]),
    "does not decay": (("rise_ms = 0.2, decay_ms = 2.0", 'expression = "t"'), "input[0].kernel", ["decay"]),
    "no arithmetic": (
        ("rise_ms = 0.2, decay_ms = 2.0", "expression = \"__import__('os')\""),
        "input[0].kernel",
        ["not allowed in a kernel"],
    ),
    "both effects": (("rate_Hz = 2.0", "rate_Hz = 2.0\ncurrent_pA = 1"), "input[0]", ["both", "keep one"]),
    "no effect": (("conductance_nS = 0.5\nreversal_mV = 0.0", ""), "input[0]", ["neither", "current_pA"]),
    "no reversal": (("reversal_mV = 0.0", ""), "input[0]", ["conductance_nS without reversal_mV", "add"]),
    "reversal of a current": (
        ("conductance_nS = 0.5", "current_pA = 1"),
        "input[0]",
        ["take reversal_mV out"],
    ),
    "two densities": (
        ("rate_Hz = 2.0", "rate_Hz = 2.0\ncount = 5"),
        "input[0]",
        ["density_per_um and count"],
    ),
    "no density": (("density_per_um = 0.5", ""), "input[0]", ["no density", "add one"]),
    "place and zone": (
        ("rate_Hz = 2.0", "rate_Hz = 2.0\nat = [{ swc_id = 3 }]"),
        "input[0]",
        ["found at and where"],
    ),
    "spread of a density": (
        ("rate_Hz = 2.0", 'rate_Hz = 2.0\nspread = "area"'),
        "input[0]",
        ["spread without count"],
    ),
    "unknown spread": (
        ("density_per_um = 0.5", 'count = 5\nspread = "are"'),
        "input[0].spread",
        ['"length" or "area"'],
    ),
    "nothing selected": (
        ("path_um = [200, inf]", "path_um = [900, inf]"),
        "input[0].where",
        ["selects nothing", "610"],
    ),
    "kind not there": (
        ('["basal"], path_um = [200', '["apical"], path_um = [200'),
        "input[0].where",
        ["soma and basal"],
    ),
    "soma has no length": (
        ("density_per_um2 = 0.05", "density_per_um = 0.05"),
        "input[1].where",
        ["density_per_um2"],
    ),
    "unknown kind": (('["soma"]', '["some"]'), "input[1].where.kinds[0]", ['"some"', 'did you mean "soma"']),
    "kind is half a number": (('["soma"]', "[1.5]"), "input[1].where.kinds[0]", ["1.5", "SWC code"]),
    "range backwards": (
        ("[200, inf]", "[200, 100]"),
        "input[0].where.path_um",
        ["[200.0, 100.0]", "from <= to"],
    ),
    "range of one": (("[200, inf]", "[200]"), "input[0].where.path_um", ["[from, to]"]),
    "range with nan": (("[200, inf]", "[nan, inf]"), "input[0].where.path_um", ["from <= to"]),
    "no such subtree": (("path_um = [200, inf]", "subtree_of = 999"), "input[0].where.subtree_of", ["999"]),
    "site twice": (('name = "between"', 'name = "half way"'), "site[1].name", ["again", "site[0]", "rename"]),
    "input twice": (('name = "inhibition"', 'name = "excitation"'), "input[1].name", ["again", "input[0]"]),
    "site called soma": (
        ('name = "between"', 'name = "soma"'),
        "site[1].name",
        ["the soma is always a site"],
    ),
    "name of nothing": (('name = "between"', 'name = " "'), "site[1].name", ["expected a name"]),
    "name with escape": (('name = "between"', 'name = "a\\u001b[2J"'), "site[1].name", ["\\x1b[2J"]),
    "site absent": (("swc_id = 22", "swc_id = 2222"), "site[0].at", ["2222", '"half way"']),
    "site too far": (("path_um = 333", "path_um = 3333"), "site[1].at", ["no place", "610"]),
    "site both ways": (
        ("swc_id = 22", "swc_id = 22, path_um = 3"),
        "site[0].at",
        ["both of swc_id and path_um"],
    ),
    "site no way": (("swc_id = 22", ""), "site[0].at", ["neither of swc_id and path_um"]),
    "site with idle filter": (
        ("swc_id = 22", 'swc_id = 22, kinds = ["basal"]'),
        "site[0].at",
        ["kinds", "take it out"],
    ),
    "fraction beyond": (
        ("swc_id = 22", "swc_id = 22, fraction = 1.5"),
        "site[0].at.fraction",
        ["1.5", "at most 1"],
    ),
    "order without process": (
        ("rate_Hz = 2.0", 'rate_Hz = 2.0\nspike_train = { process = "poisson", order = 2 }'),
        "input[0].spike_train",
        ["order", "poisson"],
    ),
    "gamma without order": (
        ("rate_Hz = 2.0", 'rate_Hz = 2.0\nspike_train = { process = "gamma" }'),
        "input[0].spike_train",
        ["order", "add it"],
    ),
    "no such repair": (
        ("[membrane]", 'repairs = ["radii from neighbours"]\n[membrane]'),
        "cell.repairs[0]",
        ['did you mean "radius from neighbours"'],
    ),
    "no such kind to omit": (
        ("[membrane]", 'omit = ["axxon"]\n[membrane]'),
        "cell.omit[0]",
        ['did you mean "axon"'],
    ),
    "shrinkage of nothing": (
        ("[membrane]", "shrinkage = { xy = 0 }\n[membrane]"),
        "cell.shrinkage.xy",
        ["above 0"],
    ),
    "no cell file": (("stick.swc", "stock.swc"), "cell.morphology", ['"stock.swc"', "cannot be opened"]),
    "zone that changes nothing": (
        ("[[input]]", "[[membrane.zone]]\nwhere = {}\n[[input]]"),
        "membrane.zone[0]",
        ["no value", "spine_factor"],
    ),
    "a table for a list": (
        ('[[site]]\nname = "half way"', '[site]\nname = "half way"'),
        "",
        ["TOML", "line"],
    ),
}


@pytest.mark.parametrize("mistake", MISTAKES)
def test_each_mistake_has_its_own_message(edited, mistake):
    change, key, words = MISTAKES[mistake]
    path = edited(change)
    said = message(path)
    first = said.splitlines()[0]
    assert first.startswith(f"{path}: {key}: " if key else f"{path}: ")
    for word in words:
        assert word in first, f"{word!r} is not in {first!r}"


def test_an_ambiguous_site_lists_the_places(folder):
    fork = "1 1 0 0 0 8 -1\n2 3 10 0 0 1 1\n3 3 90 50 0 1 2\n4 3 90 -50 0 1 2\n"
    (folder / "stick.swc").write_text(fork)
    text = (folder / "stick.toml").read_text().replace("swc_id = 22", "path_um = 60").replace("333", "5")
    (folder / "fork.toml").write_text(text.replace("[200, inf]", "[20, inf]"))
    said = message(folder / "fork.toml")
    assert "site[0].at: " in said and "2 places" in said and "3 (basal), 4 (basal)" in said


def test_toml_that_is_none_names_the_line(folder):
    (folder / "bad.toml").write_text('title = "x"\n[cell]\nmorphology "stick.swc"\n')
    assert "bad.toml: line 3, column 12: is not TOML" in message(folder / "bad.toml")
    (folder / "bad.toml").write_bytes(b'title = "x"\n# caf\xe9\n')
    assert "bad.toml: line 2: is not UTF-8" in message(folder / "bad.toml")


def test_a_missing_scenario_says_how_to_begin(folder):
    assert "cablenoise start" in message(folder / "none.toml")
    assert "cannot be opened" in message(folder)
    assert "reconstruction" in message(folder / "stick.swc")


def test_several_mistakes_come_together_and_five_are_shown(edited):
    path = edited(
        ("rate_Hz = 2.0", "rate_Hz = -1\na = 1\nb = 1\nc = 1"), ("15000.0", "-1"), ("swc_id = 22", "swc = 22")
    )
    said = message(path).splitlines()
    assert len(said) == 6
    assert said[-1].startswith("and 1 more in ")


def test_a_broken_cell_is_named_with_its_line(folder):
    swc = (folder / "stick.swc").read_text().replace("1.785 2\n", "-1.785 2\n")
    (folder / "stick.swc").write_text(swc)
    said = message(folder / "stick.toml")
    assert "cell.morphology: stick.swc, line 3: " in said and "cablenoise inspect" in said


def test_control_characters_of_a_file_are_shown_as_escapes(edited):
    path = edited(('"stick"', '"stick"\n"a\\u001b[31m" = 1'))
    assert "\x1b" not in message(path)
    assert "\\x1b[31m" in message(path)
