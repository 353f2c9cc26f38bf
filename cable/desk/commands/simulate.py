"""`cablenoise simulate`: a stochastic simulation of the scenario beside what is computed for it."""

from __future__ import annotations

from typing import Annotated

import typer

from cable.desk.commands.shared import Force, ScenarioArgument
from cable.desk.terminal import INTERRUPTED, command


@command
def simulate(
    scenario: ScenarioArgument,
    seconds: Annotated[float, typer.Option(metavar="X", help="Simulated time, all runs together.")] = 60.0,
    seed: Annotated[int, typer.Option(min=0, help="Of the random numbers.")] = 1,
    frozen: Annotated[
        bool, typer.Option("--frozen", help="Keep the driving force of the mean state, as linear theory has it.")
    ] = False,
    out: Annotated[str | None, typer.Option(metavar="Z.json|.csv|.npz", help="One row a site.")] = None,
    figure: Annotated[
        str | None, typer.Option(metavar="F.png|.svg|.pdf", help="A stretch of voltage, and its histogram.")
    ] = None,
    traces: Annotated[str | None, typer.Option(metavar="V.npz|.csv|.json", help="Voltages of the first run.")] = None,
    trace_seconds: Annotated[float, typer.Option(metavar="X", help="How much of them.")] = 1.0,
    runs: Annotated[int, typer.Option(min=1, max=1000, help="Independent runs.")] = 4,
    processes: Annotated[
        int | None, typer.Option(min=1, max=256, help="Processes at once; else one a processor.")
    ] = None,
    dt_ms: Annotated[
        float | None, typer.Option("--dt-ms", metavar="X", help="Time step; chosen from its error unless given.")
    ] = None,
    force: Force = False,
) -> None:
    """Simulate real events and full conductances; mean, SD, correlations and skewness beside the computed ones."""
    import math

    from cable.desk.files import output
    from cable.desk.messages import DeskError, shown
    from cable.desk.progress import progress
    from cable.desk.scenario import read_scenario
    from cable.desk.simulation_table import print_simulation, simulation_document, simulation_table, trace_table
    from cable.desk.site_table import origin
    from cable.desk.tables import TABLE_ENDINGS, to_json, write_table
    from cable.desk.terminal import mention_findings, say, say_written
    from cable.simulation.simulation import simulate as simulate_model

    for name, value in (("--seconds", seconds), ("--trace-seconds", trace_seconds), ("--dt-ms", dt_ms)):
        if value is not None and not (math.isfinite(value) and value > 0):
            raise DeskError(f"{name}: found {value:g}, expected a number above 0; correct it")
    read = read_scenario(scenario)
    asked = ((out, TABLE_ENDINGS), (figure, (".png", ".svg", ".pdf")), (traces, TABLE_ENDINGS))
    table, drawing, voltages = (
        output(path, endings, force, read.files) if path is not None else None for path, endings in asked
    )
    mention_findings(read)
    if read.model.electrodes:
        say("the simulation leaves the electrodes out, and so does what it is compared with")
    try:
        with progress("simulating") as tell:
            found = simulate_model(read.model, seconds, seed, frozen, runs, processes, dt_ms, trace_seconds, tell)
    except ValueError as error:
        raise DeskError(shown(error, 1000)) from None
    about = {**origin(read), **simulation_document(found)}
    if table is not None:
        if table.ending == ".json":
            with table.writing(text=True) as stream:
                stream.write(to_json(about))
        else:
            write_table(simulation_table(found), table, about)
        say_written(table.path)
    if drawing is not None:
        from cable.desk.figures.style import save, styled
        from cable.desk.figures.trace import draw_trace

        with styled():
            save(draw_trace(found, read.title), drawing, read.title)
        say_written(drawing.path)
    if voltages is not None:
        write_table(trace_table(found), voltages, origin(read))
        say_written(voltages.path)
    if table is None:
        print_simulation(found, read.title)
    if found.interrupted:
        raise typer.Exit(INTERRUPTED)
