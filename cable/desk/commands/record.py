"""`cablenoise record`: what an electrode records, and how long it must."""

from __future__ import annotations

from typing import Annotated

import typer

from cable.desk.commands.shared import Force, ScenarioArgument, Tolerance
from cable.desk.terminal import command


@command
def record(
    scenario: ScenarioArgument,
    site: Annotated[
        str | None, typer.Argument(metavar="SITE", help="The electrode's site; needed where there are several.")
    ] = None,
    out: Annotated[
        str | None, typer.Option(metavar="R.csv|.json|.npz|.png|.svg|.pdf", help="A table or a figure.")
    ] = None,
    seconds: Annotated[float | None, typer.Option(help="The length of a record whose errors are wanted.")] = None,
    wanted_error: Annotated[
        float, typer.Option("--wanted-error", help="The relative standard error that a record shall reach.")
    ] = 0.05,
    with_: Annotated[
        str | None, typer.Option("--with", metavar="SITE", help="Add the correlation with the record at this site.")
    ] = None,
    charge: Annotated[
        bool, typer.Option("--charge", help="One row a point: the share of its charge that a voltage clamp sees.")
    ] = False,
    from_Hz: Annotated[float, typer.Option("--from-Hz", help="Lowest frequency.")] = 0.1,
    to_Hz: Annotated[float, typer.Option("--to-Hz", help="Highest frequency.")] = 10000.0,
    points: Annotated[int, typer.Option(min=2, max=5000, help="Frequencies, evenly spaced in the logarithm.")] = 76,
    tolerance: Tolerance = 1e-9,
    force: Force = False,
) -> None:
    """SD and spectrum as recorded beside the true ones, and how long to record for a wanted error."""
    import numpy as np

    from cable.desk.files import output
    from cable.desk.messages import DeskError, choices, quoted
    from cable.desk.next_order import trust
    from cable.desk.progress import waiting
    from cable.desk.record_table import charge_table, record_document, record_sentences, record_table, study_record
    from cable.desk.scenario import read_scenario
    from cable.desk.site_table import origin
    from cable.desk.tables import TABLE_ENDINGS, to_json, write_table
    from cable.desk.terminal import console, mention_findings, say_written

    if not 0 < from_Hz < to_Hz < 1e7:
        raise DeskError(
            f"--from-Hz, --to-Hz: found {from_Hz:g} to {to_Hz:g}, expected 0 < from < to < 1e7; choose another range"
        )
    if not 0 < wanted_error < 1:
        raise DeskError(f"--wanted-error: found {wanted_error:g}, expected a fraction between 0 and 1, such as 0.05")
    if seconds is not None and not 0 < seconds < 1e9:
        raise DeskError(f"--seconds: found {seconds:g}, expected more than 0 and less than 1e9")
    read = read_scenario(scenario)
    placed = [one.site for one in read.model.electrodes]
    if site is None and len(placed) != 1:
        known = choices([quoted(name) for name in (placed or read.model.site_names)], "and")
        have = f"has electrodes at {known}" if placed else f"has no [[electrode]]; its sites are {known}"
        raise DeskError(f"record: needs a SITE, as the scenario {have}; name one")
    here = placed[0] if site is None else read.site(site)
    if charge and not read.model.electrode_at(here).clamps:
        raise DeskError(f"--charge: the electrode at {quoted(here)} is no voltage clamp; leave --charge out")
    if charge and out is None:
        raise DeskError("--charge: needs --out, the file for one row a point")
    endings = TABLE_ENDINGS if charge else (*TABLE_ENDINGS, ".png", ".svg", ".pdf")
    target = output(out, endings, force, read.files) if out is not None else None
    other = None if with_ is None else read.site(with_)
    mention_findings(read)
    if charge and target is not None:
        shares = read.model.clamp_shares(here, tolerance)
        write_table(charge_table(read.model, shares), target, {**origin(read), "site": here})
        say_written(target.path)
        return
    frequency = np.geomspace(from_Hz, to_Hz, points)
    with waiting("computing the record"):
        study = study_record(read.model, here, other, frequency, wanted_error, seconds, tolerance)
    if target is None:
        for sentence in filter(None, (*record_sentences(study), read.model.small_fluctuation((here,)).sentence())):
            console().print(sentence, markup=False)
        return
    if target.ending == ".json":
        with target.writing(text=True) as stream:
            document = {**origin(read), **record_document(study)}
            document["certificate"] |= trust(read.model, (here,))
            stream.write(to_json(document))
    elif target.ending in TABLE_ENDINGS:
        write_table(record_table(study), target, {**origin(read), "site": here, "mode": study.recording.electrode.mode})
    else:
        from cable.desk.figures.record import draw_record
        from cable.desk.figures.style import save, styled

        with styled():
            save(draw_record(study, read.title), target, read.title)
    say_written(target.path)
