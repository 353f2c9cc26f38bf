"""Excursions as a table and as sentences."""

from __future__ import annotations

import math
from collections.abc import Sequence
from typing import TYPE_CHECKING, Any

from cable.desk.messages import shown
from cable.desk.tables import Table

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
    gaussian = _percent(one.share_above)
    share = f"{gaussian} of the time if Gaussian"
    if not math.isnan(above):
        share = f"{_percent(above)} of the time (Gaussian: {gaussian})"
    return f"{crossed}; it is above for {share}."


def _number(value: float, unit: str) -> str:
    return f"(undefined) {unit}" if math.isnan(value) else f"{value:.3g} {unit}"


def _percent(share: float) -> str:
    return f"{100 * share:.1f} %" if share >= 0.01 else f"{100 * share:.2g} %"
