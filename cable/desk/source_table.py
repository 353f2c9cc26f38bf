"""The sources of a site as a table and as sentences."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np

from cable.desk.messages import shown
from cable.desk.tables import Table
from morphology import kind_name

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
    kinds = {
        kind_name(k): share[sources.model.tree.shape.kind == k].sum() for k in np.unique(sources.model.tree.shape.kind)
    }
    inputs = {shown(name, 40): part.sum() / whole for name, part in sources.variance_by_input_mV2.items()}
    shifts = {shown(name, 40): part.sum() for name, part in sources.mean_by_input_mV.items()}
    return [
        f"Half of the variance at {site} comes from within {sources.half_within_um():.0f} µm of it.",
        f"By input: {_list(inputs)}; by place of the synapses: {_list(kinds)}.",
        "The mean is shifted by " + ", ".join(f"{name} {value:+.2f} mV" for name, value in shifts.items()) + ".",
    ]


def _list(shares: dict[str, float]) -> str:
    ranked = sorted(shares.items(), key=lambda item: -item[1])
    return ", ".join(f"{name} {100 * share:.1f} %" for name, share in ranked if abs(share) >= 5e-4)
