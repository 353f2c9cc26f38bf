"""Sources of a site against switching everything else off, and what shares must add up to."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from numpy.testing import assert_allclose

from cable import CableModel, Kernel, Membrane, Placed, SynapticInput
from morphology import CellTree, Site, Zone
from noise.cells import EXCITATION, INHIBITION, arbor, model
from tolerances import EXACT, IDENTITY

PLAIN = Membrane(axial_resistivity_ohm_cm=150, capacitance_uF_cm2=1, resistance_ohm_cm2=20000, rest_mV=-70)
Y = "1 1 0 0 0 8 -1\n2 3 8 0 0 1 1\n3 3 100 0 0 1 2\n4 3 160 80 0 0.7 3\n5 3 160 -80 0 0.7 3\n6 3 160 -150 0 0.7 5\n"


@pytest.fixture
def cell() -> CableModel:
    tree = arbor(31, 60)
    return model(tree, sites=(Site("far", swc_id=int(tree.ids[55]), fraction=0.4),))


def test_shares_add_to_the_variance_and_the_mean(cell: CableModel) -> None:
    field = cell.fluctuations()
    for site in cell.site_names:
        found, at = cell.sources(site), field.at(site)
        for name, part in found.variance_by_input_mV2.items():
            assert part.sum() == pytest.approx(at.variance_by_input_mV2[name], rel=EXACT)
            assert (part >= 0).all()
        assert found.variance_share.sum() == pytest.approx(1.0, rel=1e-12)
        shift = sum(part.sum() for part in found.mean_by_input_mV.values())
        assert cell.membrane.rest_mV + shift == pytest.approx(at.mean_mV, rel=1e-6)  # division of driving forces


def test_one_cylinder_is_that_cylinder_alone() -> None:
    """Current synapses: the share of a cylinder is the variance with synapses on it alone."""
    tree = arbor(32, 30)
    one = SynapticInput(
        name="a", where=Zone(), density_per_um=0.3, rate_Hz=2.0, current_pA=5.0, kernel=Kernel.alpha(2.0)
    )
    sites = (Site("far", swc_id=int(tree.ids[20])),)
    found = CableModel(tree, PLAIN, (one,), sites).sources("far")
    tips = [row for row in range(1, len(tree)) if tree.child_count[row] == 0]
    for row in tips[:4]:
        alone = replace(one, where=Zone(subtree_of=int(tree.ids[row])))
        field = CableModel(tree, PLAIN, (alone,), sites).fluctuations()
        assert found.variance_mV2[row] == pytest.approx(field.at("far").variance_mV2, rel=IDENTITY)
        shift = field.at("far").mean_mV - PLAIN.rest_mV
        assert found.mean_by_input_mV["a"][row] == pytest.approx(shift, rel=IDENTITY)


def test_points_and_spheres_count_where_they_sit() -> None:
    tree = CellTree.from_text(Y)
    placed = SynapticInput(
        name="p",
        at=(Placed(Site("", swc_id=4), 3.0), Placed(Site("", swc_id=5, fraction=0.5), 2.0)),
        rate_Hz=5.0,
        current_pA=4.0,
        kernel=Kernel.alpha(1.0),
    )
    soma = SynapticInput(
        name="s",
        where=Zone(kinds=("soma",)),
        density_per_um2=0.02,
        rate_Hz=1.0,
        current_pA=-3.0,
        kernel=Kernel.alpha(1.0),
    )
    found = CableModel(tree, PLAIN, (placed, soma)).sources("soma")
    assert np.flatnonzero(found.variance_by_input_mV2["p"]).tolist() == [3, 4]
    assert np.flatnonzero(found.variance_by_input_mV2["s"]).tolist() == [0]


def test_symmetric_branches_contribute_alike_and_others_do_not() -> None:
    tree = CellTree.from_text(Y)
    one = replace(INHIBITION, where=Zone(kinds=("basal",)))
    share = CableModel(tree, PLAIN, (one,)).sources("soma").variance_share
    cut = CableModel(tree.take(tree.ids != 6), PLAIN, (one,)).sources("soma").variance_share
    assert cut[3] == pytest.approx(cut[4], rel=1e-9)
    assert abs(share[3] / share[4] - 1) > 0.01


def test_correlated_synapses_share_their_common_variance() -> None:
    tree = arbor(33, 40)
    cell = model(tree, replace(EXCITATION, correlation=0.05), INHIBITION)
    found = cell.sources("soma")
    assert found.variance_mV2.sum() == pytest.approx(cell.fluctuations().at("soma").variance_mV2, rel=EXACT)


def test_distance_runs_along_the_tree(cell: CableModel) -> None:
    """Against shortest paths of a general graph library."""
    import networkx

    graph = cell.tree.graph.to_undirected()
    place = cell.site_places["far"]
    child, above = int(cell.tree.ids[place.row]), int(cell.tree.ids[cell.tree.parent[place.row]])
    length = cell.tree.edge_length_um[place.row]
    graph.remove_edge(child, above)
    graph.add_edge(above, "site", length_um=0.4 * length)
    graph.add_edge("site", child, length_um=0.6 * length)
    want = networkx.single_source_dijkstra_path_length(graph, "site", weight="length_um")
    found = cell.sources("far", 1e-5)
    assert_allclose(found.distance_um, [want[int(i)] for i in cell.tree.ids], rtol=1e-12)
    half = found.half_within_um()
    assert found.variance_share[found.distance_um <= half].sum() >= 0.5
    assert found.variance_share[found.distance_um < half].sum() < 0.5
