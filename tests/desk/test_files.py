"""Results are written whole or not at all, never over an input, and every refusal says what to do."""

from __future__ import annotations

import errno
import os
import signal
import subprocess
import sys
import time

import pytest

from cable.desk.files import output
from cable.desk.messages import DeskError


def leftovers(folder) -> list[str]:
    return [p.name for p in folder.iterdir() if p.name.endswith(".part")]


def test_an_existing_file_needs_force(run, folder):
    (folder / "T.csv").write_text("mine")
    result = run("table", "stick.toml", "--out", "T.csv")
    assert result.exit_code == 2
    assert "T.csv: exists already" in result.stderr and "--force" in result.stderr
    assert (folder / "T.csv").read_text() == "mine"
    assert run("table", "stick.toml", "--out", "T.csv", "--force").exit_code == 0
    assert (folder / "T.csv").read_text().startswith("swc_id,")


@pytest.mark.parametrize("link", ["symbolic", "hard"])
def test_inputs_are_never_written_even_through_links(folder, link):
    source = folder / "data.csv"
    source.write_text("input")
    other = folder / "other.csv"
    (other.symlink_to if link == "symbolic" else other.hardlink_to)(source)
    for path in (source, other, folder / "sub" / ".." / "data.csv"):
        with pytest.raises(DeskError, match="input of this run"):
            output(path, (".csv",), force=True, inputs=[source])
    assert source.read_text() == "input"


def test_a_scenario_and_its_cell_survive_force(run, folder):
    before = (folder / "stick.toml").read_bytes(), (folder / "stick.swc").read_bytes()
    (folder / "linked.csv").symlink_to(folder / "stick.swc")
    result = run("table", "stick.toml", "--out", "linked.csv", "--force")
    assert result.exit_code == 2 and "input of this run" in result.stderr
    assert ((folder / "stick.toml").read_bytes(), (folder / "stick.swc").read_bytes()) == before


@pytest.mark.parametrize(
    ("name", "words"),
    [
        ("T.xlsx", ["ends in .xlsx", ".csv, .json or .npz"]),
        ("T", ["has no ending", ".csv, .json or .npz"]),
        ("none/T.csv", ["there is no folder", "make it first"]),
        ("sub.csv", ["is a folder"]),
        (f"{'x' * 300}.csv", ["too long"]),
    ],
)
def test_each_refusal_says_why(run, folder, name, words):
    (folder / "sub.csv").mkdir()
    result = run("table", "stick.toml", "--out", name)
    assert result.exit_code == 2
    assert result.stdout == ""
    for word in words:
        assert word in result.stderr


def test_endings_are_taken_in_capitals(run, folder):
    assert run("table", "stick.toml", "--out", "T.CSV").exit_code == 0
    assert (folder / "T.CSV").exists()


def test_a_read_only_folder_is_said(tmp_path, monkeypatch):
    place = tmp_path / "closed"
    place.mkdir()
    place.chmod(0o500)
    if os.geteuid() == 0:  # root may write anywhere: let the system answer as it does to others
        monkeypatch.setattr(os, "access", lambda path, mode: str(path) != str(place))
    with pytest.raises(DeskError, match="cannot be written to; choose another"):
        output(place / "T.csv", (".csv",))
    place.chmod(0o700)


@pytest.mark.parametrize(
    ("number", "words"),
    [(errno.ENOSPC, "disk is full"), (errno.EACCES, "permission denied"), (errno.EIO, "error")],
)
def test_a_failed_write_is_said_and_leaves_nothing(tmp_path, number, words):
    target = output(tmp_path / "T.csv", (".csv",))
    with pytest.raises(DeskError, match=words), target.writing(text=True) as stream:
        stream.write("half")
        raise OSError(number, os.strerror(number))
    assert list(tmp_path.iterdir()) == []


def test_a_stopped_write_keeps_the_old_file(tmp_path):
    (tmp_path / "T.csv").write_text("old")
    target = output(tmp_path / "T.csv", (".csv",), force=True)
    with pytest.raises(KeyboardInterrupt), target.writing(text=True) as stream:
        stream.write("half")
        raise KeyboardInterrupt
    assert [p.name for p in tmp_path.iterdir()] == ["T.csv"]
    assert (tmp_path / "T.csv").read_text() == "old"


def test_a_file_that_came_meanwhile_is_not_replaced(tmp_path):
    target = output(tmp_path / "T.csv", (".csv",))
    with pytest.raises(DeskError, match="exists already"), target.writing(text=True) as stream:
        stream.write("new")
        (tmp_path / "T.csv").write_text("other's")
    assert (tmp_path / "T.csv").read_text() == "other's"
    assert leftovers(tmp_path) == []


def test_permissions_follow_the_umask(tmp_path):
    old = os.umask(0o027)
    try:
        with output(tmp_path / "T.csv", (".csv",)).writing(text=True) as stream:
            stream.write("x")
    finally:
        os.umask(old)
    assert (tmp_path / "T.csv").stat().st_mode & 0o777 == 0o640


SLOW_WRITE = """
import sys, time
import cable.desk.tables as tables
from cable.desk.cli import main
def slow(table, stream):
    stream.write("half"); stream.flush()
    print("writing", flush=True)
    time.sleep(30)
tables.write_csv = slow
sys.argv = ["cablenoise", "table", "stick.toml", "--out", "T.csv"]
main()
"""


@pytest.mark.parametrize("kill", [signal.SIGINT, signal.SIGTERM])
def test_a_killed_run_leaves_no_half_file(folder, kill):
    environment = {**os.environ, "PYTHONPATH": os.pathsep.join(filter(None, sys.path))}
    process = subprocess.Popen(
        [sys.executable, "-c", SLOW_WRITE], cwd=folder, env=environment, text=True,
        stdout=subprocess.PIPE, stderr=subprocess.PIPE,
    )  # fmt: skip
    assert process.stdout.readline() == "writing\n"
    assert len(leftovers(folder)) == 1
    time.sleep(0.05)
    process.send_signal(kill)
    _, errors = process.communicate(timeout=20)
    assert process.returncode == 130
    assert errors == "stopped; nothing was written\n"
    assert leftovers(folder) == []
    assert not (folder / "T.csv").exists()
