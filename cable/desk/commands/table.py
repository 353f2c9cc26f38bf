"""`cablenoise table`: mean, SD and their company at every point, or at the named sites."""

from __future__ import annotations

from typing import Annotated

import typer

from cable.desk.commands.shared import Force, NextOrder, ScenarioArgument, Tolerance
from cable.desk.terminal import command


@command
def table(
    scenario: ScenarioArgument,
    out: Annotated[
        str | None, typer.Option(metavar="T.csv|.json|.npz", help="Every point of the cell, into this file.")
    ] = None,
    sites: Annotated[bool, typer.Option("--sites", help="The named sites only.")] = False,
    with_: Annotated[
        list[str] | None,
        typer.Option("--with", metavar="SITE", help="Add correlation with this site, and lag behind it; repeatable."),
    ] = None,
    next_order: NextOrder = False,
    tolerance: Tolerance = 1e-9,
    force: Force = False,
) -> None:
    """Mean, SD, correlation time and input resistance; without --out, the named sites on the terminal."""
    from cable.desk.files import output
    from cable.desk.messages import DeskError
    from cable.desk.next_order import check_known, next_sentences, trust, trust_of_next, with_next
    from cable.desk.progress import waiting
    from cable.desk.scenario import read_scenario
    from cable.desk.site_table import electrode_note, metadata, points_table, sites_table, with_correlations
    from cable.desk.tables import TABLE_ENDINGS, write_table
    from cable.desk.terminal import mention_findings, say_written
    from cable.desk.terminal_table import print_table

    read = read_scenario(scenario)
    partners = [read.site(name) for name in dict.fromkeys(with_ or [])]
    if partners and out is None:
        raise DeskError("--with: goes with --out; the correlations of the named sites are given by pair --all")
    target = output(out, TABLE_ENDINGS, force, read.files) if out is not None else None
    mention_findings(read)
    if next_order:
        check_known(read)
    with waiting("computing all points"):
        found = read.model.next_order(tolerance) if next_order else None
        field = found.linear if found else read.model.fluctuations(tolerance=tolerance)
    if target is None:
        notes = [*field.certificate.sentences(), field.variance_note, field.upcrossing_note, electrode_note(read.model)]
        notes += next_sentences(found) if found else [read.model.small_fluctuation().sentence()]
        named = with_next(sites_table(field), found, 0) if found else sites_table(field)
        print_table(named, list(field.variance_by_input_mV2), filter(None, notes), read.title)
        return
    whole = sites_table(field) if sites else points_table(field)
    whole = with_next(whole, found, 0 if sites else len(read.model.tree)) if found else whole
    shared = [read.model.correlation_map(name, tolerance) for name in partners]
    written = metadata(read, field)
    written["certificate"] |= trust(read.model) | (trust_of_next(found) if found else {})
    write_table(with_correlations(whole, shared, sites), target, written)
    say_written(target.path)
