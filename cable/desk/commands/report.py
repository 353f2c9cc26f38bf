"""`cablenoise report`: one HTML file to look at, and to send."""

from __future__ import annotations

from typing import Annotated

import typer

from cable.desk.commands.shared import Force, ScenarioArgument, Tolerance
from cable.desk.terminal import command


@command
def report(
    scenario: ScenarioArgument,
    out: Annotated[str, typer.Option(metavar="R.html", help="The report.")],
    tolerance: Tolerance = 1e-9,
    force: Force = False,
) -> None:
    """Write one HTML file with the map, curves, table and certificate; it needs a browser and no network."""
    from cable.desk.files import output
    from cable.desk.progress import progress
    from cable.desk.report.page import ENDINGS, render
    from cable.desk.scenario import read_scenario
    from cable.desk.terminal import mention_findings, say_written

    read = read_scenario(scenario)
    target = output(out, ENDINGS, force, read.files)
    mention_findings(read)
    with progress("report") as tell:
        text = render(read.model.fluctuations(tolerance=tolerance), read, target.path.name, tell)
    with target.writing(text=True) as stream:
        stream.write(text)
    say_written(target.path)
