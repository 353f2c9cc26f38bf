"""Maps: the colour at a place is its value, lengths are to scale, and files are what they claim."""

from __future__ import annotations

import re

import matplotlib as mpl
import numpy as np
import pytest
from matplotlib.colors import to_rgb
from PIL import Image

from cable import load_scenario
from cable.desk.figures.map import THINNEST_PT, draw_map, layout, round_length
from cable.desk.figures.marks import site_marks
from cable.desk.figures.projection import bounds, cut, flat_xy, flattest_plane
from cable.desk.figures.style import PT_PER_MM, colour_map, save, styled
from cable.desk.files import output
from cable.desk.quantities import quantities
from morphology.growth import ball_and_stick, neuron, sphere


def value_of_colour(rgb, low: float, high: float) -> float:
    """The value whose colour comes nearest to a pixel of `rgb` (..., 3): a thin line has one pure pixel."""
    table = colour_map()(np.linspace(0, 1, 1001))[:, :3]
    distance = np.linalg.norm(table - np.asarray(rgb).reshape(-1, 1, 3) / 255, axis=2)
    assert distance.min() < 0.02, f"{rgb} holds no colour of the map"
    return low + (high - low) * float(np.unravel_index(np.argmin(distance), distance.shape)[1]) / 1000


@pytest.mark.parametrize("word", ["sd", "mean", "input-resistance"])
def test_pixels_show_the_values_of_the_table(folder, word):
    model = load_scenario(folder / "stick.toml")
    field = model.fluctuations(1e-6)
    (quantity,) = quantities(word, [], [])
    values = quantity.values(field)
    with styled():
        drawn = draw_map(field, [quantity])
        save(drawn, output(folder / "M.png", (".png",)), "t")
        axes = drawn.axes[0]
        height = drawn.get_size_inches()[1] * drawn.dpi
        places = axes.transData.transform(model.tree.xyz_um[:, :2])
    pixels = np.asarray(Image.open(folder / "M.png").convert("RGB"))
    for row in (0, 8, 14, 30, 37):
        x, y = places[row]
        column = pixels[round(height - y) - 2 : round(height - y) + 3, round(x)]
        seen = value_of_colour(column, values.min(), values.max())
        assert seen == pytest.approx(values[row], abs=0.02 * np.ptp(values))


def test_lengths_and_diameters_are_to_scale(folder):
    model = load_scenario(folder / "stick.toml")
    field = model.fluctuations(1e-6)
    with styled():
        drawn = draw_map(field, quantities("sd", [], []))
        axes = drawn.axes[0]
        a, b = axes.transData.transform([(0, 0), (100, 0)])
        c = axes.transData.transform((0, 100))
    px_per_um = (b - a)[0] / 100
    assert (c - a)[1] / 100 == pytest.approx(px_per_um, rel=1e-6)
    (cable,) = axes.collections
    widths_um = np.asarray(cable.get_linewidths()) / 72 * drawn.dpi / px_per_um
    assert widths_um.max() == pytest.approx(2 * 1.8, rel=0.01) and widths_um.min() == pytest.approx(2 * 1.2, rel=0.01)
    assert np.all(np.diff(widths_um) < 0)
    bar = next(line for line in axes.lines if len(line.get_xdata()) == 2 and line.get_linewidth() > 1)
    label = next(t.get_text() for t in axes.texts if "µm" in t.get_text())
    assert label == f"{np.ptp(bar.get_xdata()):g} µm"
    disc = axes.patches[0]
    assert disc.radius == pytest.approx(10.0)


def test_thin_neurites_stay_visible_and_the_caption_says_so():
    low, high = bounds(neuron(1), "xy")
    plan = layout(high - low, 2)
    thinnest_um = THINNEST_PT / PT_PER_MM / plan.mm_per_um
    assert 0.2 < thinnest_um < 5


@pytest.mark.parametrize(
    ("extent", "panels", "columns"), [((100.0, 900.0), 2, 2), ((1000.0, 20.0), 2, 1), ((100.0, 100.0), 1, 1)]
)
def test_layout_fits_the_page_and_fills_it(extent, panels, columns):
    plan = layout(np.array(extent), panels, captions=2)
    assert plan.columns == columns
    assert plan.page_mm[0] <= 170 and plan.page_mm[1] <= 235
    assert extent[0] * plan.mm_per_um <= plan.panel_mm[0] and extent[1] * plan.mm_per_um <= plan.panel_mm[1]
    used = max(extent[0] * plan.mm_per_um / plan.page_mm[0], extent[1] * plan.mm_per_um / plan.page_mm[1])
    assert used > 0.6


def test_the_flattest_plane_is_chosen():
    flat = ball_and_stick(8, 100, 1)
    assert flattest_plane(flat) == "xy"
    points = neuron(2)
    turned = type(points)(points.ids, points.kinds, points.xyz_um[:, [2, 1, 0]], points.radius_um, points.parent)
    assert (flattest_plane(points), flattest_plane(turned)) == ("xy", "yz")
    assert flattest_plane(sphere(5)) == "xy"


def test_pieces_cover_the_cable_with_values_between_their_ends():
    tree = neuron(3)
    values = np.linspace(1, 2, len(tree))
    pieces = cut(tree, "xy", values)
    flat = tree.xyz_um[:, :2]
    shape = tree.shape
    across = (shape.far - shape.near) * np.linalg.norm(flat - flat[tree.parent], axis=1)
    drawn = np.linalg.norm(pieces.ends_um[:, 1] - pieces.ends_um[:, 0], axis=1)
    assert drawn.sum() == pytest.approx(across[1:].sum())
    assert 1 <= pieces.values.min() and pieces.values.max() <= 2


def test_colour_runs_along_a_long_edge():
    pieces = cut(ball_and_stick(10, 600, 2, points=2), "xy", np.array([0.0, 0.0, 1.0]))
    along = (pieces.ends_um[:, :, 0].mean(axis=1) - 10) / 600
    assert len(pieces) > 50
    assert pieces.values == pytest.approx(along)


@pytest.mark.parametrize("longest", [0.7, 3.0, 49.0, 50.0, 1234.0])
def test_scale_bars_are_round(longest):
    length = round_length(longest)
    assert longest / 2.5 < length <= longest
    assert f"{length:.0e}"[0] in "125"


def test_sites_are_marked_where_they_are(folder):
    model = load_scenario(folder / "stick.toml")
    marks = site_marks(model, flat_xy(model.tree, "xy"))
    assert [(m.name, round(m.x, 6), m.y) for m in marks] == [
        ("soma", 0, 0),
        ("half way", 310, 0),
        ("between", 333, 0),
    ]


def test_names_do_not_overlap(folder, run):
    text = (folder / "stick.toml").read_text()
    extra = "".join(f'[[site]]\nname = "a rather long name {i}"\nat = {{ swc_id = {20 + i} }}\n' for i in range(4))
    (folder / "many.toml").write_text(text + extra)
    with styled():
        drawn = draw_map(load_scenario(folder / "many.toml").fluctuations(1e-4), quantities("sd", [], []))
        from matplotlib.backends.backend_agg import FigureCanvasAgg

        renderer = FigureCanvasAgg(drawn).get_renderer()
        boxes = [t.get_window_extent(renderer) for t in drawn.axes[0].texts if t.get_text()]
    assert len(boxes) == 8
    assert not any(a.overlaps(b) for i, a in enumerate(boxes) for b in boxes[:i])


def test_files_are_what_they_claim_and_names_stay_text(run, edited):
    path = edited(('name = "half way"', 'name = "<$x$ & co>"'), ('title = "stick"', 'title = "a $title$ </svg>"'))
    for ending in ("png", "svg", "pdf"):
        result = run("map", path, "--out", f"M.{ending}")
        assert (result.exit_code, result.output) == (0, "")
    folder = path.parent
    with Image.open(folder / "M.png") as picture:
        assert picture.size[0] > 900
    svg = (folder / "M.svg").read_text()
    assert "&lt;$x$ &amp; co&gt;" in svg and "SD (mV)" in svg and "a $title$ &lt;/svg&gt;" in svg
    assert svg.count("</svg>") == 1
    pdf = (folder / "M.pdf").read_bytes()
    assert pdf.startswith(b"%PDF") and b"/FontFile2" in pdf and b"/Type3" not in pdf


def test_the_same_map_has_the_same_bytes_and_no_setting_leaks(run, folder):
    before = dict(mpl.rcParams)
    for name in ("A.svg", "B.svg"):
        run("map", "stick.toml", "--out", name)
    assert (folder / "A.svg").read_bytes() == (folder / "B.svg").read_bytes()
    assert dict(mpl.rcParams) == before


def test_large_cells_are_images_inside_vector_files(folder, run):
    from morphology.growth import random_arbor
    from morphology.swc import to_text

    (folder / "stick.swc").write_text(to_text(random_arbor(5, 6000)))
    text = (folder / "stick.toml").read_text()
    (folder / "big.toml").write_text(re.sub(r"\[\[site\]\]\n.*\n.*\n", "", text).replace("[200, inf]", "[20, inf]"))
    assert run("map", "big.toml", "--out", "M.svg", "--quantity", "sd", "--tolerance", "1e-3").exit_code == 0
    assert (folder / "M.svg").stat().st_size < 3_000_000
    assert "<image" in (folder / "M.svg").read_text()


def test_shares_of_named_inputs(run, folder):
    assert run("map", "stick.toml", "--out", "S.svg", "--input", "excitation", "--input", "inhibition").exit_code == 0
    words = " ".join(re.findall(r">([^<>]+)</text>", (folder / "S.svg").read_text()))  # labels are wrapped
    assert "excitation: % of the variance" in words and "inhibition: % of the variance" in words
    field = load_scenario(folder / "stick.toml").fluctuations(1e-6)
    both = quantities("share", ["excitation", "inhibition"], ["excitation", "inhibition"])
    assert sum(q.values(field) for q in both) == pytest.approx(100)


@pytest.mark.parametrize(
    ("options", "words"),
    [
        (["--quantity", "deviation"], ['"deviation"', "mean, sd, variance"]),
        (["--quantity", "share"], ["needs --input", '"excitation" and "inhibition"']),
        (["--quantity", "sd", "--input", "excitation"], ["--quantity share"]),
        (["--plane", "zx"], ['"zx"', "xy, xz, yz or flat"]),
        (["--input", "exitation"], ['no input "exitation"', '"excitation"']),
    ],
)
def test_wrong_quantities_say_what_there_is(run, options, words):
    result = run("map", "stick.toml", "--out", "M.png", *options)
    assert result.exit_code == 2
    for word in words:
        assert word in result.stderr


def test_one_value_everywhere_is_drawn(folder, run):
    from morphology.swc import to_text

    (folder / "stick.swc").write_text(to_text(sphere(10)))
    text = (folder / "stick.toml").read_text()
    inputs = text[: text.index("[[site]]")].replace('{ kinds = ["basal"], path_um = [200, inf] }', "{}")
    (folder / "ball.toml").write_text(inputs.replace("density_per_um =", "density_per_um2 ="))
    assert run("map", "ball.toml", "--out", "M.png").exit_code == 0
    middle = to_rgb(colour_map()(0.5))
    colours = {tuple(c) for c in np.asarray(Image.open(folder / "M.png").convert("RGB")).reshape(-1, 3).tolist()}
    assert any(np.allclose(np.array(c) / 255, middle, atol=0.01) for c in colours)
