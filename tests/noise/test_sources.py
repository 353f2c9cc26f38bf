"""Sources of a site against switching everything else off, and what shares must add up to."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from numpy.testing import assert_allclose

from cable import CableModel, Kernel, Membrane, Placed, SynapticInput
from morphology import CellTree, Site, Zone
from noise.cells import EXCITATION, INHIBITION, arbor, model
from noise.plain_cells import untapered_pair
from oracles.dense_sources import contributions, frequencies, impedance_GOhm
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


@pytest.mark.parametrize("correlation", [0.0, 0.04, 1.0])
def test_every_cylinder_against_dense_matrices(correlation: float) -> None:
    """Cylinder by cylinder, with and without a part in step; a cell of several kinds, looked at from a tip."""
    tree, plain = untapered_pair(35, 40)
    tip = int(np.flatnonzero(tree.child_count == 0)[-1])
    one = SynapticInput(
        name="a",
        where=Zone(kinds=("apical",)),
        density_per_um=0.3,
        rate_Hz=2.0,
        current_pA=5.0,
        kernel=Kernel.alpha(2.0),
        correlation=correlation,
    )
    found = CableModel(tree, PLAIN, (one,), (Site("tip", swc_id=int(tree.ids[tip])),)).sources("tip", 1e-11)
    count = np.array([0.3 * c.length_um * (tree.kinds[c.child] == 4) for c in plain.cylinders])
    wanted = np.zeros(len(tree))
    for omega, weight in zip(*frequencies(0.05, 0.3, 40), strict=True):
        event = np.sqrt(2e-3) * 5.0 * np.e * 2.0 / (1 + 2j * omega) ** 2
        events = list(zip(event * count, event * np.sqrt(count), strict=True))
        parts = contributions(plain, omega, tip, events, correlation)
        wanted[1:] += weight * parts
        if omega == 0.0:
            z, noise = impedance_GOhm(plain, 0.0)
            each = [
                n * s[2].real * (z[tip, c.parent] + z[tip, c.child]).real
                for n, s, c in zip(count, noise, plain.cylinders, strict=True)
            ]
            shift = 2e-3 * 5.0 * np.e * 2.0 * np.array(each)
    assert_allclose(found.variance_mV2, wanted, rtol=EXACT, atol=1e-10 * wanted.sum())
    assert_allclose(found.mean_by_input_mV["a"][1:], shift, rtol=EXACT, atol=1e-12)
    assert found.variance_mV2.sum() > 0.01


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


def test_half_arises_within_the_distance_that_is_told(cell: CableModel) -> None:
    found = cell.sources("far", 1e-5)
    half = found.half_within_um()
    assert found.stretches.within(np.array([half]), found.variance_share)[0] == pytest.approx(0.5, rel=1e-9)
    assert found.half_within_um("far") == half
    assert found.half_within_um("soma") != pytest.approx(half, rel=0.01)
    with pytest.raises(KeyError, match="no site 'nowhere'"):
        found.half_within_um("nowhere")


def test_half_within_hardly_depends_on_how_finely_a_neurite_is_sampled() -> None:
    one = replace(EXCITATION, where=Zone(kinds=("basal",)))
    told = []
    for step in (20, 10):
        rows = "".join(f"{k + 2} 3 {10 + step * k} 0 0 0.6 {k + 1}\n" for k in range(400 // step + 1))
        model = CableModel(CellTree.from_text(f"1 1 0 0 0 10 -1\n{rows}"), PLAIN, (one,))
        told.append(model.sources("soma", 1e-6).half_within_um())
    assert told[0] == pytest.approx(told[1], abs=0.2)


def test_gathered_by_kind_and_by_unbranched_run(cell: CableModel) -> None:
    found, tree = cell.sources("far", 1e-6), cell.tree
    for kind, code in (("soma", 1), ("basal", 3), ("apical", 4)):
        here = tree.shape.kind == code
        assert found.share_by_kind()[kind] == pytest.approx(found.variance_share[here].sum(), rel=1e-12)
        shift = sum(part[here].sum() for part in found.mean_by_input_mV.values())
        assert found.mean_by_kind_mV()[kind] == pytest.approx(shift, rel=1e-12, abs=1e-15)
    by_branch = found.share_by_branch()
    assert sum(by_branch.values()) == pytest.approx(1.0, rel=1e-12)
    assert len(by_branch) < len(tree)
    y = CableModel(CellTree.from_text(Y), PLAIN, (replace(INHIBITION, where=Zone(kinds=("basal",))),)).sources("soma")
    share = y.variance_share
    assert y.share_by_branch() == pytest.approx({1: share[0], 3: share[1] + share[2], 4: share[3], 6: share[4:].sum()})
    assert set(y.share_by_kind()) == {"soma", "basal"}


@pytest.mark.parametrize("inputs", [(), (replace(EXCITATION, rate_Hz=0.0),)])
def test_where_nothing_fluctuates_no_share_is_told(inputs: tuple[SynapticInput, ...]) -> None:
    found = CableModel(arbor(34, 12), PLAIN, inputs).sources("soma")
    assert np.isnan(found.variance_share).all() and np.isnan(found.half_within_um())
    assert not found.variance_mV2.any()


def test_unknown_site(cell: CableModel) -> None:
    with pytest.raises(KeyError, match="no site 'nowhere'; the sites are soma, far"):
        cell.sources("nowhere")
