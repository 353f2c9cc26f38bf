"""Long work says so on a terminal and is silent in a pipe; --quiet leaves the result alone."""

from __future__ import annotations

import os
import pty
import subprocess
import sys
from pathlib import Path

import pytest

from cable.desk import progress as module
from cable.desk.progress import progress, waiting
from cable.desk.terminal import is_quiet


def on_a_terminal(code: str, **env: str) -> str:
    """What a program shows on a terminal of its own as stderr."""
    main, side = pty.openpty()
    with subprocess.Popen([sys.executable, "-c", code], stderr=side, env={**os.environ, **env}) as run:
        os.close(side)
        seen = b""
        while True:
            try:
                part = os.read(main, 65536)
            except OSError:
                break
            if not part:
                break
            seen += part
        assert run.wait() == 0
    os.close(main)
    return seen.decode()


WAIT = """
import time
from cable.desk import progress
progress.PATIENCE_S = 0.05
with progress.waiting('adding up'): {}
"""


def test_waiting_is_told_after_a_while_and_short_work_is_not() -> None:
    long = on_a_terminal(WAIT.format("time.sleep(0.6)"))
    assert "adding up" in long and "0:00:0" in long
    assert on_a_terminal(WAIT.format("pass")).strip("\r\n\x1b[?25hl") == ""
    assert "\x1b[3" not in on_a_terminal(WAIT.format("time.sleep(0.4)"), NO_COLOR="1", TERM="xterm")


def test_progress_shows_its_label_and_the_time_left() -> None:
    code = (
        "import time; from cable.desk.progress import progress\n"
        "with progress('simulating') as tell:\n"
        "    for k in range(8): tell(k / 8); time.sleep(0.05)"
    )
    seen = on_a_terminal(code)
    assert "simulating" in seen and "left" in seen


def test_silent_in_a_pipe(capfd: pytest.CaptureFixture[str], monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(module, "PATIENCE_S", 0.0)
    with waiting("x"), progress("y") as tell:
        tell(0.5)
    assert capfd.readouterr() == ("", "")


def test_quiet_leaves_the_result_alone(run, folder: Path) -> None:
    loud, quiet = (run("table", "stick.toml", *extra) for extra in ((), ("--quiet",)))
    assert quiet.exit_code == 0 and quiet.stdout == loud.stdout and quiet.stderr == ""
    assert not is_quiet()
    missing = run("table", "none.toml", "--quiet")
    assert missing.exit_code == 2 and "cannot be opened" in missing.stderr
