"""What no input may bring about, and how it is noticed: hangs, stray acts, warnings, messages that harm."""

from __future__ import annotations

import re
import signal
import sys
import warnings
from collections.abc import Callable, Iterator
from contextlib import contextmanager
from pathlib import Path
from types import FrameType
from typing import Any

TIME_LIMIT_S = 30.0  # a good file takes a hundredth of a second
LONGEST_MESSAGE = 8000  # characters of one refusal


class Defect(AssertionError):
    """Something that no input may bring about."""


class _TooLong(BaseException):
    """The time limit; no `except Exception` may swallow it."""


@contextmanager
def time_limit(seconds: float = TIME_LIMIT_S) -> Iterator[None]:
    """Turn work that takes too long into a Defect."""

    def stop(number: int, frame: FrameType | None) -> None:
        raise _TooLong

    before = signal.signal(signal.SIGALRM, stop)
    signal.setitimer(signal.ITIMER_REAL, seconds)
    try:
        yield
    except _TooLong:
        raise Defect(f"no answer within {seconds:g} s") from None
    finally:
        signal.setitimer(signal.ITIMER_REAL, 0)
        signal.signal(signal.SIGALRM, before)


# what code that runs from an input would do; the first write, start of a program or connection is remembered
_watching: list[Path] = []
_seen: list[str] = []
WRITES = re.compile("[wax+]")


def _audit(event: str, arguments: tuple[Any, ...]) -> None:
    if not _watching:
        return
    if event == "open":
        path, mode, flags = arguments
        writes = bool(WRITES.search(mode)) if isinstance(mode, str) else bool(flags & 0o3)
        inside = isinstance(path, int) or str(path).startswith((str(_watching[0]), "/dev/null"))
        if writes and not inside:
            _seen.append(f"opened {path!r} for writing")
    elif event.startswith(
        ("os.system", "os.exec", "os.fork", "os.remove", "os.rename", "subprocess", "socket", "shutil")
    ):
        _seen.append(f"{event} {arguments!r:.200}")


@contextmanager
def nothing_executes(folder: Path) -> Iterator[None]:
    """A Defect where the work inside writes outside `folder`, starts a program or opens a connection."""
    if not getattr(nothing_executes, "hooked", False):
        sys.addaudithook(_audit)
        nothing_executes.hooked = True  # type: ignore[attr-defined]
    _seen.clear()
    _watching.append(folder)
    try:
        yield
    finally:
        _watching.pop()
        if _seen:
            raise Defect(f"an input made the program act: {_seen[0]}")


@contextmanager
def no_warning() -> Iterator[None]:
    """A warning would stand as stray lines on stderr: it is a Defect like any other exception."""
    with warnings.catch_warnings():
        warnings.simplefilter("error")
        yield


def clean_refusal(error: Exception, file: str = "") -> str:
    """Check that an error speaks to a person: printable, of bearable length, about the file."""
    said = str(error)
    if not said.strip() or len(said) > LONGEST_MESSAGE:
        raise Defect(f"a message of {len(said)} characters: {said[:200]!r}")
    if not all(c.isprintable() or c == "\n" for c in said):
        raise Defect(f"a message with signs that a terminal obeys: {said!r:.300}")
    if file and file not in said:
        raise Defect(f"a message that does not name {file}: {said!r:.300}")
    if re.search(r"Traceback|object at 0x|<class|pydantic|numpy\.|np\.float64", said):
        raise Defect(f"a message in the words of a programmer: {said!r:.300}")
    return "refused"


def guarded(work: Callable[[], str]) -> str:
    try:
        with time_limit(), no_warning():
            return work()
    except Defect:
        raise
    except Exception as error:
        raise Defect(f"{type(error).__name__}: {error!s:.300}") from error
