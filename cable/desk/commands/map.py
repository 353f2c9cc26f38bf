"""`cablenoise map`: the cell drawn to scale, with mean and SD (or another quantity) in colour."""

from __future__ import annotations

from typing import Annotated

import typer

from cable.desk.commands.shared import Force, NextOrder, Quantity, ScenarioArgument, ShareInput, Tolerance
from cable.desk.terminal import command


@command
def map_(
    scenario: ScenarioArgument,
    out: Annotated[str, typer.Option(metavar="M.png|.svg|.pdf", help="The figure.")],
    quantity: Quantity = None,
    input_: ShareInput = None,
    with_: Annotated[
        str | None,
        typer.Option("--with", metavar="SITE", help="The site of correlation, lag, source and charge-share."),
    ] = None,
    plane: Annotated[
        str | None,
        typer.Option(metavar="xy|xz|yz|flat", help="The plane to draw, flat: however turned; else the best of three."),
    ] = None,
    branches: Annotated[
        bool, typer.Option("--branches", help="A diagram in which no branch hides another, by path distance.")
    ] = False,
    next_order: NextOrder = False,
    tolerance: Tolerance = 1e-9,
    force: Force = False,
) -> None:
    """Draw the cell to scale in colour: mean and SD side by side, or the quantity that is asked for."""
    from cable.desk.figures.style import FIGURE_ENDINGS
    from cable.desk.files import output
    from cable.desk.messages import DeskError, choices, quoted
    from cable.desk.next_order import check_known, next_quantity
    from cable.desk.quantities import WITH_SITE, quantities, with_site
    from cable.desk.scenario import read_scenario
    from cable.desk.terminal import mention_findings, say_written

    if plane not in (None, "xy", "xz", "yz", "flat"):
        raise DeskError(f"--plane: found {quoted(plane)}, expected xy, xz, yz or flat; or leave it out")
    if branches and plane is not None:
        raise DeskError("--branches: the diagram lies in no plane; take out --plane or --branches")
    read = read_scenario(scenario)
    names = list(read.model.part_names)
    words = [quantity] if quantity else ["share"] if input_ else ["mean", "sd"]
    if quantity in WITH_SITE and not input_:
        if with_ is None:
            raise DeskError(
                f"--quantity {quantity}: needs --with SITE; the sites are {choices(read.model.site_names, 'and')}"
            )
        chosen = [with_site(quantity, read.site(with_))]
    else:
        if with_ is not None:
            raise DeskError("--with: goes with --quantity correlation, lag, source or charge-share; take it out")
        chosen = [q for word in words for q in quantities(word, input_ or [], names)]
    if next_order:
        chosen = [next_quantity(q) for q in chosen]
        check_known(read)
    target = output(out, FIGURE_ENDINGS, force, read.files)
    mention_findings(read)
    field = read.model.next_order(tolerance).field() if next_order else read.model.fluctuations(tolerance=tolerance)

    from cable.desk.figures.branches import draw_branches
    from cable.desk.figures.map import draw_map
    from cable.desk.figures.style import save, styled

    with styled():
        drawn = draw_branches(field, chosen, read.title) if branches else draw_map(field, chosen, plane, read.title)
        save(drawn, target, read.title)
    say_written(target.path)
