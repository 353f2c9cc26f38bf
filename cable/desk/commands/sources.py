"""`cablenoise sources`: which synapses make what is seen at a site."""

from __future__ import annotations

from typing import Annotated

import typer

from cable.desk.commands.shared import Force, ScenarioArgument, SiteArgument, Tolerance
from cable.desk.terminal import command


@command
def sources(
    scenario: ScenarioArgument,
    site: SiteArgument,
    out: Annotated[
        str | None, typer.Option(metavar="C.csv|.json|.npz|.png|.svg|.pdf", help="A table or a figure.")
    ] = None,
    tolerance: Tolerance = 1e-9,
    force: Force = False,
) -> None:
    """Shares of the variance at a site by cylinder, input, kind and distance."""
    from cable.desk.files import output
    from cable.desk.next_order import trust
    from cable.desk.scenario import read_scenario
    from cable.desk.site_table import origin
    from cable.desk.source_table import source_sentences, source_summary, source_table
    from cable.desk.tables import TABLE_ENDINGS, write_table
    from cable.desk.terminal import console, mention_findings, say_written

    read = read_scenario(scenario)
    name = read.site(site)
    target = output(out, (*TABLE_ENDINGS, ".png", ".svg", ".pdf"), force, read.files) if out is not None else None
    mention_findings(read)
    found = read.model.sources(name, tolerance)
    if target is None:
        for sentence in filter(None, (*source_sentences(found), read.model.small_fluctuation((name,)).sentence())):
            console().print(sentence, markup=False)
        return
    if target.ending in TABLE_ENDINGS:
        about = {**origin(read), **source_summary(found)}
        about["certificate"] = {**about.get("certificate", {}), **trust(read.model, (name,))}
        write_table(source_table(found), target, about)
    else:
        from cable.desk.figures.sources import draw_sources
        from cable.desk.figures.style import save, styled

        with styled():
            save(draw_sources(found, read.title), target, read.title)
    say_written(target.path)
