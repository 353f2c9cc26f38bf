"""`cablenoise modes`: how many independent voltages the dendrite has."""

from __future__ import annotations

from typing import Annotated

import typer

from cable.desk.commands.shared import Force, ScenarioArgument
from cable.desk.terminal import command

DRAWN = 4


@command
def modes(
    scenario: ScenarioArgument,
    count: Annotated[int, typer.Option(min=1, help="How many modes.")] = 10,
    out: Annotated[
        str | None,
        typer.Option(metavar="M.csv|.json|.npz|.png|.svg|.pdf", help="A table, or a figure of the first four."),
    ] = None,
    force: Force = False,
) -> None:
    """Leading modes of the voltage over the membrane: how much of the variance each explains, and where."""
    from cable.desk.files import output
    from cable.desk.messages import DeskError
    from cable.desk.mode_table import mode_quantities, mode_sentences, mode_table
    from cable.desk.next_order import trust
    from cable.desk.progress import waiting
    from cable.desk.scenario import read_scenario
    from cable.desk.site_table import origin
    from cable.desk.tables import TABLE_ENDINGS, write_table
    from cable.desk.terminal import console, mention_findings, say_written

    read = read_scenario(scenario)
    target = output(out, (*TABLE_ENDINGS, ".png", ".svg", ".pdf"), force, read.files) if out is not None else None
    mention_findings(read)
    try:
        with waiting("finding modes"):
            found = read.model.modes(count)
    except ValueError as error:
        option = "--" if str(error).startswith("count: ") else ""
        raise DeskError(f"{option}{error}") from None
    if target is None:
        for sentence in filter(None, (*mode_sentences(found), read.model.small_fluctuation().sentence())):
            console().print(sentence, markup=False)
        return
    if target.ending in TABLE_ENDINGS:
        about = {**origin(read), "share": found.share, "participation": found.participation}
        about["participation_se"] = found.participation_se
        certificate = {"quadrature_relative_error": found.relative_error, **trust(read.model)}
        write_table(mode_table(read.model.tree, found), target, {**about, "certificate": certificate})
    else:
        from cable.desk.figures.map import draw_map
        from cable.desk.figures.style import save, styled

        with styled():
            save(
                draw_map(read.model.fluctuations(1e-6), mode_quantities(found)[:DRAWN], None, read.title),
                target,
                read.title,
            )
    say_written(target.path)
