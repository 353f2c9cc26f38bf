"""The table of the cell: one row a point, or one row a named site, with the answers as columns."""

from __future__ import annotations

from collections.abc import Sequence
from typing import TYPE_CHECKING, Any

import numpy as np
from numpy.typing import NDArray

from cable.desk.messages import choices, version
from cable.desk.tables import Column, Table
from morphology import kind_name

if TYPE_CHECKING:
    from cable.desk.scenario import Scenario
    from cable.noise.correlation import CorrelationMap
    from cable.noise.fluctuations import Fluctuations
    from cable.noise.model import CableModel

Rows = NDArray[np.int64]


def origin(scenario: Scenario) -> dict[str, Any]:
    """Where a result comes from: scenario, its hash, and the version."""
    return {
        "title": scenario.title,
        "scenario": scenario.path.name,
        "scenario_sha256": scenario.sha256,
        "version": version(),
    }


def metadata(scenario: Scenario, field: Fluctuations) -> dict[str, Any]:
    """What a site table must carry to be trusted later: its origin and its certificate."""
    return {
        **origin(scenario),
        "threshold_mV": scenario.model.threshold_mV,
        "upcrossing_note": field.upcrossing_note,
        "variance_note": field.variance_note,
        "electrode_note": electrode_note(scenario.model),
        "certificate": field.certificate.as_dict(),
    }


def electrode_note(model: CableModel) -> str:
    """A sentence which says that electrodes load the cell; "" where there is none."""
    if not model.electrodes:
        return ""
    places = choices([f"{one.site} ({one.mode})" for one in model.electrodes], "and")
    return f"The cell is loaded by its electrodes at {places}; see `record` for the cell without them."


def point_of_site(model: CableModel, name: str) -> int | None:
    """The row of the point on which a site lies exactly; None where it lies between two points."""
    tree = model.tree
    place = model.site_places[name]
    if place.fraction == 1.0:
        return place.row
    return int(tree.parent[place.row]) if place.fraction == 0.0 and place.row else None


def points_table(field: Fluctuations, rows: Rows | None = None) -> Table:
    """One row for each point of the cell (or of `rows`), in the order of the tree.

    The column `site` names the site that lies exactly on a point. A site between two points, and a second
    site on one point, has a row of its own after all points (not where `rows` are given); the SWC id of a
    site between two points is that of the farther one.
    """
    model, tree = field.model, field.model.tree
    chosen = np.arange(len(tree)) if rows is None else rows
    names, extra = np.full(len(tree), "", dtype=object), []
    for name in model.site_names:
        row = point_of_site(model, name)
        if row is None or names[row]:
            extra.append(name)
        else:
            names[row] = name
    x, y, z = tree.xyz_um[chosen].T
    columns: dict[str, Column] = {
        "swc_id": tree.ids[chosen],
        "site": names[chosen].tolist(),
        "kind": [kind_name(k) for k in tree.kinds[chosen].tolist()],
        "x_um": x,
        "y_um": y,
        "z_um": z,
        "radius_um": tree.radius_um[chosen],
        "path_um": tree.path_um[chosen],
        "branch_order": tree.branch_order[chosen],
        "mean_mV": field.mean_mV[chosen],
        "sd_mV": field.sd_mV[chosen],
        "variance_mV2": field.variance_mV2[chosen],
        **{f"variance_{n}_mV2": v[chosen] for n, v in field.variance_by_input_mV2.items()},
        "correlation_time_ms": field.correlation_time_ms[chosen],
        "input_resistance_MOhm": field.input_resistance_MOhm[chosen],
    }
    if field.upcrossing_Hz is not None:
        columns["upcrossing_Hz"] = field.upcrossing_Hz[chosen]
    return Table(columns) if rows is not None else joined(Table(columns), sites_table(field, extra))


def sites_table(field: Fluctuations, names: list[str] | None = None) -> Table:
    """One row for each named site (all of them, the soma first, unless `names` are given)."""
    columns: dict[str, list[Any]] = {}
    for name in field.model.site_names if names is None else names:
        for key, value in _site_row(field, name).items():
            columns.setdefault(key, []).append(value)
    return Table(columns)


def _site_row(field: Fluctuations, name: str) -> dict[str, Any]:
    s = field.at(name)
    x, y, z = (float(v) for v in s.xyz_um)
    row = {
        "swc_id": int(s.swc_id),
        "site": name,
        "kind": s.kind,
        "x_um": x,
        "y_um": y,
        "z_um": z,
        "radius_um": float(s.radius_um),
        "path_um": float(s.path_um),
        "branch_order": int(s.branch_order),
        "mean_mV": float(s.mean_mV),
        "sd_mV": float(s.sd_mV),
        "variance_mV2": float(s.variance_mV2),
        **{f"variance_{n}_mV2": float(v) for n, v in s.variance_by_input_mV2.items()},
        "correlation_time_ms": float(s.correlation_time_ms),
        "input_resistance_MOhm": float(s.input_resistance_MOhm),
    }
    if s.upcrossing_Hz is not None:
        row["upcrossing_Hz"] = float(s.upcrossing_Hz)
    return row


def with_correlations(table: Table, maps: Sequence[CorrelationMap], sites_only: bool) -> Table:
    """A table of all points (or of sites) with each map's correlation and lag as two more columns."""
    columns = dict(table.columns)
    for one in maps:
        points = 0 if sites_only else len(one.correlation)
        extra = [str(name) for name in columns["site"][points:]]
        columns[f"correlation_with_{one.site}"] = np.r_[
            one.correlation[:points], [one.correlation_at[name] for name in extra]
        ]
        columns[f"lag_behind_{one.site}_ms"] = np.r_[one.lag_ms[:points], [one.lag_at_ms[name] for name in extra]]
    return Table(columns)


def joined(table: Table, below: Table) -> Table:
    """Two tables of the same columns, one below the other."""
    if not len(below):
        return table
    return Table({k: _stacked(column, below.columns[k]) for k, column in table.columns.items()})


def _stacked(upper: Column, lower: Column) -> Column:
    if isinstance(upper, np.ndarray):
        return np.concatenate([upper, np.asarray(lower, dtype=upper.dtype)])
    return [*upper, *lower]
