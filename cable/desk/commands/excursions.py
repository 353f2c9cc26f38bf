"""`cablenoise excursions`: how skewed the voltage is at sites, and how often it goes beyond a level."""

from __future__ import annotations

from typing import Annotated

import typer

from cable.desk.commands.shared import Force, ScenarioArgument, Tolerance
from cable.desk.terminal import command


@command
def excursions(
    scenario: ScenarioArgument,
    sites: Annotated[
        list[str] | None,
        typer.Argument(metavar="SITE", help="Sites of the scenario; all of them if none is named."),
    ] = None,
    level: Annotated[
        float | None, typer.Option("--level-mV", metavar="X", help="The level; the scenario's threshold if not given.")
    ] = None,
    share: Annotated[
        float, typer.Option(min=1e-9, max=0.5, help="Share of the time for which a level is to be told.")
    ] = 0.01,
    out: Annotated[
        str | None,
        typer.Option(metavar="E.csv|.json|.npz|.png|.svg|.pdf", help="A table, one row a site, or a figure."),
    ] = None,
    tolerance: Tolerance = 1e-9,
    force: Force = False,
) -> None:
    """Skewness and kurtosis, crossings of a level, time above it, and the level exceeded for a share of the time."""
    import math

    from cable.desk.excursion_table import excursion_about, excursion_sentences, excursion_table, print_excursions
    from cable.desk.files import output
    from cable.desk.messages import DeskError, shown
    from cable.desk.next_order import trust
    from cable.desk.progress import waiting
    from cable.desk.scenario import read_scenario
    from cable.desk.site_table import origin
    from cable.desk.tables import TABLE_ENDINGS, write_table
    from cable.desk.terminal import console, mention_findings, say_written

    read = read_scenario(scenario)
    names = tuple(dict.fromkeys(read.site(name) for name in sites)) if sites else read.model.site_names
    if level is not None and not math.isfinite(level):
        raise DeskError(f"--level-mV: found {level:g}, expected a finite number of mV; correct it")
    if not math.isfinite(share):
        raise DeskError(f"--share: found {share:g}, expected a number above 0 and up to 0.5; correct it")
    target = output(out, (*TABLE_ENDINGS, ".png", ".svg", ".pdf"), force, read.files) if out is not None else None
    mention_findings(read)
    with waiting("following events in time"):
        found = read.model.excursions(names, level, tolerance)
    if target is not None:
        if target.ending in TABLE_ENDINGS:
            about = {**origin(read), **excursion_about(found)}
            about["certificate"] |= trust(read.model, names)
            write_table(excursion_table(found, share), target, about)
        else:
            from cable.desk.figures.excursions import draw_excursions
            from cable.desk.figures.style import save, styled

            with styled():
                save(draw_excursions(found, read.title), target, read.title)
        say_written(target.path)
        return
    if len(found) > 1:
        print_excursions(found, share, read.title)
    else:
        for sentence in excursion_sentences(found[0], share):
            console().print(shown(sentence, 1000), markup=False)
    errors = [one.cumulant_relative_error for one in found if not math.isnan(one.cumulant_relative_error)]
    if errors:
        console().print(f"Skewness and kurtosis are exact to about {max(errors):.0e} of them.", markup=False)
    if doubt := read.model.small_fluctuation(names).sentence():
        console().print(doubt, markup=False)
    if found[0].level_mV is None:
        told = "No level was given: ask with --level-mV X, or put [threshold] level_mV into the scenario."
        console().print(told, markup=False)
