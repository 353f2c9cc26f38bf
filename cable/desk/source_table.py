"""The sources of a site as a table and as sentences."""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

import numpy as np

from cable.desk.messages import shown
from cable.desk.tables import Table
from morphology import kind_name
from morphology.around import branch_ends

if TYPE_CHECKING:
    from cable.noise.sources import Sources


def source_table(sources: Sources) -> Table:
    """One row per cylinder, by its far point: shares of the variance, and shifts of the mean, in all and by input."""
    tree = sources.model.tree
    whole = sources.variance_mV2.sum() or np.nan
    columns = {
        "swc_id": tree.ids,
        "kind": np.array([kind_name(k) for k in tree.shape.kind]),
        "path_um": tree.path_um,
        "distance_um": sources.distance_um,
        "length_um": tree.shape.length_um,
        "branch_end_id": tree.ids[branch_ends(tree)],
        "variance_share": sources.variance_share,
    }
    columns |= {f"variance_share_{name}": part / whole for name, part in sources.variance_by_input_mV2.items()}
    columns |= {f"mean_{name}_mV": part for name, part in sources.mean_by_input_mV.items()}
    return Table(columns)


def source_sentences(sources: Sources) -> list[str]:
    """Who makes what is seen at the site, in words."""
    site, share = shown(sources.site, 60), sources.variance_share
    if not np.isfinite(share).all():
        return [f"Nothing fluctuates at {site}."]
    whole = sources.variance_mV2.sum()
    inputs = {shown(name, 40): part.sum() / whole for name, part in sources.variance_by_input_mV2.items()}
    shifts = {shown(name, 40): part.sum() for name, part in sources.mean_by_input_mV.items()}
    half = f"Half of the variance at {site} comes from within {sources.half_within_um():.0f} µm of it"
    if sources.site != "soma":
        half += f", and half from within {sources.half_within_um('soma'):.0f} µm of the soma"
    moved = [", ".join(f"{name} {value:+.2f} mV" for name, value in by.items()) for by in (shifts, _felt(sources))]
    return [
        f"{half}.",
        f"By input: {_list(inputs)}; by place of the synapses: {_list(sources.share_by_kind())}.",
        _strongest_branch(sources),
        f"The mean is shifted by {moved[0]}; by place: {moved[1]}.",
    ]


def source_summary(sources: Sources) -> dict[str, Any]:
    """What stands beside the rows of a JSON table: the shares gathered by input, kind and branch."""
    whole = sources.variance_mV2.sum() or np.nan
    return {
        "site": sources.site,
        "variance_mV2": sources.variance_mV2.sum(),
        "half_within_um": sources.half_within_um(),
        "half_within_um_of_soma": sources.half_within_um("soma"),
        "variance_share_by_input": {n: part.sum() / whole for n, part in sources.variance_by_input_mV2.items()},
        "variance_share_by_kind": sources.share_by_kind(),
        "variance_share_by_branch": sources.share_by_branch(),
        "mean_by_input_mV": {n: part.sum() for n, part in sources.mean_by_input_mV.items()},
        "mean_by_kind_mV": sources.mean_by_kind_mV(),
        "certificate": {"quadrature_relative_error": sources.relative_error},
    }


def _felt(sources: Sources) -> dict[str, float]:
    """Shifts of the mean by kind that are not nothing."""
    shifts = sources.mean_by_kind_mV()
    return {kind: value for kind, value in shifts.items() if abs(value) >= 0.005} or shifts


def _strongest_branch(sources: Sources) -> str:
    tree = sources.model.tree
    end, share = max(sources.share_by_branch().items(), key=lambda item: item[1])
    row = tree.index_of(end)
    place = f"{kind_name(tree.kinds[row])}, {tree.path_um[row]:.0f} µm from the root"
    return f"The strongest unbranched run, which ends at the point {end} ({place}), makes {100 * share:.1f} %."


def _list(shares: dict[str, float]) -> str:
    ranked = sorted(shares.items(), key=lambda item: -item[1])
    return ", ".join(f"{name} {100 * share:.1f} %" for name, share in ranked if abs(share) >= 5e-4)
