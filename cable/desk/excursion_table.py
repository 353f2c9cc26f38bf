"""Excursions as a table and as sentences."""

from __future__ import annotations

import math
from collections.abc import Sequence
from typing import TYPE_CHECKING, Any

from cable.desk.messages import choices, percent, shown
from cable.desk.tables import Table
from cable.desk.terminal import console

if TYPE_CHECKING:
    from cable.noise.excursions import Excursions


def excursion_table(found: Sequence[Excursions], share: float) -> Table:
    """One row a site; `share` is the share of the time of the columns `exceeded_...`. Undefined numbers are NaN."""
    rows = [_row(one, share) for one in found]
    return Table({key: [row[key] for row in rows] for key in rows[0]})


def _row(one: Excursions, share: float) -> dict[str, Any]:
    between = one.between_upcrossings_s
    return {
        "site": one.site,
        "mean_mV": one.mean_mV,
        "sd_mV": one.sd_mV,
        "skewness": one.skewness,
        "excess_kurtosis": one.excess_kurtosis,
        "level_mV": one.level_mV,
        "level_sd": one.level_sd,
        "upcrossing_Hz": one.upcrossing_Hz,
        "between_upcrossings_s": between if math.isfinite(between) else math.nan,
        "share_above": one.share_above,
        "share_above_corrected": one.share_above_corrected,
        "exceeded_share": share,
        "exceeded_mV": one.exceeded_mV(share),
        "exceeded_corrected_mV": one.exceeded_corrected_mV(share),
    }


def excursion_about(found: Sequence[Excursions]) -> dict[str, Any]:
    """What a JSON table carries beside its rows: warnings by site, and the certificate."""
    errors = [one.cumulant_relative_error for one in found if not math.isnan(one.cumulant_relative_error)]
    return {
        "warnings": {one.site: list(one.warnings) for one in found},
        "certificate": {"cumulant_relative_error": max(errors, default=math.nan)},
    }


def print_excursions(found: Sequence[Excursions], share: float, title: str) -> None:
    """Several sites on the terminal: a row for each, then what is doubtful, said once for all it holds for."""
    from rich import box
    from rich.table import Table as Grid
    from rich.text import Text

    out, level = console(), found[0].level_mV
    grid = Grid(box=box.SIMPLE_HEAD, pad_edge=False)
    grid.add_column("site")
    above = [f"crossings of\n{level:g} mV, Hz", "time\nabove", "if\nGaussian"] if level is not None else []
    rare = [f"{percent(share)} above\nmV", "if Gaussian\nmV"]
    for heading in ("mean\nmV", "SD\nmV", "skewness", "excess\nkurtosis", *above, *rare):
        grid.add_column(heading, justify="right")
    for one in found:
        cells = [f"{one.mean_mV:.2f}", _cell(one.sd_mV, ".3f"), _cell(one.skewness, ".3f")]
        cells += [_cell(one.excess_kurtosis, ".3f")]
        if level is not None:
            cells += [_cell(one.upcrossing_Hz, ".3g"), *map(_share, (one.share_above_corrected, one.share_above))]
        cells += [_cell(value, ".2f") for value in (one.exceeded_corrected_mV(share), one.exceeded_mV(share))]
        grid.add_row(*(Text(cell) for cell in (shown(one.site, 60), *cells)))
    out.print(Text(shown(title), style="bold"))
    out.print(grid)
    sites: dict[str, list[str]] = {}
    for one in found:
        for warning in one.warnings:
            sites.setdefault(warning, []).append(shown(one.site, 60))
    for warning, names in sites.items():
        where = "All sites" if len(names) == len(found) else choices(names, "and")
        out.print(shown(f"{where}: {warning}.", 1000))


def excursion_sentences(one: Excursions, share: float) -> list[str]:
    """What the voltage does at one site, in words; the doubts come last."""
    told = [f"{shown(one.site, 60)}: {one.mean_mV:.2f} ± {_number(one.sd_mV, 'mV')}{_shape(one)}."]
    if one.level_mV is not None and not math.isnan(one.level_sd):
        told.append(_crossings(one))
    if one.sd_mV > 0:
        gaussian, corrected = one.exceeded_mV(share), one.exceeded_corrected_mV(share)
        known = not math.isnan(corrected)
        first = f"For {100 * share:.3g} % of the time it is above {corrected if known else gaussian:.2f} mV"
        told.append(f"{first} ({f'Gaussian: {gaussian:.2f} mV' if known else 'if Gaussian'}).")
    return told + [f"Note: {warning}." for warning in one.warnings]


def _shape(one: Excursions) -> str:
    if math.isnan(one.skewness):
        return ""
    return f", skewness {one.skewness:.3g}, excess kurtosis {one.excess_kurtosis:.3g}"


def _crossings(one: Excursions) -> str:
    level, above = f"{one.level_mV:g} mV", one.share_above_corrected
    crossed = f"It crosses {level} upwards {one.upcrossing_Hz:.3g} times a second"
    if math.isnan(one.upcrossing_Hz):
        crossed = f"How often it crosses {level} is undefined, as it is too rough"
    elif math.isfinite(one.between_upcrossings_s):
        crossed += f", on average once in {one.between_upcrossings_s:.3g} s"
    gaussian = percent(one.share_above)
    share = f"{gaussian} of the time if Gaussian"
    if not math.isnan(above):
        share = f"{percent(above)} of the time (Gaussian: {gaussian})"
    return f"{crossed}; it is above for {share}."


def _cell(value: float, style: str) -> str:
    return "undefined" if math.isnan(value) else format(value, style)


def _share(share: float) -> str:
    return "undefined" if math.isnan(share) else percent(share)


def _number(value: float, unit: str) -> str:
    return f"(undefined) {unit}" if math.isnan(value) else f"{value:.3g} {unit}"
