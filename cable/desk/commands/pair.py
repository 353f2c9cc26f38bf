"""`cablenoise pair`: what two electrodes share."""

from __future__ import annotations

from typing import Annotated

import typer

from cable.desk.commands.shared import Force, NextOrder, ScenarioArgument, Tolerance
from cable.desk.terminal import command


@command
def pair(
    scenario: ScenarioArgument,
    site: Annotated[str | None, typer.Argument(metavar="SITE", help="The first site.")] = None,
    other: Annotated[str | None, typer.Argument(metavar="SITE", help="The second site.")] = None,
    all_: Annotated[bool, typer.Option("--all", help="Correlations between all sites instead.")] = False,
    out: Annotated[
        str | None, typer.Option(metavar="C.json|.csv|.npz|.png|.svg|.pdf", help="A table or a figure.")
    ] = None,
    lag_ms: Annotated[
        float | None, typer.Option("--lag-ms", help="Largest lag; 5 membrane time constants unless given.")
    ] = None,
    next_order: NextOrder = False,
    tolerance: Tolerance = 1e-9,
    force: Force = False,
) -> None:
    """Covariance against lag, correlation, coherence and phase of two sites; or the correlations of all sites."""
    from cable.desk.files import output
    from cable.desk.messages import DeskError, choices
    from cable.desk.next_order import check_known, next_pair_sentence, pair_columns, trust
    from cable.desk.pair_table import matrix_table, pair_document, pair_sentences, pair_table, study_pair
    from cable.desk.scenario import read_scenario
    from cable.desk.site_table import origin
    from cable.desk.tables import TABLE_ENDINGS, to_json, write_table
    from cable.desk.terminal import console, mention_findings, say_written

    read = read_scenario(scenario)
    known = choices(read.model.site_names, "and")
    if all_ and site is not None:
        raise DeskError("--all: takes no site; leave the sites out, or --all")
    if all_ and lag_ms is not None:
        raise DeskError("--lag-ms: goes with two sites; --all gives correlations at lag 0; take one of them out")
    if all_ and next_order:
        raise DeskError("--next-order: goes with two sites, found it with --all; take one of them out")
    if not all_ and (site is None or other is None):
        raise DeskError(f"pair: needs two sites, or --all; the sites are {known}")
    if lag_ms is not None and not 0 < lag_ms < 1e6:
        raise DeskError(f"--lag-ms: found {lag_ms:g}, expected more than 0 and less than 1e6")
    target = output(out, (*TABLE_ENDINGS, ".png", ".svg", ".pdf"), force, read.files) if out is not None else None
    if next_order:
        check_known(read)
    mention_findings(read)
    if all_:
        matrix = read.model.correlation_matrix(tolerance)
        table = matrix_table(read.model.site_names, matrix)
        if target is None:
            from cable.desk.terminal_table import print_matrix

            print_matrix(read.model.site_names, matrix.tolist(), read.title)
            return
        if target.ending in TABLE_ENDINGS:
            write_table(table, target, origin(read))
        else:
            from cable.desk.figures.matrix import draw_matrix
            from cable.desk.figures.style import save, styled

            with styled():
                save(draw_matrix(read.model.site_names, matrix, read.title), target, read.title)
        say_written(target.path)
        return
    found = study_pair(read.model, read.site(site or ""), read.site(other or ""), lag_ms, tolerance)
    after = read.model.next_pair(found) if next_order else None
    certificate = trust(read.model, found.sites)
    if target is None:
        last = next_pair_sentence(after) if after else certificate["small_fluctuation"]["sentence"]
        for sentence in filter(None, (*pair_sentences(found), last)):
            console().print(sentence, markup=False)
        return
    if target.ending == ".json":
        with target.writing(text=True) as stream:
            document = {**origin(read), **pair_document(found), **(pair_columns(after) if after else {})}
            document["certificate"] |= certificate
            stream.write(to_json(document))
    elif target.ending in TABLE_ENDINGS:
        write_table(
            pair_table(found, after), target, {**origin(read), "sites": found.sites, "certificate": certificate}
        )
    else:
        from cable.desk.figures.pair import draw_pair
        from cable.desk.figures.style import save, styled

        with styled():
            save(draw_pair(found, read.title, after), target, read.title)
    say_written(target.path)
