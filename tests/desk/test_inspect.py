"""`inspect`: findings and measures for a person and for a program, and an exit code that tells."""

from __future__ import annotations

import json

import pytest

from morphology import CellTree
from morphology.measures import measure


def test_json_of_a_sound_cell(run, folder):
    result = run("inspect", "stick.swc", "--json")
    assert result.exit_code == 0 and result.stderr == ""
    found = json.loads(result.stdout)
    assert found["usable"] is True
    assert found["measures"] == json.loads(json.dumps(measure(CellTree.from_file(folder / "stick.swc")).as_dict()))
    assert found["measures"]["length_um"] == pytest.approx(600)


def test_json_of_a_broken_cell(run, folder):
    swc = (folder / "stick.swc").read_text().replace("1.785 2\n", "0 2\n")
    (folder / "broken.swc").write_text(swc)
    result = run("inspect", "broken.swc", "--json")
    assert result.exit_code == 2
    found = json.loads(result.stdout)
    assert found["usable"] is False and found["measures"] == {}
    (error,) = [f for f in found["findings"] if f["severity"] == "error"]
    assert set(error) == {"code", "severity", "line", "message", "remedy"}
    assert error["line"] == 3
    assert run("inspect", "broken.swc", "--repair", "radius from neighbours").exit_code == 0


def test_terminal_shows_findings_measures_and_the_soma_rule(run, folder):
    swc = (folder / "stick.swc").read_text().replace("\n", "\r\n")
    (folder / "windows.swc").write_text(swc)
    result = run("inspect", "windows.swc")
    assert result.exit_code == 0
    for word in (
        "line-ends",
        "note",
        "600.0",
        "soma rule: one soma point",
        "can be computed",
        "electrotonic extent",
    ):
        assert word in result.stdout
    assert "\x1b" not in result.stdout


def test_terminal_of_a_broken_cell(run, folder):
    (folder / "broken.swc").write_text("1 1 0 0 0 5 -1\n2 3 10 0 0 1 99\n")
    result = run("inspect", "broken.swc")
    assert result.exit_code == 2
    assert "cannot be computed" in result.stdout and "99" in result.stdout


def test_kinds_can_be_left_out(run, folder):
    (folder / "axon.swc").write_text("1 1 0 0 0 5 -1\n2 3 50 0 0 1 1\n3 2 0 80 0 0.5 1\n")
    measures = [
        json.loads(run("inspect", "axon.swc", "--json", *options).stdout)["measures"]
        for options in ([], ["--omit", "axon"])
    ]
    assert [set(m["length_by_kind_um"]) for m in measures] == [{"axon", "basal"}, {"basal"}]


@pytest.mark.parametrize(
    ("options", "word"),
    [
        (["none.swc"], "cannot be opened"),
        (["stick.swc", "--omit", "axn"], "axn"),
        (["stick.swc", "--repair", "x"], "x"),
    ],
)
def test_mistakes_are_findings_too(run, options, word):
    result = run("inspect", *options)
    assert result.exit_code == 2 and word in result.stdout
    found = json.loads(run("inspect", *options, "--json").stdout)
    assert found["usable"] is False and word in found["findings"][0]["message"]


def test_text_of_the_file_cannot_drive_the_terminal(run, folder):
    (folder / "evil\x1b[31m[bold].swc").write_text("1 1 0 0 0 5 -1\n2 3 10 0 0 [red]\x1b]0;x\x07 1\n")
    result = run("inspect", "evil\x1b[31m[bold].swc")
    assert result.exit_code == 2
    assert "\x1b" not in result.stdout and "\x07" not in result.stdout
    assert "evil\\x1b[31m[bold].swc" in result.stdout
