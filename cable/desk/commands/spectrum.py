"""`cablenoise spectrum`: one electrode by frequency."""

from __future__ import annotations

from typing import Annotated

import typer

from cable.desk.commands.shared import Force, NextOrder, ScenarioArgument, SiteArgument
from cable.desk.terminal import command


@command
def spectrum(
    scenario: ScenarioArgument,
    site: SiteArgument,
    out: Annotated[
        str | None, typer.Option(metavar="S.csv|.json|.npz|.png|.svg|.pdf", help="A table or a figure.")
    ] = None,
    from_Hz: Annotated[float, typer.Option("--from-Hz", help="Lowest frequency.")] = 0.1,
    to_Hz: Annotated[float, typer.Option("--to-Hz", help="Highest frequency.")] = 1000.0,
    points: Annotated[int, typer.Option(min=2, max=5000, help="Frequencies, evenly spaced in the logarithm.")] = 61,
    to: Annotated[str | None, typer.Option(metavar="SITE", help="Add the transfer impedance to this site.")] = None,
    temperature_C: Annotated[
        float | None, typer.Option("--temperature-C", metavar="X", help="Add the cell's thermal noise at this.")
    ] = None,
    next_order: NextOrder = False,
    force: Force = False,
) -> None:
    """Power spectral density of the voltage at a site, in all and by input, and its input impedance."""
    import numpy as np

    from cable.desk.files import output
    from cable.desk.messages import DeskError
    from cable.desk.next_order import check_known, next_psd_sentence, trust
    from cable.desk.scenario import read_scenario
    from cable.desk.site_table import origin
    from cable.desk.spectrum_table import spectrum_sentences, spectrum_table
    from cable.desk.tables import TABLE_ENDINGS, write_table
    from cable.desk.terminal import console, mention_findings, say_written

    if not 0 < from_Hz < to_Hz < 1e7:
        raise DeskError(
            f"--from-Hz, --to-Hz: found {from_Hz:g} to {to_Hz:g}, expected 0 < from < to < 1e7; choose another range"
        )
    if temperature_C is not None and not -273.15 < temperature_C < 1e3:
        raise DeskError(f"--temperature-C: found {temperature_C:g}, expected degrees Celsius, such as 36; correct it")
    read = read_scenario(scenario)
    names = read.site(site), None if to is None else read.site(to)
    endings = (*TABLE_ENDINGS, ".png", ".svg", ".pdf")
    target = output(out, endings, force, read.files) if out is not None else None
    if next_order:
        check_known(read)
    mention_findings(read)
    found = read.model.spectrum(names[0], np.geomspace(from_Hz, to_Hz, points), names[1])
    after = read.model.next_psd(names[0], found.frequency_Hz) if next_order else None
    if target is None:
        last = read.model.small_fluctuation((names[0],)).sentence()
        last = last if after is None else next_psd_sentence(found, after)
        for sentence in filter(None, (*spectrum_sentences(found, temperature_C), last)):
            console().print(sentence, markup=False)
        return
    if target.ending in TABLE_ENDINGS:
        about = {"site": site, "slope": found.slope, "certificate": trust(read.model, (names[0],))}
        write_table(spectrum_table(found, temperature_C, after), target, {**origin(read), **about})
    else:
        from cable.desk.figures.spectrum import draw_spectrum
        from cable.desk.figures.style import save, styled

        with styled():
            save(draw_spectrum(found, read.title, temperature_C, after), target, read.title)
    say_written(target.path)
