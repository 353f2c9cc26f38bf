"""What the machine does to a run: full disks, kills, closed streams. Results are whole or absent, and it is said."""

from __future__ import annotations

import errno
import os
import random
import resource
import signal
import subprocess
import sys
import time
from pathlib import Path

import pytest
from typer.testing import CliRunner

from cable.desk import files
from cable.desk.cli import app
from hostile import bases

PROGRAM = "import sys; from cable.desk.cli import main; sys.argv[0] = 'cablenoise'; main()"
ENVIRONMENT = {**os.environ, "PYTHONPATH": os.pathsep.join(filter(None, sys.path))}


@pytest.fixture
def folder(tmp_path: Path, monkeypatch) -> Path:
    """A folder with a cell and its scenario, which is the current one."""
    (tmp_path / "cell.swc").write_text(bases.CELLS["forked"])
    (tmp_path / "scenario.toml").write_text(bases.SCENARIO)
    monkeypatch.chdir(tmp_path)
    return tmp_path


def started(folder: Path, *words: str, **how) -> subprocess.Popen[bytes]:
    how = {"stdout": subprocess.PIPE, "stderr": subprocess.PIPE, "env": ENVIRONMENT, **how}
    return subprocess.Popen([sys.executable, "-c", PROGRAM, *words], cwd=folder, **how)


def ended(folder: Path, *words: str, **how) -> tuple[int, str, str]:
    process = started(folder, *words, **how)
    out, errors = process.communicate(timeout=120)
    return process.returncode, (out or b"").decode(), (errors or b"").decode()


def others(folder: Path) -> set[str]:
    return {p.name for p in folder.iterdir()} - {"cell.swc", "scenario.toml"}


# ------------------------------------------------------------------------------------------------- the disk is full


@pytest.mark.skipif(not Path("/dev/full").exists(), reason="this system has no /dev/full")
@pytest.mark.parametrize(
    "words",
    ["table --out OUT.csv", "table --out OUT.json", "table --out OUT.npz", "map --out OUT.svg", "map --out OUT.png"],
)
@pytest.mark.parametrize("old", [None, "old"])
def test_a_full_disk_is_said_and_keeps_what_was_there(folder, monkeypatch, words, old):
    def full(handle: int, mode: str, **how):
        os.close(handle)
        return open("/dev/full", mode, **how)

    name, *rest = words.split()
    if old:
        (folder / rest[-1]).write_text(old)
    monkeypatch.setattr(files.os, "fdopen", full)
    result = CliRunner().invoke(app, [name, "scenario.toml", *rest, *(["--force"] if old else [])])
    assert isinstance(result.exception, SystemExit) and result.exit_code == 2
    assert result.stderr.endswith("cannot be written: the disk is full; nothing was kept\n")
    assert others(folder) == ({rest[-1]} if old else set())
    assert not old or (folder / rest[-1]).read_text() == old


def test_a_limit_on_the_size_of_files_is_said(folder):
    def limited() -> None:
        resource.setrlimit(resource.RLIMIT_FSIZE, (300, 300))

    code, out, errors = ended(folder, "table", "scenario.toml", "--out", "OUT.csv", preexec_fn=limited)
    assert (code, out, others(folder)) == (2, "", set())
    assert "the file would be larger than is allowed here; nothing was kept" in errors and errors.count("\n") == 1


@pytest.mark.parametrize(
    ("number", "words"), [(errno.EROFS, "read-only"), (errno.EACCES, "permission denied"), (errno.EDQUOT, "quota")]
)
def test_a_folder_that_takes_no_file_is_said(folder, monkeypatch, number, words):
    def refuse(**how):
        raise OSError(number, os.strerror(number), str(folder))

    monkeypatch.setattr(files.tempfile, "mkstemp", refuse)
    result = CliRunner().invoke(app, ["table", "scenario.toml", "--out", "OUT.csv"])
    assert result.exit_code == 2 and words in result.stderr and others(folder) == set()


def test_an_output_that_is_a_link_in_a_circle_is_said(folder):
    (folder / "OUT.csv").symlink_to("OUT.csv")
    for force in ([], ["--force"]):
        result = CliRunner().invoke(app, ["table", "scenario.toml", "--out", "OUT.csv", *force])
        assert isinstance(result.exception, SystemExit) and result.exit_code == 2
        assert "link that leads to itself" in result.stderr


# ------------------------------------------------------------------------------------------------------ it is killed

HALF = """
import sys, time
import cable.desk.tables as tables
def half(table, stream):
    stream.write("half"); stream.flush(); print("writing", flush=True); time.sleep(60)
tables.write_csv = half
"""


def killed_while_writing(folder: Path, number: signal.Signals, **how) -> tuple[int, set[str]]:
    process = subprocess.Popen(
        [sys.executable, "-c", HALF + PROGRAM, "table", "scenario.toml", "--out", "OUT.csv", "--force"],
        cwd=folder, env=ENVIRONMENT, stdout=subprocess.PIPE, stderr=subprocess.PIPE, **how,
    )  # fmt: skip
    assert process.stdout is not None and process.stdout.readline() == b"writing\n"
    process.send_signal(number)
    process.communicate(timeout=60)
    return process.returncode, others(folder)


def test_a_run_killed_at_once_leaves_no_half_file_under_the_name(folder):
    (folder / "OUT.csv").write_text("old")
    code, left = killed_while_writing(folder, signal.SIGKILL)
    assert code == -signal.SIGKILL and (folder / "OUT.csv").read_text() == "old"
    (part,) = left - {"OUT.csv"}  # nobody can clear up after SIGKILL: the name says what it is
    assert part.startswith(".OUT.csv.") and part.endswith(".part")
    assert ended(folder, "table", "scenario.toml", "--out", "OUT.csv", "--force")[0] == 0


def test_a_terminal_that_is_closed_ends_a_run_cleanly(folder):
    assert killed_while_writing(folder, signal.SIGHUP) == (130, set())


def test_a_run_that_shall_outlive_its_terminal_does(folder):
    """As under nohup, which ignores SIGHUP for the program it starts."""
    process = started(folder, "table", "scenario.toml", preexec_fn=lambda: signal.signal(signal.SIGHUP, signal.SIG_IGN))
    for _ in range(20):
        process.send_signal(signal.SIGHUP)
        time.sleep(0.02)
    out, errors = process.communicate(timeout=60)
    assert process.returncode == 0 and b"half way" in out and errors == b""


def test_kills_at_random_moments_leave_a_whole_file_or_none(folder):
    code, _, _ = ended(folder, "table", "scenario.toml", "--out", "WHOLE.csv")
    assert code == 0
    whole = (folder / "WHOLE.csv").read_bytes()
    draw = random.Random(5)
    for _ in range(3):
        process = started(folder, "table", "scenario.toml", "--out", "OUT.csv", "--force")
        time.sleep(draw.uniform(0.05, 0.6))
        process.kill()
        process.communicate(timeout=60)
        if (folder / "OUT.csv").exists():
            assert (folder / "OUT.csv").read_bytes() == whole
        assert all(n.startswith(".OUT.csv.") and n.endswith(".part") for n in others(folder) - {"OUT.csv", "WHOLE.csv"})


# ------------------------------------------------------------------------------------------------ streams fail


@pytest.mark.skipif(not Path("/dev/full").exists(), reason="this system has no /dev/full")
@pytest.mark.parametrize("words", [["table", "scenario.toml"], ["inspect", "cell.swc", "--json"], ["--help"]])
def test_a_stdout_that_is_full_is_said(folder, words):
    with open("/dev/full", "w") as full:
        code, _, errors = ended(folder, *words, stdout=full)
    assert code == 2 and errors.startswith("the result cannot be printed: No space left") and errors.count("\n") == 1


def test_a_stdout_that_is_closed_is_said(folder):
    code, _, errors = ended(folder, "table", "scenario.toml", stdout=None, preexec_fn=lambda: os.close(1))
    assert code == 2 and errors.startswith("the result cannot be printed: it is closed") and errors.count("\n") == 1


def test_closed_streams_do_not_hinder_a_result_that_goes_into_a_file(folder):
    def close() -> None:
        for number in (0, 1, 2):
            os.close(number)

    code, _, _ = ended(folder, "table", "scenario.toml", "--out", "OUT.csv", stdout=None, stderr=None, preexec_fn=close)
    assert code == 0 and others(folder) == {"OUT.csv"}
    assert (folder / "OUT.csv").read_text().startswith("swc_id,")  # and not into a stream's old number


@pytest.mark.skipif(not Path("/dev/full").exists(), reason="this system has no /dev/full")
def test_where_nobody_can_be_told_the_exit_code_tells(folder):
    with open("/dev/full", "w") as full:
        assert ended(folder, "table", "none.toml", stderr=full)[0] == 2
    assert ended(folder, "table", "none.toml", stderr=None, preexec_fn=lambda: os.close(2))[0] == 2
