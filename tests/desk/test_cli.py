"""The command line as a whole: quick help, clean streams, exit codes."""

from __future__ import annotations

import os
import subprocess
import sys

import pytest

from cable.desk.messages import choices, nearest, shown

HEAVY = (
    "pydantic",
    "matplotlib",
    "sympy",
    "networkx",
    "rich",
    "jinja2",
)  # typer takes the first for one command's help


def python(code: str, folder, **extra: str) -> subprocess.CompletedProcess[str]:
    environment = {**os.environ, "PYTHONPATH": os.pathsep.join(filter(None, sys.path)), **extra}
    return subprocess.run(
        [sys.executable, "-c", code], cwd=folder, env=environment, text=True, capture_output=True, check=False
    )


def as_typed(*arguments: str) -> str:
    """A program that does what the command with these arguments does."""
    return f"import sys; from cable.desk.cli import main; sys.argv = {['cablenoise', *arguments]!r}; main()"


def command(folder, *arguments: str, **extra: str) -> subprocess.CompletedProcess[str]:
    return python(as_typed(*arguments), folder, **extra)


@pytest.mark.parametrize("words", [["--help"], ["table", "--help"], ["map", "--help"]])
def test_help_loads_nothing_heavy(folder, words):
    code = (
        "import sys\nfrom cable.desk.cli import app\n"
        f"try: app({words!r})\nexcept SystemExit: pass\n"
        f"print('loaded', [m for m in {HEAVY[len(words) - 1 :]!r} if m in sys.modules])"
    )
    result = python(code, folder)
    assert result.stdout.splitlines()[-1] == "loaded []", result.stdout
    assert "Usage: " in result.stdout


def test_every_command_is_in_the_help(run):
    text = run("--help").stdout
    for name in ("inspect", "start", "table", "map", "along"):
        assert f"\n  {name} " in text


def test_version(run):
    result = run("--version")
    assert result.exit_code == 0 and result.stdout.startswith("cablenoise ") and result.stdout[11].isdigit()


@pytest.mark.parametrize(
    "arguments",
    [["tabel"], ["table"], ["table", "stick.toml", "--ot", "x"], ["map", "stick.toml"], ["table", "no.toml"]],
)
def test_mistakes_end_with_2_and_a_message_without_traceback(folder, arguments):
    result = command(folder, *arguments)
    assert result.returncode == 2
    assert result.stdout == "" and result.stderr
    assert "Traceback" not in result.stderr


def test_a_pipe_gets_plain_text_and_silence(folder):
    result = command(folder, "table", "stick.toml", NO_COLOR="1")
    assert result.returncode == 0
    assert result.stderr == "" and "\x1b" not in result.stdout
    result = command(folder, "table", "stick.toml", "--out", "T.csv")
    assert (result.returncode, result.stdout, result.stderr) == (0, "", "")


def test_a_reader_that_leaves_early_is_no_error(folder):
    environment = {**os.environ, "PYTHONPATH": os.pathsep.join(filter(None, sys.path))}
    process = subprocess.Popen(
        [sys.executable, "-c", as_typed("table", "stick.toml")],
        cwd=folder,
        env=environment,
        stdout=subprocess.PIPE,
        stderr=subprocess.PIPE,
    )
    process.stdout.close()
    with process.stderr as errors:
        assert errors.read() == b""
    assert process.wait(timeout=30) == 0


def test_warnings_about_the_cell_are_one_line(folder, run):
    swc = (folder / "stick.swc").read_text()
    lines = [line.split() for line in swc.splitlines() if not line.startswith("#")]
    # a neurite as thick as a soma is no error, but not credible either
    thick = "\n".join(" ".join([*r[:5], "25" if r[1] == "3" else r[5], r[6]]) for r in lines)
    (folder / "stick.swc").write_text(thick + "\n")
    result = run("table", "stick.toml", "--out", "T.csv")
    assert result.exit_code == 0
    (line,) = result.stderr.splitlines()
    assert "about stick.swc" in line and "cablenoise inspect stick.swc" in line


def test_an_unreachable_tolerance_is_a_message(folder, run, monkeypatch):
    from cable.network.quadrature import NotConverged
    from cable.noise.model import CableModel

    def fails(self, tolerance=1e-9):
        raise NotConverged("the tolerance 1e-13 cannot be reached")

    monkeypatch.setattr(CableModel, "fluctuations", fails)
    result = run("table", "stick.toml")
    assert result.exit_code == 2 and result.stderr == "the tolerance 1e-13 cannot be reached\n"


def test_words():
    assert shown("a\x1b\u202eb\n" + "x" * 300, 20) == "a\\x1b\\u202eb\\n" + "x" * 12 + "..."
    assert nearest("rat_Hz", ["rate_Hz", "name"]) == "rate_Hz"
    assert nearest("zzz", ["rate_Hz"]) is None
    assert [choices(list("abc")[:n]) for n in range(4)] == ["", "a", "a or b", "a, b or c"]
