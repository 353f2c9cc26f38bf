"""The command `cablenoise`. Each command is a module in `cable.desk.commands`, which imports what it needs
only when it runs: the help must answer at once."""

from __future__ import annotations

import logging
import os
import signal
import sys
from typing import Annotated

import typer

from cable.desk.commands.along import along
from cable.desk.commands.excursions import excursions
from cable.desk.commands.inspect import inspect
from cable.desk.commands.map import map_
from cable.desk.commands.modes import modes
from cable.desk.commands.pair import pair
from cable.desk.commands.point_neuron import point_neuron
from cable.desk.commands.record import record
from cable.desk.commands.report import report
from cable.desk.commands.simulate import simulate
from cable.desk.commands.sources import sources
from cable.desk.commands.spectrum import spectrum
from cable.desk.commands.start import start
from cable.desk.commands.table import table
from cable.desk.messages import version
from cable.desk.terminal import USER_ERROR, give_up_stdout, prepare_streams, say, unwritable

STOPPING = [getattr(signal, name) for name in ("SIGTERM", "SIGHUP") if hasattr(signal, name)]

app = typer.Typer(
    name="cablenoise",
    help="Voltage fluctuations everywhere on a passive neuron under synaptic bombardment.",
    epilog="Begin with: cablenoise start demo",
    no_args_is_help=True,
    add_completion=False,
    rich_markup_mode=None,  # names of files are shown as they are, and the help stays quick
    pretty_exceptions_enable=False,
    context_settings={"help_option_names": ["-h", "--help"]},
)

app.command("inspect")(inspect)
app.command("start")(start)
app.command("table")(table)
app.command("map")(map_)
app.command("along")(along)
app.command("spectrum")(spectrum)
app.command("pair")(pair)
app.command("sources")(sources)
app.command("modes")(modes)
app.command("excursions")(excursions)
app.command("point-neuron")(point_neuron)
app.command("record")(record)
app.command("simulate")(simulate)
app.command("report")(report)


def _show_version(asked: bool) -> None:
    if asked:
        typer.echo(f"cablenoise {version()}")
        raise typer.Exit()


@app.callback()
def options(
    _: Annotated[
        bool,
        typer.Option("--version", help="Show the version and stop.", callback=_show_version, is_eager=True),
    ] = False,
) -> None:
    """Options of the program as a whole."""


def _stop(number: int, frame: object) -> None:
    raise KeyboardInterrupt


def main() -> None:
    """Entry point of the command; a polite kill is treated as Ctrl-C, so that no half file stays."""
    for number in STOPPING:
        if signal.getsignal(number) is not signal.SIG_IGN:  # as under nohup
            signal.signal(number, _stop)
    prepare_streams()
    # figures go into files alone: a backend that was set for other programs may be missing here
    os.environ["MPLBACKEND"] = "agg"
    logging.getLogger("matplotlib").setLevel(logging.ERROR)  # a folder for its cache is no business of the user's
    try:
        app()
    except OSError as error:  # of the help or the version; commands see to their own
        give_up_stdout()
        say(unwritable(error))
        sys.exit(USER_ERROR)
