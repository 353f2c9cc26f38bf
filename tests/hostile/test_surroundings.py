"""Where a run takes place: locales, terminals, folders and settings of other programs. The result is the same."""

from __future__ import annotations

import locale
import os
import subprocess
import sys
from pathlib import Path

import pytest
from typer.testing import CliRunner

from cable.desk import terminal
from cable.desk.cli import app
from hostile import bases
from hostile.test_faults import ENVIRONMENT, PROGRAM, ended


@pytest.fixture
def folder(tmp_path: Path, monkeypatch) -> Path:
    """A folder with a cell and its scenario, which is the current one."""
    (tmp_path / "cell.swc").write_text(bases.CELLS["forked"])
    (tmp_path / "scenario.toml").write_text(bases.SCENARIO)
    monkeypatch.chdir(tmp_path)
    return tmp_path


def test_a_drawing_needs_no_backend_home_or_cache(folder):
    """Settings of matplotlib for other programs: a backend that is not there, a folder that cannot be."""
    settings = {k: v for k, v in ENVIRONMENT.items() if k not in ("HOME", "XDG_CONFIG_HOME", "XDG_CACHE_HOME")}
    settings |= {"MPLBACKEND": "nonsense", "MPLCONFIGDIR": "/proc/none", "DISPLAY": ":99"}
    code, out, errors = ended(folder, "map", "scenario.toml", "--out", "OUT.png", env=settings)
    assert (code, out, errors) == (0, "", "")
    assert (folder / "OUT.png").read_bytes().startswith(b"\x89PNG")


@pytest.mark.parametrize(
    "settings",
    [
        {"LC_ALL": "C", "PYTHONUTF8": "0", "PYTHONCOERCECLOCALE": "0"},
        {"PYTHONIOENCODING": "ascii"},
    ],
)
def test_a_stream_that_lacks_letters_gets_plainer_ones(folder, settings):
    code, out, errors = ended(folder, "table", "scenario.toml", env={**ENVIRONMENT, **settings})
    assert (code, errors) == (0, "")
    assert out.isascii() and " um " in out and "MOhm" in out and "half way" in out


def test_messages_reach_a_stream_that_lacks_letters(folder):
    code, _, errors = ended(folder, "table", "nö Ω日.toml", env={**ENVIRONMENT, "PYTHONIOENCODING": "ascii"})
    assert code == 2 and errors.startswith("n\\xf6 Ohm\\u65e5.toml: cannot be opened")


def test_files_are_utf8_with_decimal_points_whatever_the_locale(folder):
    (folder / "scenario.toml").write_text(bases.SCENARIO.replace("half way", "hälfte Ω"), encoding="utf-8")
    bare = {"LC_ALL": "C", "PYTHONUTF8": "0", "PYTHONCOERCECLOCALE": "0", "LANG": "tr_TR.UTF-8"}
    assert ended(folder, "table", "scenario.toml", "--out", "A.csv", env={**ENVIRONMENT, **bare})[0] == 0
    assert CliRunner().invoke(app, ["table", "scenario.toml", "--out", "B.csv"]).exit_code == 0
    assert (folder / "A.csv").read_bytes() == (folder / "B.csv").read_bytes()
    assert "hälfte Ω" in (folder / "A.csv").read_text(encoding="utf-8")


def test_a_locale_with_decimal_commas_changes_no_number(folder):
    before = locale.setlocale(locale.LC_ALL)
    assert CliRunner().invoke(app, ["table", "scenario.toml", "--out", "A.csv"]).exit_code == 0
    try:
        for name in ("tr_TR.UTF-8", "de_DE.UTF-8", "fr_FR.UTF-8", "tr_TR", "de_DE"):
            try:
                locale.setlocale(locale.LC_ALL, name)
                break
            except locale.Error:
                continue
        else:
            pytest.skip("no locale with a decimal comma is installed")
        assert CliRunner().invoke(app, ["table", "scenario.toml", "--out", "B.csv"]).exit_code == 0
    finally:
        locale.setlocale(locale.LC_ALL, before)
    assert (folder / "A.csv").read_bytes() == (folder / "B.csv").read_bytes()


@pytest.mark.parametrize(
    "name", ["two words", "Zelle Ω 日本 \U0001f9e0", "-n", "a'b\"c", "%s{0}[bold]", "é e\u0301", "y" * 200]
)
def test_paths_may_hold_blanks_and_any_letters(folder, name):
    place = folder / name
    place.mkdir()
    (place / f"{name}.swc").write_text(bases.CELLS["forked"])
    text = bases.SCENARIO.replace("cell.swc", name.replace("\\", "\\\\").replace('"', '\\"') + ".swc")
    (place / f"{name}.toml").write_text(text, encoding="utf-8")
    for ending in ("csv", "svg"):
        out = place / f"{name}.{ending}"
        words = ["table"] if ending == "csv" else ["map"]
        result = CliRunner().invoke(app, [*words, str(place / f"{name}.toml"), "--out", str(out)])
        assert result.exit_code == 0, result.stderr
        assert out.exists()
    assert {p.name for p in place.iterdir()} == {f"{name}.{e}" for e in ("swc", "toml", "csv", "svg")}


def test_a_path_that_is_too_long_is_said(folder):
    for words in (
        ["table", "x" * 5000],
        ["table", "scenario.toml", "--out", "x" * 5000 + ".csv"],
        ["inspect", "x" * 300],
    ):
        result = CliRunner().invoke(app, words)
        assert isinstance(result.exception, SystemExit) and result.exit_code == 2
        assert "too long" in (result.stdout + result.stderr).lower()


def test_a_folder_that_is_gone_is_said(folder):
    gone = folder / "gone"
    code = f"import os; os.chdir({str(gone)!r}); os.rmdir({str(gone)!r}); " + PROGRAM
    absolute = str(folder / "scenario.toml")
    for words in (["table", "scenario.toml"], ["table", absolute, "--out", "OUT.csv"], ["start", "demo"]):
        gone.mkdir()
        ran = subprocess.run(
            [sys.executable, "-c", code, *words], env=ENVIRONMENT, capture_output=True, text=True, check=False
        )
        assert ran.returncode == 2 and "No such file or directory" in ran.stderr and "Traceback" not in ran.stderr


def test_no_number_is_cut_on_a_narrow_terminal(folder, monkeypatch):
    wide = CliRunner().invoke(app, ["table", "scenario.toml"]).stdout
    numbers = [word for line in wide.splitlines() if line.startswith((" soma", " half")) for word in line.split()]
    monkeypatch.setattr(terminal, "PIPE_WIDTH", 20)
    for words in (["table", "scenario.toml"], ["pair", "scenario.toml", "--all"], ["inspect", "cell.swc"]):
        narrow = CliRunner().invoke(app, words)
        assert narrow.exit_code == 0 and "…" not in narrow.stdout
        if words[0] == "table":
            assert set(numbers) <= set(narrow.stdout.split())
            assert max(map(len, narrow.stdout.splitlines()[-3:])) <= 20  # sentences still fold


@pytest.mark.skipif(not hasattr(os, "openpty"), reason="this system has no pseudo-terminals")
def test_a_dumb_terminal_gets_no_escapes(folder):
    mother, child = os.openpty()
    settings = {**ENVIRONMENT, "TERM": "dumb", "NO_COLOR": "1"}
    code, _, _ = ended(folder, "table", "scenario.toml", stdout=child, stderr=child, env=settings)
    os.close(child)
    seen = b""
    try:
        while piece := os.read(mother, 65536):
            seen += piece
    except OSError:
        pass  # how Linux says that the other end is closed
    os.close(mother)
    assert code == 0 and b"half way" in seen and b"\x1b" not in seen
