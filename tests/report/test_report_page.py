"""The report as a file: what it holds, what it never holds, and that its numbers are those of the table."""

from __future__ import annotations

import base64
import hashlib
import json
import re
from html.parser import HTMLParser

import numpy as np
import pytest
from scipy.integrate import quad
from typer.testing import CliRunner

from cable import load_scenario, write_report
from cable.desk.cli import app
from cable.desk.report.gather import MOST_CURVES, sites_with_curves
from cable.desk.report.packed import NOTHING, logarithms, numbers, whole
from cable.desk.report.page import in_script, render
from cable.desk.report.words import headline
from cable.desk.site_table import points_table
from cable.noise.point_spectra import point_spectra_mV2_per_Hz
from tolerances import EXACT, LOGARITHMIC, ROUNDED, SINGLE

TYPES = {"f4": "<f4", "f8": "<f8", "i4": "<i4", "i2": "<i2"}


class Page(HTMLParser):
    """The elements of a page with their attributes, and the text of its scripts and styles."""

    def __init__(self, text: str) -> None:
        super().__init__()
        self.elements: list[tuple[str, dict[str, str | None]]] = []
        self.texts: dict[str, list[str]] = {"script": [], "style": [], "h1": [], "pre": []}
        self._open = ""
        self.feed(text)

    def handle_starttag(self, tag, attrs):
        self.elements.append((tag, dict(attrs)))
        if tag in self.texts:
            self._open = tag
            self.texts[tag].append("")

    def handle_endtag(self, tag):
        self._open = "" if tag == self._open else self._open

    def handle_data(self, data):
        if self._open:
            self.texts[self._open][-1] += data


def unpacked(packed) -> np.ndarray:
    return np.frombuffer(base64.b64decode(packed["bytes"]), TYPES[packed["type"]]).astype(float)


def data_of(text: str):
    return json.loads(Page(text).texts["script"][0])


def test_every_number_of_the_table_is_in_the_page(made):
    data = data_of(made.text)
    table = points_table(made.field)
    assert data["rows"] == len(table) == len(made.scenario.model.tree) + 1
    found = {one["key"]: unpacked(one) for one in data["columns"]}
    for key, column in table.columns.items():
        if key not in ("site", "kind"):
            np.testing.assert_allclose(found[key], np.asarray(column, dtype=float), rtol=SINGLE)
    kinds = [data["kinds"][int(k)] for k in unpacked(data["kind"])]
    assert kinds == list(table.columns["kind"])
    for site in data["sites"]:
        assert table.columns["site"][site["row"]] == site["name"]
    for name in made.scenario.model.site_names:
        one = made.scenario.model.correlation_map(name)
        points = len(made.scenario.model.tree)
        np.testing.assert_allclose(found[f"correlation_with_{name}"][:points], one.correlation, rtol=SINGLE)


def test_spectra_of_all_points_are_those_of_single_sites_and_integrate_to_the_variance(made):
    model = made.scenario.model
    frequency = np.geomspace(0.1, 1000, 33)
    density = point_spectra_mV2_per_Hz(model, frequency)
    points = len(model.tree)
    for k, name in enumerate(model.site_names):
        np.testing.assert_allclose(density[points + k], model.spectrum(name, frequency).psd_mV2_per_Hz, rtol=EXACT)
    # scipy's adaptive quadrature of the density at one point, over all positive frequencies
    row = 30

    def at(u: float) -> float:
        return float(point_spectra_mV2_per_Hz(model, np.array([np.exp(u)]))[row, 0] * np.exp(u))

    area = quad(at, np.log(1e-4), np.log(1e6), epsrel=1e-8, limit=200)[0]
    below = 1e-4 * point_spectra_mV2_per_Hz(model, np.array([0.0]))[row, 0]
    assert area + below == pytest.approx(made.field.variance_mV2[row], rel=ROUNDED)
    data = data_of(made.text)
    packed = data["spectrum"]["density"]
    kept = 10 ** (packed["top"] + unpacked(packed) / packed["per_decade"]).reshape(data["rows"], -1)
    np.testing.assert_allclose(kept[:points], density[:points], rtol=LOGARITHMIC)


def test_negative_frequencies_are_refused(made):
    with pytest.raises(ValueError, match="at least 0"):
        point_spectra_mV2_per_Hz(made.scenario.model, np.array([-1.0]))


def test_curves_of_pairs_are_those_of_pair(made):
    data, model = data_of(made.text), made.scenario.model
    curves = data["curves"]
    lag = np.array(curves["lag_ms"])
    size = len(curves["sites"])
    correlation = unpacked(curves["correlation"]).reshape(size, size, len(lag))
    frequency = np.array(data["spectrum"]["site_frequency_Hz"])
    coherence = unpacked(curves["coherence"]).reshape(size, size, len(frequency))
    for name, parts in data["spectrum"]["parts"].items():
        expected = list(model.spectrum(name, frequency).psd_by_input_mV2_per_Hz.values())
        np.testing.assert_allclose(np.array(parts), expected, rtol=ROUNDED)
    pair = model.pair("soma", "far & <wide>", lag, frequency)
    sd = [made.field.at(name).sd_mV for name in pair.sites]
    np.testing.assert_allclose(correlation[0, 1], pair.covariance_mV2 / np.prod(sd), atol=ROUNDED)
    back = model.pair("far & <wide>", "soma", lag, frequency).covariance_mV2 / np.prod(sd)
    np.testing.assert_allclose(correlation[1, 0], back, atol=ROUNDED)
    assert np.abs(correlation[0, 1] - correlation[1, 0]).max() > 0.01  # the two directions differ
    np.testing.assert_allclose(coherence[0, 1], pair.coherence, rtol=ROUNDED)


def test_nothing_is_loaded_and_only_its_own_script_and_style_run(made):
    page = Page(made.text)
    policy = next(a["content"] for tag, a in page.elements if a.get("http-equiv") == "Content-Security-Policy")
    assert policy.startswith("default-src 'none';")
    for text, kind in ((page.texts["script"][1], "script"), (page.texts["style"][0], "style")):
        own = base64.b64encode(hashlib.sha256(text.encode()).digest()).decode()
        assert f"{kind}-src 'sha256-{own}'" in policy
    assert "unsafe" not in policy and "http" not in policy
    for tag, attributes in page.elements:
        assert tag not in ("iframe", "object", "embed", "form", "base", "img")
        for name, value in attributes.items():
            assert not name.startswith("on") and name not in ("style", "src")
            assert name != "href" or value.startswith(("#", "data:,"))
    assert not re.search(r"\b(fetch|XMLHttpRequest|WebSocket|eval|innerHTML|insertAdjacentHTML|outerHTML)\b", made.text)


def test_names_and_titles_are_text_whatever_they_hold(made):
    page = Page(made.text)
    assert len(page.texts["script"]) == 2
    assert page.texts["h1"] == ['Wren </script><script>document.title="gone"</script>']
    assert page.texts["pre"][-1].strip() == made.scenario.text.strip()
    assert "<img" not in made.text
    assert json.loads(in_script({"</script>&<!--": "\u2028]]>"})) == {"</script>&<!--": "\u2028]]>"}
    assert "<" not in in_script("</script><!--")


def test_the_page_names_no_folder(made, nest):
    assert str(nest) not in made.text and "cablenoise report wren.toml --out wren.html" in made.text
    assert made.scenario.sha256 in made.text


def test_headline_has_the_numbers(made):
    said = " ".join(headline(made.field))
    soma, sd = made.field.at("soma"), made.field.sd_mV
    ids = made.scenario.model.tree.ids
    assert f"−{-soma.mean_mV:.2f} ± {soma.sd_mV:.2f} mV" in said
    assert f"largest, {sd.max():.2f} mV, at SWC id {ids[np.argmax(sd)]}" in said
    top = max(soma.variance_by_input_mV2.values()) / soma.variance_mV2
    assert f"{100 * top:.1f} % of the variance" in said


def test_a_cell_without_synapses_says_so(nest):
    text = (nest / "wren.toml").read_text()
    quiet = text[: text.index("[[input]]")] + text[text.index("[[site]]") :]
    (nest / "quiet.toml").write_text(quiet)
    field = load_scenario(nest / "quiet.toml").fluctuations()
    page = render(field)
    assert "Nothing fluctuates" in page and data_of(page)["curves"] is None
    assert "made in Python" in page


def test_packed_columns_keep_what_they_promise():
    values = np.array([1.23456789, -3e20, 0.0, np.nan, 7.0])
    assert numbers(values)["type"] == "f4"
    np.testing.assert_allclose(unpacked(numbers(values)), values, rtol=SINGLE)
    tiny = np.array([1e-60, 2.0])
    assert numbers(tiny)["type"] == "f8" and unpacked(numbers(tiny)).tolist() == tiny.tolist()
    assert unpacked(whole(np.array([1, 2**40]))).tolist() == [1, 2**40]
    spread = np.array([3.0, 3e-15, 0.0, 3e-20, np.nan])
    packed = logarithms(spread)
    steps = unpacked(packed)
    assert (steps[2:] == NOTHING).all()
    np.testing.assert_allclose(10 ** (packed["top"] + steps[:2] / packed["per_decade"]), spread[:2], rtol=LOGARITHMIC)


def test_large_cells_keep_curves_for_fewer_sites():
    assert sites_with_curves(2) == MOST_CURVES
    assert 2 <= sites_with_curves(45_000) < sites_with_curves(8_000) < MOST_CURVES


def test_eight_thousand_points_stay_below_six_megabytes(tmp_path):
    from morphology.growth import random_arbor
    from morphology.swc import to_text

    (tmp_path / "wren.swc").write_text(to_text(random_arbor(3, 8000)))
    sites = "".join(f'[[site]]\nname = "s{k}"\nat = {{ swc_id = {1000 * k + 1001} }}\n' for k in range(3))
    text = (
        '[cell]\nmorphology = "wren.swc"\n[membrane]\naxial_resistivity_ohm_cm = 120.0\ncapacitance_uF_cm2 = 1.0\n'
        "resistance_ohm_cm2 = 14000.0\nrest_mV = -70.0\n[threshold]\nlevel_mV = -50.0\n"
    )
    for k in range(3):
        text += (
            f'[[input]]\nname = "input {k}"\nwhere = {{ path_um = [{30 * k}, inf] }}\ndensity_per_um2 = 0.01\n'
            f"rate_Hz = 1.0\ncurrent_pA = 2.0\nkernel = {{ decay_ms = {2 + k} }}\n"
        )
    (tmp_path / "large.toml").write_text(text + sites)
    result = CliRunner().invoke(
        app, ["report", str(tmp_path / "large.toml"), "--out", str(tmp_path / "R.html"), "--tolerance", "1e-3"]
    )
    assert result.exit_code == 0, result.output
    assert 1_000_000 < (tmp_path / "R.html").stat().st_size < 6_000_000


def test_from_python_and_never_over_a_file_unasked(nest, tmp_path):
    model = load_scenario(nest / "wren.toml")
    target = write_report(model, tmp_path / "R.html", tolerance=1e-6)
    assert target == (tmp_path / "R.html").resolve() and "made in Python" in target.read_text(encoding="utf-8")
    with pytest.raises(Exception, match="exists already"):
        write_report(model, target)
    assert write_report(model, target, force=True, tolerance=1e-6) == target


@pytest.mark.parametrize(
    ("options", "words"),
    [
        (["--out", "R.png"], ["ends in .png", "expected .html"]),
        (["--out", "nowhere/R.html"], ["there is no folder"]),
        (["--out", "old.html"], ["exists already", "--force"]),
    ],
)
def test_mistakes_are_told(nest, monkeypatch, options, words):
    monkeypatch.chdir(nest)
    (nest / "old.html").write_text("mine")
    result = CliRunner().invoke(app, ["report", "wren.toml", *options])
    assert result.exit_code == 2
    for word in words:
        assert word in result.output
    assert (nest / "old.html").read_text() == "mine"


def test_the_command_writes_what_the_call_renders(nest, made, monkeypatch):
    monkeypatch.chdir(nest)
    result = CliRunner().invoke(app, ["report", "wren.toml", "--out", "wren.html", "--force"])
    assert result.exit_code == 0
    assert (nest / "wren.html").read_text(encoding="utf-8") == made.text


def test_findings_and_measures_are_listed(nest):
    from cable.desk.scenario import read_scenario

    text = (nest / "wren.swc").read_text()
    (nest / "odd.swc").write_text(text.replace("43 4 250 -20 0 0.4 18", "43 4 250 -20 0 0.4 1"))
    (nest / "odd.toml").write_text((nest / "wren.toml").read_text().replace("wren.swc", "odd.swc"))
    scenario = read_scenario(nest / "odd.toml")
    page = render(scenario.model.fluctuations(1e-6), scenario)
    assert scenario.findings
    for finding in scenario.findings:
        assert finding.remedy.split("`")[0][:30] in page
    assert "length of cable" in page and f"{len(scenario.model.tree):,}" in page
