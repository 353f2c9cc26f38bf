"""The report in a real browser: it shows what the table says, to the eye, to the hand, to a screen reader."""

from __future__ import annotations

import csv
import io
import re
import shutil
import subprocess
from types import SimpleNamespace

import numpy as np
import pytest
from PIL import Image
from report_cells import contrast

from cable.desk.figures.style import colour_map
from cable.desk.site_table import points_table
from cable.desk.tables import write_csv
from tolerances import FIVE_DIGITS, FOUR_DIGITS, SINGLE

MARGIN_PX = 30  # beside the cell


@pytest.fixture
def page(chromium, made):
    """The report, opened; whatever goes wrong or leaves the page is kept."""
    opened = chromium.new_page(viewport={"width": 1280, "height": 1000}, color_scheme="light", accept_downloads=True)
    wrong, asked = [], []
    opened.on("console", lambda message: wrong.append(message.text))
    opened.on("pageerror", lambda error: wrong.append(str(error)))
    opened.on("dialog", lambda dialog: wrong.append(dialog.message))
    opened.on("request", lambda request: asked.append(request.url))
    opened.goto(made.path.as_uri())
    yield opened
    opened.close()
    assert wrong == [] and asked == [made.path.as_uri()]


def place(page, made, row: int) -> tuple[float, float]:
    """Where a point on the x axis of the cell is drawn: the cell fills the width between the margins."""
    tree = made.scenario.model.tree
    box = page.locator("#overlay").bounding_box()
    ends = tree.xyz_um[:, 0] + tree.radius_um
    low, high = -10.0, ends.max()
    scale = (box["width"] - 2 * MARGIN_PX) / (high - low)
    x = box["x"] + MARGIN_PX + scale * (tree.xyz_um[row, 0] - low)
    down = 10.0, tree.xyz_um[:, 1].min() - 0.4  # upper and lower end of the drawing
    middle = box["y"] + (box["height"] + (MARGIN_PX + 14) - (MARGIN_PX + 20)) / 2
    return x, middle + scale * ((down[0] + down[1]) / 2 - tree.xyz_um[row, 1])


def number(text: str) -> float:
    """A number as the page writes it."""
    raised = str.maketrans("⁻⁰¹²³⁴⁵⁶⁷⁸⁹", "-0123456789")
    head, _, power = text.replace("−", "-").partition(" × 10")
    return float(head) * 10.0 ** float(power.translate(raised) or 0)


def reading(page, column: int = 0) -> dict[str, str]:
    rows = page.locator("#reading tbody tr").all()
    return {r.locator("th").inner_text(): r.locator("td").all_inner_texts()[column] for r in rows}


def test_it_opens_and_says_what_matters(page, made):
    soma = made.field.at("soma")
    assert f"−{-soma.mean_mV:.2f} ± {soma.sd_mV:.2f} mV" in page.locator(".headline").inner_text()
    assert page.title().startswith("Wren </script>")
    assert page.evaluate("document.documentElement.scrollWidth <= innerWidth")


@pytest.mark.parametrize("row", [3, 20, 36])
def test_hovering_reads_the_point_under_the_pointer(page, made, row):
    page.mouse.move(*place(page, made, row))
    hint = page.locator("#hint")
    hint.wait_for(state="visible")
    text = hint.inner_text()
    assert f"SWC id {made.scenario.model.tree.ids[row]}," in text
    mean, sd = map(number, re.search(r"(\S+) ± (\S+) mV", text).groups())
    assert (mean, sd) == (
        pytest.approx(made.field.mean_mV[row], rel=FOUR_DIGITS),
        pytest.approx(made.field.sd_mV[row], rel=FOUR_DIGITS),
    )
    page.mouse.move(5, 5)
    hint.wait_for(state="hidden")


@pytest.mark.parametrize("key", ["sd_mV", "mean_mV", "input_resistance_MOhm", "correlation"])
def test_colours_on_the_map_are_the_values_of_the_table(page, made, key):
    page.select_option("#second", label="soma")
    page.select_option("#quantity", key)
    page.mouse.move(5, 5)
    model = made.scenario.model
    values = model.correlation_map("soma").correlation if key == "correlation" else getattr(made.field, key)
    pixels = np.asarray(Image.open(io.BytesIO(page.screenshot())).convert("RGB")).astype(float)
    table = 255 * colour_map()(np.linspace(0, 1, 64))[:, :3]
    for row in (5, 15, 27, 33):
        x, y = place(page, made, row)
        found = pixels[round(y) - 3 : round(y) + 4, round(x)]
        distance = np.linalg.norm(table - found[:, None], axis=2)
        assert distance.min() < 6
        share = np.unravel_index(distance.argmin(), distance.shape)[1] / 63
        assert share == pytest.approx((values[row] - values.min()) / np.ptp(values), abs=0.03)
    ticks = page.locator("#ticks span").all_inner_texts()
    assert (number(ticks[0]), number(ticks[-1])) == pytest.approx((values.min(), values.max()), rel=0.01)


def test_clicking_picks_and_the_second_site_makes_a_pair(page, made):
    row, field = 30, made.field
    page.mouse.click(*place(page, made, row))
    shown = reading(page)
    assert shown["SWC id"] == str(made.scenario.model.tree.ids[row])
    assert number(shown["SD, mV"]) == pytest.approx(field.sd_mV[row], rel=FIVE_DIGITS)
    assert number(shown["correlation time, ms"]) == pytest.approx(field.correlation_time_ms[row], rel=FIVE_DIGITS)
    share = 100 * field.variance_by_input_mV2["inhibition"][row] / field.variance_mV2[row]
    assert number(shown["inhibition, %"]) == pytest.approx(share, rel=FIVE_DIGITS)
    page.select_option("#second", label="far & <wide>")
    one = made.scenario.model.correlation_map("far & <wide>").correlation[row]
    said = page.locator("#together").inner_text()
    assert number(re.search(r"is ([\d.]+);", said)[1]) == pytest.approx(one, rel=FOUR_DIGITS)
    assert number(reading(page, 1)["SD, mV"]) == pytest.approx(field.at("far & <wide>").sd_mV, rel=FIVE_DIGITS)
    assert "kept for named sites" in page.locator("#lags").inner_text()
    page.select_option("#first", label="soma")
    assert page.locator("#lags path.first").count() == 1 and page.locator("#coherence path.first").count() == 1
    zero = made.scenario.model.correlation_map("soma").correlation_at["far & <wide>"]
    spoken = page.locator("#lags svg").get_attribute("aria-label")
    assert number(re.search(r"; ([\d.]+) at lag 0", spoken)[1]) == pytest.approx(zero, rel=FOUR_DIGITS)


def test_shift_click_chooses_the_nearest_site_as_the_second(page, made):
    tip = made.scenario.model.tree.ids.tolist().index(42)
    x, y = place(page, made, tip)
    page.keyboard.down("Shift")
    page.mouse.click(x - 4, y + 3)
    page.keyboard.up("Shift")
    assert page.locator("#second option:checked").inner_text() == "far & <wide>"


def test_the_profile_goes_from_the_soma_to_the_place(page, made):
    page.select_option("#first", label="=between")
    spoken = page.locator("#profile svg").get_attribute("aria-label")
    ends = [number(v) for v in re.findall(r"(−\S+) mV", spoken)]
    field = made.field
    assert ends[:2] == pytest.approx([field.at("soma").mean_mV, field.at("=between").mean_mV], rel=FOUR_DIGITS)
    assert number(re.search(r"mV at (\S+) µm", spoken)[1]) == pytest.approx(333, rel=FOUR_DIGITS)


def test_the_table_sorts_filters_and_picks(page, made):
    page.select_option("#which", "points")
    assert "of 49" in page.locator("#shown").inner_text()
    heading = page.get_by_role("button", name=re.compile("^SD"))
    heading.click()
    column = 5
    sd = [number(v) for v in page.locator(f"#grid tbody tr td:nth-child({column + 1})").all_inner_texts()]
    assert sd == sorted(sd) and sd[0] == pytest.approx(made.field.sd_mV.min(), rel=FIVE_DIGITS)
    page.get_by_role("button", name=re.compile("^SD")).click()
    sd = [number(v) for v in page.locator(f"#grid tbody tr td:nth-child({column + 1})").all_inner_texts()]
    assert sd == sorted(sd, reverse=True) and sd[0] == pytest.approx(made.field.sd_mV.max(), rel=FIVE_DIGITS)
    assert page.locator('#grid th[aria-sort="descending"]').inner_text().startswith("SD")
    page.select_option("#kind", "apical")
    assert "of 6" in page.locator("#shown").inner_text()
    page.select_option("#kind", "")
    page.fill("#find", "FAR &")
    assert page.locator("#grid tbody tr").count() == 1
    page.fill("#find", "46")
    page.get_by_role("button", name="Show SWC id 46 as the first place").click()
    assert reading(page)["SWC id"] == "46"
    page.fill("#find", "nowhere")
    assert "no row passes" in page.locator("#shown").inner_text()


def test_the_download_is_the_table_of_the_command(page, made):
    page.select_option("#which", "points")
    with page.expect_download() as waiting:
        page.click("#download")
    raw = waiting.value.path().read_bytes().decode("utf-8")
    expected = io.StringIO()
    write_csv(points_table(made.field), expected)
    ours, theirs = ([*csv.DictReader(io.StringIO(t, newline=""))] for t in (raw, expected.getvalue()))
    assert raw.count("\r\n") == len(ours) + 1 == 50
    assert set(theirs[0]) < set(ours[0])
    for a, b in zip(ours, theirs, strict=True):
        assert (a["site"], a["kind"], a["swc_id"]) == (b["site"], b["kind"], b["swc_id"])
        for key in set(theirs[0]) - {"site", "kind"}:
            assert float(a[key]) == pytest.approx(float(b[key]), rel=2 * SINGLE), key
    assert "'=between" in [row["site"] for row in ours]


def test_the_keyboard_walks_along_the_tree(page, made):
    overlay = page.locator("#overlay")
    overlay.focus()
    page.keyboard.press("Home")
    assert "SWC id 1," in page.locator("#spoken").inner_text()
    for _ in range(17):
        page.keyboard.press("ArrowDown")
    assert "SWC id 18," in page.locator("#spoken").inner_text()
    page.keyboard.press("ArrowDown")
    beside = page.locator("#spoken").inner_text()
    page.keyboard.press("ArrowRight")
    other = page.locator("#spoken").inner_text()
    assert {re.search(r"SWC id (\d+)", t)[1] for t in (beside, other)} == {"19", "43"}
    page.keyboard.press("Enter")
    assert reading(page)["SWC id"] == re.search(r"SWC id (\d+)", other)[1]
    page.keyboard.press("ArrowUp")
    assert "SWC id 18," in page.locator("#spoken").inner_text()
    page.keyboard.press("Escape")
    assert page.locator("#hint").is_hidden()


def test_everything_can_be_reached_with_the_tab_key(page):
    seen = set()
    for _ in range(60):
        page.keyboard.press("Tab")
        seen.add(page.evaluate("document.activeElement.id"))
    assert {"theme", "quantity", "view", "first", "second", "overlay", "closer", "which", "find", "download"} <= seen


def test_zooming_and_moving_keep_what_is_under_the_pointer(page, made):
    x, y = place(page, made, 25)
    page.mouse.move(x, y)
    page.keyboard.down("Control")
    page.mouse.wheel(0, -300)
    page.keyboard.up("Control")
    page.mouse.move(x + 1, y)
    wanted = f"SWC id {made.scenario.model.tree.ids[25]},"
    page.wait_for_function("w => document.getElementById('hint').textContent.includes(w)", arg=wanted)
    page.mouse.down()
    page.mouse.move(x - 60, y + 20, steps=4)
    page.mouse.up()
    page.mouse.move(x - 61, y + 20)
    page.wait_for_function("w => document.getElementById('hint').textContent.includes(w)", arg=wanted)
    page.click("#fit")
    page.mouse.move(*place(page, made, 10))
    wanted = f"SWC id {made.scenario.model.tree.ids[10]},"
    page.wait_for_function("w => document.getElementById('hint').textContent.includes(w)", arg=wanted)


def test_other_planes_show_the_cell_from_there(page):
    before = page.locator("#map").screenshot()
    page.select_option("#view", "yz")
    assert page.locator("#map").screenshot() != before
    page.select_option("#view", "xy")
    assert page.locator("#map").screenshot() == before


def test_hostile_names_stay_text(page):
    assert page.locator("img, iframe").count() == 0 and page.locator("script").count() == 2
    assert page.title() != "gone"
    assert "<img src=x onerror=document.title='gone'>" in page.locator("#grid thead").inner_text()


@pytest.mark.parametrize("scheme", ["light", "dark"])
def test_no_accessibility_rule_is_broken_and_text_stands_out(page, scheme):
    axe = pytest.importorskip("axe_core_python.sync_playwright", reason="no axe: accessibility is not checked")
    page.emulate_media(color_scheme=scheme)
    page.select_option("#which", "points")
    found = axe.Axe().run(page)
    assert len(found["passes"]) > 20
    assert [(v["id"], [n["html"] for n in v["nodes"]]) for v in found["violations"]] == []
    colours = page.evaluate(
        "() => { const c = (e, p) => getComputedStyle(document.querySelector(e))[p];"
        "return [c('html', 'backgroundColor'), c('h1', 'color'), c('.kicker', 'color'), c('svg text', 'fill')]; }"
    )
    ground, *inks = [[int(v) for v in re.findall(r"\d+", one)[:3]] for one in colours]
    assert (sum(ground) > 600) == (scheme == "light")
    assert min(contrast(ground, ink) for ink in inks) > 4.5


def test_dark_on_demand_and_light_on_paper(page, made):
    def seen() -> tuple[bool, bool]:
        """Whether the map's ground is bright, and whether the darkest colour, which needs that, is on it."""
        picture = np.asarray(Image.open(io.BytesIO(page.locator("#map").screenshot())).convert("RGB")).astype(float)
        darkest = 255 * np.array(colour_map()(0.0)[:3])
        return picture[40, 6].sum() > 700, np.linalg.norm(picture - darkest, axis=2).min() < 12

    assert seen() == (True, True)
    page.click("#theme")
    assert seen() == (False, False)
    page.emulate_media(media="print")
    assert seen() == (True, True)
    assert page.locator("#lags svg").get_attribute("viewBox").startswith("0 0 400 ")  # letters are larger on paper
    assert page.locator("#theme").is_hidden() and page.locator("#grid").is_visible()
    page.emulate_media(media="screen")


def test_the_printed_page_shows_the_map(page, made, tmp_path):
    painter = shutil.which("pdftoppm")
    if painter is None:
        pytest.skip("no pdftoppm (poppler): the printed page is not looked at")
    page.emulate_media(color_scheme="dark")
    page.evaluate("document.querySelector('.bar').style.visibility = 'hidden'")  # only the map has colours then
    page.pdf(path=tmp_path / "page.pdf", format="A4", print_background=True)
    subprocess.run([painter, "-r", "90", "-l", "1", "-png", tmp_path / "page.pdf", tmp_path / "page"], check=True)
    (picture,) = tmp_path.glob("page*.png")
    pixels = np.asarray(Image.open(picture).convert("RGB")).astype(float)
    assert pixels[3, 3].sum() > 750  # white paper
    soma = (made.field.sd_mV[0] - made.field.sd_mV.min()) / np.ptp(made.field.sd_mV)
    wanted = 255 * np.array(colour_map()(soma)[:3])
    assert (np.linalg.norm(pixels - wanted, axis=2) < 12).sum() > 40  # the soma's disc


def test_on_a_telephone_nothing_sticks_out(chromium, made):
    phone = chromium.new_page(viewport={"width": 390, "height": 844})
    phone.goto(made.path.as_uri())
    assert phone.evaluate("document.documentElement.scrollWidth <= innerWidth")
    assert phone.locator("#map").bounding_box()["width"] > 340
    phone.close()


def test_without_javascript_the_numbers_of_the_sites_are_there(chromium, made):
    bare = chromium.new_context(java_script_enabled=False).new_page()
    bare.goto(made.path.as_uri())
    text = bare.locator("main").inner_text()
    assert f"{made.field.at('far & <wide>').sd_mV:.3f}" in text and "JavaScript" in text
    assert bare.locator("#cell").is_hidden()
    bare.context.close()


@pytest.fixture
def odd_cells(tmp_path) -> SimpleNamespace:
    """Cells at the edge: one point, two points, and a root that is not the soma."""
    texts = {
        "one": "1 1 0 0 0 8 -1\n",
        "two": "1 1 0 0 0 8 -1\n2 3 100 0 0 1 1\n",
        "turned": "1 3 -90 5 0 1 -1\n2 3 -40 0 0 1 1\n3 1 0 0 0 8 2\n4 4 60 0 0 1 3\n",
    }
    head = (
        "[membrane]\naxial_resistivity_ohm_cm = 120.0\ncapacitance_uF_cm2 = 1.0\n"
        "resistance_ohm_cm2 = 14000.0\nrest_mV = -70.0\n"
    )
    drive = (
        '[[input]]\nname = "e"\nwhere = {}\ndensity_per_um2 = 0.02\nrate_Hz = 2.0\n'
        "conductance_nS = 0.3\nreversal_mV = 0.0\nkernel = { decay_ms = 3 }\n"
    )
    for name, text in texts.items():
        (tmp_path / f"{name}.swc").write_text(text)
        (tmp_path / f"{name}.toml").write_text(f'[cell]\nmorphology = "{name}.swc"\n{head}{drive}')
    return SimpleNamespace(folder=tmp_path, names=tuple(texts))


def test_cells_of_few_points_are_shown(chromium, odd_cells):
    from cable import load_scenario, write_report

    for name in odd_cells.names:
        path = write_report(load_scenario(odd_cells.folder / f"{name}.toml"), odd_cells.folder / f"{name}.html")
        page, wrong = chromium.new_page(), []
        page.on("pageerror", lambda error, wrong=wrong: wrong.append(str(error)))
        page.goto(path.as_uri())
        page.select_option("#which", "points")
        page.locator("#grid tbody button").last.click()
        assert wrong == [] and page.locator("#reading tbody tr").count() > 4
        if name == "turned":  # from the soma, though the way leads over its parent
            assert reading(page)["from the soma, µm"] in ("60.00", "60")
        page.close()
