"""Where should the second pipette go?

    python examples/second_pipette/question.py

One pipette is at the soma. A second one, on a dendrite thick enough to be patched, should tell most of what the
first does not: together they should predict the voltage of as much membrane as possible. For every candidate the
share of the apical variance (by membrane area) that a linear prediction from both records explains is computed from
three maps: the variance, and the correlations with either pipette.
"""

from __future__ import annotations

from dataclasses import replace
from pathlib import Path

import numpy as np

from cable import CableModel, load_scenario
from morphology import Site

HERE = Path(__file__).parent
LEAST_RADIUS_UM, APART_UM = 0.7, 60.0
APICAL = 4


def candidates(model: CableModel) -> tuple[Site, ...]:
    """Points of the apical dendrite that can be patched, about `APART_UM` apart along the path to the farthest."""
    tree = model.tree
    thick = np.flatnonzero((tree.kinds == APICAL) & (tree.radius_um >= LEAST_RADIUS_UM))
    way = np.array(tree.path_to(int(thick[np.argmax(tree.path_um[thick])])))
    sites, last = [], 0.0
    for row in sorted(way.tolist(), key=lambda row: tree.path_um[row]):
        if tree.path_um[row] >= last + APART_UM and tree.radius_um[row] >= LEAST_RADIUS_UM:
            last = float(tree.path_um[row])
            sites.append(Site(f"{last:.0f} µm", swc_id=int(tree.ids[row])))
    return tuple(sites)


def answer() -> dict[str, float]:
    """Share of the apical variance that is explained, by candidate; "soma" for the first pipette alone."""
    model = load_scenario(HERE / "scenario.toml")
    model = replace(model, sites=(*model.sites, *candidates(model)))
    tree = model.tree
    weight = tree.shape.area_um2 * (tree.kinds == APICAL) * model.fluctuations().variance_mV2
    weight /= weight.sum()
    soma = model.correlation_map("soma")
    found = {"soma": float(weight @ soma.correlation**2)}
    for name in model.site_names[1:]:
        second, between = model.correlation_map(name), soma.correlation_at[name]
        a, b = soma.correlation, second.correlation
        # squared multiple correlation of each point with the two records
        explained = (a**2 + b**2 - 2 * a * b * between) / (1 - between**2)
        found[name] = float(weight @ explained)
    return found


def main() -> None:
    found = answer()
    best = max(found, key=lambda name: found[name])
    print("second pipette   explained apical variance")
    for name, share in found.items():
        print(f"{'none' if name == 'soma' else name:>14}   {100 * share:5.1f} %{'   <- here' if name == best else ''}")


if __name__ == "__main__":
    main()
