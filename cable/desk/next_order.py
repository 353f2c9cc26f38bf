"""The option --next-order, and what every answer says about small fluctuations: as columns, sentences and JSON."""

from __future__ import annotations

from dataclasses import replace
from typing import TYPE_CHECKING, Any

import numpy as np
from numpy.typing import NDArray

from cable.desk.messages import DeskError, choices, shown
from cable.desk.tables import Table

if TYPE_CHECKING:
    from cable.desk.quantities import Quantity
    from cable.desk.scenario import Scenario
    from cable.noise.beyond.next_order import NextOrder
    from cable.noise.beyond.next_pair import NextPair
    from cable.noise.model import CableModel
    from cable.noise.spectra import Spectrum

QUANTITIES = ("mean", "sd", "variance")
SMALL = 1e-3  # relative change of an SD that is told as none


def next_order(read: Scenario, tolerance: float) -> NextOrder:
    """The next order of a scenario.

    Raises:
        DeskError: it is not known for this scenario.
    """
    check_known(read)
    return read.model.next_order(tolerance)


def check_known(read: Scenario) -> None:
    """Raise DeskError where the next order is not known for a scenario."""
    from cable.noise.beyond.next_order import NotKnown, check_known

    try:
        check_known(read.model)
    except NotKnown as error:
        raise DeskError(f"--next-order: {shown(str(error), 400)}") from None


def with_next(table: Table, found: NextOrder, points: int) -> Table:
    """A site table with the next order's mean and SD behind the linear SD; `points` rows of the tree come first.

    Where a table has fewer rows of the tree than the tree has points, its column `swc_id` tells which.
    """
    tree = found.linear.model.tree
    row = {int(swc_id): k for k, swc_id in enumerate(tree.ids)}
    rows = [row[int(swc_id)] for swc_id in table.columns["swc_id"][:points]]
    sites = [found.at_sites[str(name)] for name in table.columns["site"][points:]]
    mean = np.r_[found.mean_mV[rows], [one[0] for one in sites]]
    sd = np.r_[found.sd_mV[rows], [one[1] for one in sites]]
    columns: dict[str, Any] = {}
    for key, column in table.columns.items():
        columns[key] = column
        if key == "sd_mV":
            columns |= {"mean_next_mV": mean, "sd_next_mV": sd}
    return Table(columns)


def next_quantity(one: Quantity) -> Quantity:
    """A quantity whose values are to the next order.

    Raises:
        DeskError: one that the next order does not give.
    """
    if one.word not in QUANTITIES:
        raise DeskError(f"--next-order: goes with --quantity {choices(QUANTITIES)}, found {one.word!r}; take one out")
    return replace(one, label=one.label.replace(" (", ", next order ("))


def trust(model: CableModel, sites: tuple[str, ...] | None = None) -> dict[str, Any]:
    """What the certificate of a file says about small fluctuations at sites (all of them unless named)."""
    found = model.small_fluctuation(sites)
    return {"small_fluctuation": {**found.as_dict(), "sentence": found.sentence()}}


def trust_of_next(found: NextOrder) -> dict[str, Any]:
    """What the certificate of a file says about the next order."""
    return {
        "next_order": {
            "relative_error": found.relative_error,
            "sd_relative_change": {name: found.sd_change(name) for name in found.at_sites},
            "warnings": list(found.warnings),
            "sentences": next_sentences(found),
        }
    }


def next_sentences(found: NextOrder, sites: tuple[str, ...] | None = None) -> list[str]:
    """What the next order changes at sites (all of them unless named), and how far that can be trusted."""
    names = tuple(found.at_sites) if sites is None else sites
    changes = [found.sd_change(name) for name in names]
    known = [k for k, change in enumerate(changes) if np.isfinite(change)]
    if not known:
        return []
    k = max(known, key=lambda i: abs(changes[i]))
    change, name = changes[k], shown(names[k], 60)
    if abs(change) < SMALL:
        told = "To the next order no SD changes by more than 0.1 %"
    else:
        told = f"To the next order the SD at {name} is {100 * abs(change):.2g} % {'lower' if change < 0 else 'higher'}"
    left = found.left_over(names[k])
    told += (
        f", computed to {100 * found.relative_error_at[names[k]]:.1g} % of the variance; "
        f"orders beyond it may bring {left:.1g} %."
    )
    return [told, *(f"Note: {shown(one, 300)}." for one in found.warnings)]


def pair_columns(found: NextPair) -> dict[str, Any]:
    """What a pair's document gains."""
    return {
        "correlation_next": found.correlation,
        "covariance_next_mV2": found.covariance_mV2,
        "coherence_next": found.coherence,
        "phase_next_rad": found.phase_rad,
    }


def next_pair_sentence(found: NextPair) -> str:
    """What the next order changes for a pair."""
    return f"To the next order their correlation is {found.correlation:.4f}."


def next_psd_sentence(found: Spectrum, after: NDArray[np.float64]) -> str:
    """What the next order changes in a spectrum."""
    change = after[0] / found.psd_mV2_per_Hz[0] - 1 if found.psd_mV2_per_Hz[0] > 0 else 0.0
    way = "lower" if change < 0 else "higher"
    return f"To the next order the density at {found.frequency_Hz[0]:g} Hz is {100 * abs(change):.2g} % {way}."
