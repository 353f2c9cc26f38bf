"""The terminal: where messages and tables go, and how a command ends."""

from __future__ import annotations

import functools
import os
import sys
from collections.abc import Callable
from typing import TYPE_CHECKING, Any, ParamSpec

import typer

from cable.desk.messages import DeskError, shown

if TYPE_CHECKING:
    from rich.console import Console

    from cable.desk.scenario import Scenario

P = ParamSpec("P")
USER_ERROR, INTERRUPTED = 2, 130
PIPE_WIDTH = 200  # columns of a table that goes into a pipe, where no terminal says how wide it is


def console(stderr: bool = False) -> Console:
    """A console which shows text as it is: no markup, no emoji codes, no guessed colours."""
    from rich.console import Console

    class OurConsole(Console):
        def on_broken_pipe(self) -> None:
            """Leave it to `command`: a reader that has seen enough is no failure."""
            raise BrokenPipeError

    stream = sys.stderr if stderr else sys.stdout
    width = None if stream.isatty() else PIPE_WIDTH
    return OurConsole(file=stream, markup=False, emoji=False, highlight=False, width=width, soft_wrap=False)


def say(text: str) -> None:
    """A message beside the result: to stderr, so that it never mixes with data."""
    print(text, file=sys.stderr)


def say_written(path: object) -> None:
    """Say on a terminal what was written; silent in a pipe."""
    if sys.stderr.isatty():
        say(f"wrote {path}")


def mention_findings(scenario: Scenario) -> None:
    """One line on stderr where the reconstruction was read with warnings."""
    warnings = [f for f in scenario.findings if f.severity == "warning"]
    if warnings:
        count = f"{len(warnings)} warning{'' if len(warnings) == 1 else 's'}"
        path = scenario.morphology_path
        say(f"{count} about {shown(path.name)}; see: cablenoise inspect {shown(path)}")


def command(function: Callable[P, Any]) -> Callable[P, None]:
    """Let a command end as a person expects: exit 2 and one message for a mistake, 130 on Ctrl-C.

    Everything else that goes wrong is a defect of the program and keeps its traceback.
    """

    @functools.wraps(function)
    def run(*args: P.args, **kwargs: P.kwargs) -> None:
        try:
            function(*args, **kwargs)
            sys.stdout.flush()
        except KeyboardInterrupt:
            say("stopped; nothing was written")
            raise typer.Exit(INTERRUPTED) from None
        except BrokenPipeError:
            # the reader has what it wanted; keep the interpreter from flushing into the closed pipe again
            os.dup2(os.open(os.devnull, os.O_WRONLY), sys.stdout.fileno())
            raise typer.Exit(0) from None
        except Exception as error:
            message = _message_of(error)
            if message is None:
                raise
            say(message)
            raise typer.Exit(USER_ERROR) from None

    return run


def _message_of(error: Exception) -> str | None:
    """The message for a person's mistake, None for a defect."""
    if isinstance(error, DeskError):
        return str(error)
    if isinstance(error, MemoryError):
        return "the machine has too little memory for this run; ask for fewer points or a larger tolerance"
    from cable.network.quadrature import NotConverged
    from morphology import PlaceError, SwcError

    return str(error) if isinstance(error, SwcError | PlaceError | NotConverged) else None
