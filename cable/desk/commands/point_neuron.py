"""`cablenoise point-neuron`: the equivalent point neuron at a site."""

from __future__ import annotations

from typing import Annotated

import typer

from cable.desk.commands.shared import Force, ScenarioArgument
from cable.desk.terminal import command


@command
def point_neuron(
    scenario: ScenarioArgument,
    site: Annotated[str, typer.Argument(metavar="SITE", help="A site of the scenario.")] = "soma",
    out: Annotated[str | None, typer.Option(metavar="P.csv|.json|.npz", help="A table of one row.")] = None,
    force: Force = False,
) -> None:
    """The numbers of a single-compartment neuron that stands for the cell as seen from a site."""
    from cable.desk.files import output
    from cable.desk.messages import shown
    from cable.desk.next_order import trust
    from cable.desk.progress import waiting
    from cable.desk.scenario import read_scenario
    from cable.desk.site_table import origin
    from cable.desk.tables import TABLE_ENDINGS, Table, write_table
    from cable.desk.terminal import console, mention_findings, say_written

    read = read_scenario(scenario)
    name = read.site(site)
    target = output(out, TABLE_ENDINGS, force, read.files) if out is not None else None
    mention_findings(read)
    with waiting("fitting the autocovariance"):
        found = read.model.point_neuron(name)
    if target is not None:
        about = {**origin(read), "certificate": trust(read.model, (name,))}
        write_table(Table({key: [value] for key, value in found.as_dict().items()}), target, about)
        say_written(target.path)
        return
    told = [
        f"{shown(name, 60)}: {found.mean_mV:.2f} ± {found.sd_mV:.3g} mV, correlation time "
        f"{found.correlation_time_ms:.3g} ms.",
        f"Membrane: {found.input_resistance_MOhm:.4g} MΩ, {found.capacitance_pF:.4g} pF, time constant "
        f"{found.time_constant_ms:.3g} ms; capacitance over conductance of the whole cell "
        f"{found.cell_time_constant_ms:.3g} ms.",
        f"Autocovariance: {found.slow_weight:.3g} of exp(-t/{found.slow_ms:.3g} ms) and {1 - found.slow_weight:.3g} of "
        f"exp(-t/{found.fast_ms:.3g} ms); the fit errs by at most {found.fit_error:.1g} of the variance.",
    ]
    if not found.sd_mV > 0:
        reason = "nothing fluctuates" if found.sd_mV == 0 else read.model.fluctuations().variance_note
        told = [f"{shown(name, 60)}: {found.mean_mV:.2f} mV; no autocovariance: {reason}.", told[1]]
    for sentence in filter(None, (*told, read.model.small_fluctuation((name,)).sentence())):
        console().print(sentence, markup=False)
