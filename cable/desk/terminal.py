"""The terminal: where messages and tables go, and how a command ends."""

from __future__ import annotations

import codecs
import functools
import inspect
import io
import os
import sys
from collections.abc import Callable
from contextlib import suppress
from contextvars import ContextVar
from typing import TYPE_CHECKING, Annotated, Any

import typer

from cable.desk.messages import DeskError, shown

if TYPE_CHECKING:
    from rich.console import Console
    from rich.table import Table

    from cable.desk.scenario import Scenario

Quiet = Annotated[bool, typer.Option("--quiet", help="Say nothing beside the result but mistakes.")]
_QUIET: ContextVar[bool] = ContextVar("quiet", default=False)  # of the command that runs
USER_ERROR, INTERRUPTED = 2, 130
WIDEST = 10_000  # columns that a grid is measured in
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


def print_whole(out: Console, grid: Table) -> None:
    """Print a grid of numbers; on a narrow terminal its lines run on, as a number that is cut would be a wrong one."""
    usual, needed = out.width, out.measure(grid, options=out.options.update(max_width=WIDEST)).maximum
    out.width = max(usual, needed)
    out.print(grid)
    out.width = usual


def say(text: str) -> None:
    """A message beside the result: to stderr, so that it never mixes with data."""
    with suppress(OSError):  # where nobody can be told, the exit code still tells
        print(text, file=sys.stderr)


PLAINER = str.maketrans(
    {"µ": "u", "μ": "u", "Ω": "Ohm", "²": "2", "³": "3", "±": "+-", "−": "-", "–": "-", "×": "x", "λ": "lambda",
     "…": "...", "─": "-", "τ": "tau", "→": "->", "≥": ">=", "≤": "<="}
)  # fmt: skip


def _plainer(error: UnicodeError) -> tuple[str, int]:
    """What stands for signs that a stream's encoding lacks: plain letters, or else an escape."""
    assert isinstance(error, UnicodeEncodeError)
    lacking = error.object[error.start : error.end].translate(PLAINER)
    return lacking.encode("ascii", "backslashreplace").decode("ascii"), error.end


def prepare_streams() -> None:
    """Make stdout and stderr take any text, whatever the locale, and be there even where they were closed."""
    codecs.register_error("plainer", _plainer)
    if sys.stdout is None:
        sys.stdout = open(os.devnull)  # not writable: a result that nobody can read is an error
    if sys.stderr is None:
        sys.stderr = open(os.devnull, "w")
    for stream in (sys.stdout, sys.stderr):
        if isinstance(stream, io.TextIOWrapper):
            stream.reconfigure(errors="plainer")


def give_up_stdout() -> None:
    """Keep the interpreter from flushing once more into a stdout that takes nothing."""
    with suppress(OSError, ValueError):
        os.dup2(os.open(os.devnull, os.O_WRONLY), sys.stdout.fileno())


def is_quiet() -> bool:
    """Whether the command that runs was asked to be quiet."""
    return _QUIET.get()


def say_written(path: object) -> None:
    """Say on a terminal what was written; silent in a pipe."""
    if sys.stderr.isatty() and not is_quiet():
        say(f"wrote {path}")


def mention_findings(scenario: Scenario) -> None:
    """One line on stderr where the reconstruction was read with warnings."""
    warnings = [f for f in scenario.findings if f.severity == "warning"]
    if warnings and not is_quiet():
        count = f"{len(warnings)} warning{'' if len(warnings) == 1 else 's'}"
        path = scenario.morphology_path
        say(f"{count} about {shown(path.name)}; see: cablenoise inspect {shown(path)}")


def command(function: Callable[..., Any]) -> Callable[..., None]:
    """Let a command end as a person expects: exit 2 and one message for a mistake, 130 on Ctrl-C. Adds --quiet.

    Everything else that goes wrong is a defect of the program and keeps its traceback.
    """

    @functools.wraps(function)
    def run(*args: Any, quiet: bool = False, **kwargs: Any) -> None:
        told = _QUIET.set(quiet)
        try:
            function(*args, **kwargs)
            sys.stdout.flush()
        except KeyboardInterrupt:
            say("stopped; nothing was written")
            raise typer.Exit(INTERRUPTED) from None
        except BrokenPipeError:
            give_up_stdout()  # the reader has what it wanted
            raise typer.Exit(0) from None
        except Exception as error:
            message = _message_of(error)
            if message is None:
                raise
            if isinstance(error, OSError):
                give_up_stdout()
            say(message)
            raise typer.Exit(USER_ERROR) from None
        finally:
            _QUIET.reset(told)

    shape = inspect.signature(function, eval_str=True)
    more = inspect.Parameter("quiet", inspect.Parameter.KEYWORD_ONLY, default=False, annotation=Quiet)
    # typer reads the options of a command from its signature
    run.__signature__ = shape.replace(parameters=[*shape.parameters.values(), more])  # type: ignore[attr-defined]
    run.__annotations__ = {name: one.annotation for name, one in shape.parameters.items()} | {"quiet": Quiet}
    return run


def _message_of(error: Exception) -> str | None:
    """The message for a person's mistake, None for a defect."""
    if isinstance(error, DeskError):
        return str(error)
    if isinstance(error, MemoryError):
        return "the machine has too little memory for this run; ask for fewer points or a larger tolerance"
    if isinstance(error, OSError):
        return unwritable(error)
    from cable.network.quadrature import NotConverged
    from morphology import PlaceError, SwcError

    return str(error) if isinstance(error, SwcError | PlaceError | NotConverged) else None


def unwritable(error: OSError) -> str:
    """The message for a file, or for stdout where none is named, that the machine refuses."""
    reason = error.strerror or "it is closed"
    if not error.filename:
        return f"the result cannot be printed: {reason}; send it somewhere else, or into a file with --out"
    return f"{shown(error.filename)}: cannot be read or written: {reason}"
