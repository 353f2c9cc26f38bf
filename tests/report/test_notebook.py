"""In a notebook and from Python: rich display, numpy and pandas, figures to add to."""

from __future__ import annotations

import subprocess
import sys
from html.parser import HTMLParser
from xml.etree import ElementTree

import matplotlib as mpl
import numpy as np
import pandas as pd
import pytest
from matplotlib.figure import Figure

from cable import CableModel, Membrane, figures, load_scenario, tables
from cable.desk.messages import DeskError
from cable.desk.site_table import points_table
from cable.noise.cards import MAP_PIECES, html_table, small_map, text
from morphology.growth import neuron, random_arbor
from tolerances import FOUR_DIGITS

MEMBRANE = Membrane(axial_resistivity_ohm_cm=150.0, capacitance_uF_cm2=1.0, resistance_ohm_cm2=15000.0, rest_mV=-70.0)


class Words(HTMLParser):
    """The elements of a piece of HTML and the words in its cells."""

    def __init__(self, html: str) -> None:
        super().__init__()
        self.elements, self.words = [], []
        self.feed(html)

    def handle_starttag(self, tag, attrs):
        self.elements.append((tag, dict(attrs)))

    def handle_data(self, data):
        self.words.append(data)


@pytest.fixture(scope="module")
def model(nest):
    return load_scenario(nest / "wren.toml")


def test_the_cards_tell_cell_inputs_and_sites(model, made):
    card = Words(model._repr_html_())
    said = " ".join(card.words)
    for word in ("wren.swc", f"{len(model.tree)} points", "120 Ω cm", "0.5 nS", "−75", "far & <wide>", "−50 mV"):
        assert word in said
    answer = Words(made.field._repr_html_())
    for site in made.field.sites:
        at = answer.words.index(site.name)
        path, mean, sd = (float(v.replace("−", "-")) for v in answer.words[at + 1 : at + 4])
        assert (path, mean, sd) == pytest.approx((site.path_um, site.mean_mV, site.sd_mV), rel=FOUR_DIGITS)
    assert any("frequencies" in word for word in answer.words)


def test_names_stay_text_in_every_card(model, made):
    for one in (model, made.field, tables.sites(made.field), tables.points(made.field)):
        html = one._repr_html_()
        assert {tag for tag, _ in Words(html).elements} <= set(
            "div strong br sub table caption thead tbody tr th td svg path".split()
        )
        assert not any(key.startswith("on") for _, attrs in Words(html).elements for key in attrs)
        assert "&lt;img src=x onerror=" in html
    assert text('<&"\u202e') == "&lt;&amp;&quot;\\u202e"
    assert len(text("x" * 500)) == 60


def test_the_small_map_has_the_colours_of_the_sd(made):
    svg = small_map(made.field).partition("<div>")[0]
    root = ElementTree.fromstring(svg)
    strokes = [path.get("stroke") for path in root]
    assert strokes[0] == "#440154" and len(strokes) > 4  # viridis begins with this purple (matplotlib)
    count = sum(path.get("d").count("M") for path in root)
    assert count == len(made.scenario.model.tree) - 1
    tree, sd = made.scenario.model.tree, made.field.sd_mV
    flat = tree.xyz_um[:, :2] * [1, -1]
    place = 5 + (flat - flat.min(axis=0)) / np.ptp(tree.xyz_um, axis=0).max() * 230
    middle = 0.5 * (sd[1:] + sd[tree.parent[1:]])
    for row, mine, other in ((np.argmin(middle) + 1, 0, -1), (np.argmax(middle) + 1, -1, 0)):
        end = f"L{place[row, 0]:.1f} {place[row, 1]:.1f}"
        assert end in root[mine].get("d") and end not in root[other].get("d")


def test_large_cells_make_small_maps():
    tree = random_arbor(3, 6000)
    field = CableModel(tree, MEMBRANE).fluctuations()
    assert small_map(field) == ""  # nothing fluctuates
    from cable.noise.cards import _thinned

    rows, above = _thinned(tree)
    assert len(rows) < 3 * MAP_PIECES and (above < rows).all()
    assert set(above.tolist()) <= {0, *rows.tolist()}  # lines hang together
    for row, up in list(zip(rows.tolist(), above.tolist(), strict=True))[::50]:
        assert up in tree.path_to(row)
    tips = np.setdiff1d(np.arange(len(tree)), tree.parent)
    assert set(tips.tolist()) <= set(rows.tolist())


def test_numpy_and_pandas_hold_the_table_of_the_command(made):
    table = points_table(made.field)
    array, frame = made.field.to_numpy(), made.field.to_pandas()
    points = len(made.scenario.model.tree)
    assert isinstance(frame, pd.DataFrame) and list(frame.columns) == list(array.dtype.names)
    assert set(table.columns) - {"site"} == set(frame.columns) and len(frame) == len(array) == points
    for key in frame.columns:
        assert (frame[key].to_numpy() == np.asarray(table.columns[key])[:points]).all(), key
        assert (array[key] == np.asarray(table.columns[key])[:points]).all(), key
    sites = tables.sites(made.field)
    assert sites.to_pandas()["sd_mV"].tolist() == sites.to_numpy()["sd_mV"].tolist()


def test_without_pandas_the_way_without_it_is_named(made, monkeypatch):
    monkeypatch.setitem(sys.modules, "pandas", None)
    with pytest.raises(ImportError, match=r"to_numpy\(\)"):
        made.field.to_pandas()
    assert len(made.field.to_numpy())


def test_long_tables_show_their_ends():
    table = tables.Table({"a": np.arange(100), "b": np.linspace(0, 1, 100)})
    words = Words(table._repr_html_()).words
    assert "100 rows, 2 columns" in words and "99" in words and "…" in words and "50" not in words
    assert "<th" in html_table(["x"], [["1"]])


def test_all_tables_of_the_public_page_are_made(model, made):
    lag = np.linspace(-20, 20, 5)
    pair = model.pair("soma", "far & <wide>", lag, np.array([1.0]))
    assert tables.pair(pair).to_pandas()["lag_ms"].tolist() == lag.tolist()
    assert tables.along(made.field, "=between").columns["from_soma_um"][-1] == pytest.approx(333)
    assert len(tables.spectrum(model.spectrum("soma"))) == 61
    assert tables.sources(model.sources("soma")).to_pandas()["variance_share"].sum() == pytest.approx(1)
    assert len(tables.modes(model, model.modes(2))) == len(model.tree)
    with pytest.raises(KeyError, match="the sites are"):
        tables.along(made.field, "nowhere")


def test_figures_are_matplotlib_figures_to_add_to(model, made, tmp_path, monkeypatch):
    monkeypatch.setitem(mpl.rcParams, "font.size", 21.0)
    before = dict(mpl.rcParams)
    lag = np.linspace(-20, 20, 41)
    drawn = {
        "map": figures.draw_map(made.field, ["sd", "share", "correlation"], inputs=["inhibition"], with_site="soma"),
        "branches": figures.draw_branches(made.field),
        "along": figures.draw_along(made.field, "far & <wide>", "mean"),
        "spectrum": figures.draw_spectrum(model.spectrum("soma"), temperature_C=36.0),
        "pair": figures.draw_pair(model.pair("soma", "=between", lag, np.geomspace(0.1, 100, 9))),
        "matrix": figures.draw_correlations(model),
        "sources": figures.draw_sources(model.sources("soma")),
        "excursions": figures.draw_excursions(model.excursions(("soma",))),
        "modes": figures.draw_modes(model, model.modes(3), most=2),
    }
    for one in drawn.values():
        assert isinstance(one, Figure) and one.axes
        assert max(text.get_fontsize() for axes in one.axes for text in [*axes.texts, axes.xaxis.label]) < 9
    assert len(drawn["map"].axes) == 6 and len(drawn["modes"].axes) == 4  # a panel and its bar each
    assert "Wren" in drawn["map"].texts[0].get_text() or any("Wren" in t.get_text() for t in drawn["map"].texts)
    axes = drawn["map"].axes[0]
    (line,) = axes.plot([0, 100], [20, 20], color="black")
    assert line in axes.lines
    drawn["map"].savefig(tmp_path / "map.pdf")
    assert (tmp_path / "map.pdf").read_bytes().startswith(b"%PDF")
    assert drawn["map"]._repr_png_().startswith(b"\x89PNG")
    assert dict(mpl.rcParams) == before


@pytest.mark.parametrize(
    ("arguments", "words"),
    [
        ({"quantity": "deviation"}, "did you mean|known are|expected"),
        ({"quantity": "correlation"}, "needs with_site"),
        ({"quantity": "lag", "with_site": "somma"}, 'did you mean "soma"'),
        ({"quantity": "share"}, "needs --input NAME|needs"),
        ({"plane": "zz"}, "expected xy, xz, yz or flat"),
    ],
)
def test_mistakes_in_figures_are_told(made, arguments, words):
    with pytest.raises(DeskError, match=words):
        figures.draw_map(made.field, **arguments)


def test_the_public_modules_load_nothing_heavy():
    heavy = "matplotlib", "sympy", "networkx", "pandas", "jinja2", "pydantic"
    code = f"import sys, cable.figures, cable.tables; print([m for m in {heavy!r} if m in sys.modules])"
    run = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    assert run.stdout.strip() == "[]"


def test_a_model_made_in_python_has_a_card():
    html = CableModel(neuron(2), MEMBRANE)._repr_html_()
    assert "no input" in html and "soma" in html
