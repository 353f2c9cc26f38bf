"""`cablenoise along`: the profile on the way from the soma to a site."""

from __future__ import annotations

from typing import Annotated

import typer

from cable.desk.commands.shared import Force, NextOrder, Quantity, ScenarioArgument, ShareInput, SiteArgument, Tolerance
from cable.desk.terminal import command

ROWS_ON_TERMINAL = 25


@command
def along(
    scenario: ScenarioArgument,
    site: SiteArgument,
    out: Annotated[
        str | None, typer.Option(metavar="P.csv|.json|.npz|.png|.svg|.pdf", help="A table or a figure.")
    ] = None,
    quantity: Quantity = None,
    input_: ShareInput = None,
    next_order: NextOrder = False,
    tolerance: Tolerance = 1e-9,
    force: Force = False,
) -> None:
    """Profile along the path from the soma to a site: a table, or mean ± SD and a quantity as a figure."""
    from cable.desk.files import output
    from cable.desk.next_order import check_known, next_quantity, next_sentences, trust, trust_of_next, with_next
    from cable.desk.path import way_table, way_to_site
    from cable.desk.quantities import quantities
    from cable.desk.scenario import read_scenario
    from cable.desk.site_table import metadata
    from cable.desk.tables import TABLE_ENDINGS, write_table
    from cable.desk.terminal import mention_findings, say_written
    from cable.desk.terminal_table import print_table, thinned

    read = read_scenario(scenario)
    way = way_to_site(read.model, read.site(site))
    names = list(read.model.part_names)
    chosen = quantities(quantity or ("share" if input_ else "sd"), input_ or [], names)[0]
    endings = (*TABLE_ENDINGS, ".png", ".svg", ".pdf")
    target = output(out, endings, force, read.files) if out is not None else None
    if next_order:
        chosen = next_quantity(chosen) if target is not None and target.ending not in TABLE_ENDINGS else chosen
        check_known(read)
    mention_findings(read)
    found = read.model.next_order(tolerance) if next_order else None
    field = found.linear if found else read.model.fluctuations(tolerance=tolerance)
    table = way_table(field, way)
    table = with_next(table, found, len(way.rows)) if found else table
    ends = ("soma", site)
    if target is None:
        beyond = next_sentences(found, ends) if found else [read.model.small_fluctuation(ends).sentence()]
        notes = filter(None, [*field.certificate.sentences(), field.variance_note, *beyond])
        print_table(thinned(table, ROWS_ON_TERMINAL), names, notes, read.title)
        return
    if target.ending in TABLE_ENDINGS:
        written = {**metadata(read, field), "along": site}
        written["certificate"] |= trust(read.model, ends) | (trust_of_next(found) if found else {})
        write_table(table, target, written)
    else:
        from cable.desk.figures.along import draw_along
        from cable.desk.figures.style import save, styled

        with styled():
            save(draw_along(found.field() if found else field, way, chosen, read.title), target, read.title)
    say_written(target.path)
