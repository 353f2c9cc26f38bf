"""`cablenoise start`: a folder with an invented cell and a scenario that runs."""

from __future__ import annotations

from typing import Annotated

import typer

from cable.desk.commands.shared import Force
from cable.desk.terminal import command


@command
def start(
    folder: Annotated[str, typer.Argument(metavar="FOLDER", help="The folder; made where it is missing.")],
    force: Force = False,
) -> None:
    """Write an invented cell and a commented scenario to begin with, and say what to type next."""
    import shlex

    from cable.desk.start import write_example

    scenario = write_example(folder, force)
    print(f"wrote heron.swc and heron.toml into {scenario.parent}")
    print(f"next: cablenoise table {shlex.quote(str(scenario))}")
