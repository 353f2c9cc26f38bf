"""Markup in titles, names and paths is text: no terminal, spreadsheet, browser or typesetter obeys it."""

from __future__ import annotations

import csv
import json
import re
import xml.etree.ElementTree as ET
from pathlib import Path

import numpy as np
import pytest
from typer.testing import CliRunner, Result

from cable.desk.cli import app
from cable.desk.tables import FORMULA_STARTS
from hostile import bases

TITLE = "\x1b[31m<script>alert(1)</script> [bold]t[/bold] $\\frac{1}{0}$ =cmd() \u202e\n%s {0} :smile: \U0001f9e0"
NAMES = (
    "[bold]x[/bold]",
    "[/]",
    "[link=http://x.invalid]y",
    "<script>alert(1)</script>",
    "</title></svg>&amp;",
    "$x^{2$",
    r"\frac{1}{0} %s {0}",
    "=cmd()",
    "@SUM(A1:A9)",
    "+1+1",
    "../../../etc/passwd",
    "`id`; $(id)",
    "日本語 \U0001f9e0 e\u0301",
    "x" * 79,
)
OUTPUTS = (
    "table", "table --out OUT.csv", "table --out OUT.json", "table --out OUT.npz", "map --out OUT.svg",
    "map --quantity share --input INPUT --out OUT.svg", "along SITE --out OUT.svg", "along SITE",
    "spectrum SITE --out OUT.csv", "spectrum SITE --out OUT.svg", "spectrum SITE", "pair soma SITE --out OUT.svg",
    "pair --all", "pair --all --out OUT.svg", "pair --all --out OUT.csv", "sources SITE --out OUT.csv", "sources SITE",
    "sources SITE --out OUT.svg", "point-neuron SITE", "excursions SITE", "record SITE", "record SITE --out OUT.csv",
    "excursions --out OUT.svg", "excursions", "map --branches --out OUT.svg", "modes", "report --out OUT.html",
    "simulate --seconds 6 --dt-ms 0.4 --runs 1 --out OUT.json --figure OUT.svg --traces OUT.csv",
)  # fmt: skip


def toml(text: str) -> str:
    """A TOML string: what JSON escapes, TOML escapes alike."""
    return json.dumps(text, ensure_ascii=False)


@pytest.fixture
def scenario(tmp_path: Path, monkeypatch):
    """Write a scenario with a hostile title, and one name for its first input and its site."""
    monkeypatch.chdir(tmp_path)
    (tmp_path / "cell.swc").write_text(bases.CELLS["forked"])

    def write(name: str, title: str = TITLE) -> Path:
        text = bases.SCENARIO.replace('"small"', toml(title)).replace('"excitation"', toml(name + "i"))
        (tmp_path / "scenario.toml").write_text(text.replace('"half way"', toml(name)), encoding="utf-8")
        return tmp_path

    return write


def run(line: str, name: str) -> Result:
    words = [{"SITE": name, "INPUT": name + "i"}.get(word, word) for word in line.split()]
    result = CliRunner().invoke(app, [words[0], "scenario.toml", *words[1:]])
    if result.exception is not None and not isinstance(result.exception, SystemExit):
        raise result.exception
    return result


def inert_on_a_terminal(text: str) -> None:
    assert all(c.isprintable() or c == "\n" for c in text), repr(text)


@pytest.mark.parametrize("name", NAMES)
def test_names_stand_as_they_are_on_the_terminal_and_in_tables(scenario, name):
    folder = scenario(name)
    result = run("table", name)
    assert result.exit_code == 0
    inert_on_a_terminal(result.stdout + result.stderr)
    flat = re.sub(r"\s+", "", result.stdout)
    assert name[:25].replace(" ", "") in flat and "[bold]t[/bold]" in flat and ":smile:" in flat
    assert run("table --sites --out OUT.csv", name).exit_code == 0
    with open(folder / "OUT.csv", encoding="utf-8", newline="") as stream:
        header, *rows = csv.reader(stream)
    cells = [cell for row in (header, *rows) for cell in row]
    numbers = [cell for cell in cells if re.fullmatch(r"-?[\d.]+(e[-+]\d+)?", cell)]
    assert not [c for c in cells if c.startswith(FORMULA_STARTS) and c not in numbers]
    assert rows[1][header.index("site")].removeprefix("'") == name
    assert f"variance_{name}i_mV2" in header
    assert run("table --sites --out OUT.json", name).exit_code == 0
    read = json.loads((folder / "OUT.json").read_text(encoding="utf-8"))
    assert read["title"] == TITLE and read["rows"][1]["site"] == name
    assert {p.name for p in folder.iterdir()} == {"cell.swc", "scenario.toml", "OUT.csv", "OUT.json"}


@pytest.mark.parametrize("line", OUTPUTS)
def test_every_output_holds_hostile_text_inert(scenario, line):
    name = "<b>[red]$x^{2$&\"'"
    folder = scenario(name)
    result = run(line, name)
    assert result.exit_code == 0, result.stderr
    inert_on_a_terminal(result.stdout + result.stderr)
    asked = {word for word in line.split() if word.startswith("OUT")}
    assert {p.name for p in folder.iterdir()} == {"cell.swc", "scenario.toml"} | asked
    for path in folder.glob("OUT.*"):
        if path.suffix == ".svg":
            tree = ET.parse(path)  # refuses raw control signs and unclosed markup
            assert not [e for e in tree.iter() if e.tag.endswith(("script", "}b"))]
            links = [v for e in tree.iter() for k, v in e.attrib.items() if k.endswith("href")]
            assert all(v.startswith(("#", "data:image/png;base64,")) for v in links)
        elif path.suffix == ".csv":
            inert_on_a_terminal(path.read_text(encoding="utf-8").replace("\r\n", "\n"))
        elif path.suffix == ".npz":
            with np.load(path, allow_pickle=False) as read:
                assert json.loads(str(read["metadata"]))["title"] == TITLE


def test_hostile_text_reaches_a_figure_as_letters(scenario):
    """Nothing is typeset or dropped: the words of the site's name stand in the SVG's text."""
    name = "$x^2$ <i> & \\alpha"
    folder = scenario(name, title="t $y_1$")
    assert run("map --out OUT.svg", name).exit_code == 0
    texts = ["".join(e.itertext()) for e in ET.parse(folder / "OUT.svg").iter() if e.tag.endswith("}text")]
    assert name in texts


@pytest.mark.parametrize("ending", ["png", "pdf"])
def test_hostile_titles_fit_into_images(scenario, ending):
    folder = scenario("$x^{2$")
    assert run(f"map --out OUT.{ending}", "").exit_code == 0
    data = (folder / f"OUT.{ending}").read_bytes()
    assert data.startswith(b"\x89PNG" if ending == "png" else b"%PDF") and b"\x1b[31m" not in data[:2000]


@pytest.mark.parametrize("name", ["a\nb", "a\x1b[31m", "\u202egnp", "\u200b", "\x00", " ", "\ud7fe\u2028"])
def test_names_that_cannot_be_read_are_refused_in_readable_words(scenario, name):
    scenario(name, title="small")
    result = run("table", "")
    assert result.exit_code == 2 and "expected a name that can be read" in result.stderr
    inert_on_a_terminal(result.stderr)


@pytest.mark.parametrize("word", ["\x1b[31m", "[bold]", "a\nb", "\u202e", "<b>", "x" * 5000])
def test_hostile_words_on_the_command_line_are_shown_inert(scenario, word):
    scenario("tuft")
    for words in (["table", word], ["spectrum", "scenario.toml", word], ["inspect", word], ["map", "scenario.toml"]):
        end = ["--out", f"{word}/x.svg"] if words[0] == "map" else []
        result = CliRunner().invoke(app, [*words, *end])
        assert isinstance(result.exception, SystemExit) and result.exit_code == 2
        inert_on_a_terminal(result.stdout + result.stderr)


def test_comments_and_words_of_an_swc_file_are_shown_inert(scenario):
    folder = scenario("tuft")
    (folder / "cell.swc").write_text(
        "# \x1b[2J[bold]\u202e\n1 1 0 0 0 \x1b[31m -1\n2 3 9 0 0 [bold] 1\n", encoding="utf-8"
    )
    for words in (["inspect", "cell.swc"], ["inspect", "cell.swc", "--json"], ["table", "scenario.toml"]):
        result = CliRunner().invoke(app, words)
        assert result.exit_code == 2
        inert_on_a_terminal(result.stdout + result.stderr)


@pytest.mark.parametrize(
    "path", ["/etc/passwd", "../other/cell.swc", "/dev/zero", "/dev/stdin", ".", "pipe", "a\x00b", "x" * 300, "loop"]
)
@pytest.mark.parametrize("key", ["morphology", "synapses"])
def test_paths_in_a_scenario_are_only_read(tmp_path, monkeypatch, key, path):
    """Ordinary files alone, so that the program neither waits for a pipe nor reads a device without end."""
    import os

    monkeypatch.chdir(tmp_path)
    (tmp_path / "cell.swc").write_text(bases.CELLS["forked"])
    (tmp_path / "list.csv").write_text(bases.LIST)
    os.mkfifo(tmp_path / "pipe")
    (tmp_path / "loop").symlink_to("loop")
    own = {"morphology": "cell.swc", "synapses": "list.csv"}[key]
    text = bases.LISTED.replace(f'{key} = "{own}"', f"{key} = {toml(path)}")
    (tmp_path / "scenario.toml").write_text(text)
    result = run("table --out OUT.csv", "")
    assert (result.exit_code == 2 and key in result.stderr) or "/etc/passwd: " in result.stderr
    inert_on_a_terminal(result.stderr)
    assert not (tmp_path / "OUT.csv").exists()


def test_a_file_without_end_is_given_up(tmp_path, monkeypatch):
    from morphology import reading

    monkeypatch.setattr(reading, "LARGEST_BYTES", 1000)
    (tmp_path / "large.swc").write_bytes(b"#" * 1001)
    for call in (["inspect", str(tmp_path / "large.swc")], ["table", str(tmp_path / "large.swc")]):
        result = CliRunner().invoke(app, call)
        assert result.exit_code == 2 and "it is larger than" in result.stdout + result.stderr


def test_a_pipe_that_a_person_names_is_read(tmp_path):
    """As the shell makes one for `cablenoise inspect <(gunzip -c cell.swc.gz)`."""
    import os
    import threading

    os.mkfifo(tmp_path / "pipe.swc")
    writer = threading.Thread(target=(tmp_path / "pipe.swc").write_text, args=(bases.CELLS["forked"],))
    writer.start()
    result = CliRunner().invoke(app, ["inspect", str(tmp_path / "pipe.swc")])
    writer.join()
    assert result.exit_code == 0 and "can be computed" in result.stdout
