"""`cablenoise inspect`: is this reconstruction electrically usable, and what does it measure?"""

from __future__ import annotations

from typing import Annotated

import typer

from cable.desk.terminal import USER_ERROR, command


@command
def inspect(
    cell: Annotated[str, typer.Argument(metavar="CELL.swc", help="The reconstruction.")],
    omit: Annotated[
        list[str] | None,
        typer.Option(metavar="KIND", help="Leave out a kind (axon, basal, apical or a code)."),
    ] = None,
    repair: Annotated[
        list[str] | None, typer.Option(metavar="NAME", help="Apply a named repair; the remedies name them.")
    ] = None,
    json: Annotated[bool, typer.Option("--json", help="Findings and measures as JSON on stdout.")] = False,
) -> None:
    """Check a reconstruction: what is odd about it, by line and with a remedy, and what it measures."""
    from cable.desk.inspection import inspect_cell, print_inspection

    result = inspect_cell(cell, omit or [], repair or [])
    if json:
        import json as codec

        print(codec.dumps(result.as_dict(), indent=2, allow_nan=False))
    else:
        print_inspection(result)
    if not result.usable:
        raise typer.Exit(USER_ERROR)
